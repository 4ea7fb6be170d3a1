import { execFile } from 'node:child_process';
import path from 'node:path';
import { promisify } from 'node:util';
import { packageRoot } from '../../loop/controller-module.js';
import type { Part } from '../part.js';

/** What tools/measure/judge.ts prints. */
interface Found {
  readonly requirements: number;
  readonly operations: number;
  readonly nanoseconds: { readonly median: number; readonly tenth: number; readonly worst: number };
  readonly slots: { readonly block: number; readonly history: number };
  readonly growth: { readonly judged: number; readonly measuring: number };
  readonly end: { readonly milliseconds: number };
}

/** 50 requirements of ten kinds over two minutes of made-up signals. */
export const judge: Part = {
  name: 'judge',
  about: '50 requirements of ten kinds, judged in every tick',
  async run({ say }) {
    say('two minutes of ticks with the judge and without');
    const { stdout } = await promisify(execFile)(process.execPath, [
      path.join(packageRoot(), 'dist', 'tools', 'measure', 'judge.js'),
    ]);
    const found = JSON.parse(stdout) as Found;
    const { nanoseconds: cost, growth, slots } = found;
    return {
      rows: [
        { what: 'requirements; operations a tick', value: `${found.requirements}; ${found.operations}` },
        {
          what: 'processor time a tick: 10 %, median and worst of batches of 500 ticks',
          value: `${cost.tenth} / ${cost.median} / ${cost.worst} ns`,
        },
        {
          what: 'growth of the heap with the judge; of the measuring itself',
          value: `${growth.judged.toFixed(1)}; ${growth.measuring.toFixed(1)} bytes a tick`,
        },
        { what: 'history that windows need', value: `${(slots.history * 8e-6).toFixed(1)} MB` },
        { what: 'results at the end of the run', value: `${found.end.milliseconds.toFixed(0)} ms` },
      ],
      numbers: found,
    };
  },
};
