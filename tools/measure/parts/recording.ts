import path from 'node:path';
import { packageRoot } from '../../loop/controller-module.js';
import type { Part } from '../part.js';

/** What recording costs: a row in the loop thread and in the host thread, by processor time. */
export const recording: Part = {
  name: 'recording',
  about: 'recording at 100 and 500 signals and one input a tick (processor time)',
  async run({ say, workshop }) {
    const rows: { what: string; value: string }[] = [];
    const numbers: Record<string, string[]> = {};
    for (const signals of [100, 500]) {
      say(`${signals} signals`);
      const text = await workshop.run(process.execPath, [
        path.join(packageRoot(), 'dist', 'tools', 'measure', 'recording.js'),
        String(signals),
        '30000',
      ]);
      const lines = text.trim().split('\n').slice(1);
      numbers[signals] = lines;
      for (const line of lines)
        rows.push({ what: `${signals} signals, ${line.slice(0, 14).trim()}`, value: line.slice(14).trim() });
    }
    return { rows, numbers };
  },
};
