import { spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { packageRoot } from '../loop/controller-module.js';
import type { ChildOrder, Derived } from './child.js';
import type { Planted, RunDigest } from './one-run.js';

export interface CompareWishes {
  readonly benches: readonly string[];
  /** Most counted ticks of a scenario. */
  readonly most: number;
  /** The second run has V8's compilers off. */
  readonly interpreted?: 'no-opt' | 'jitless' | undefined;
  readonly planted?: Planted;
  readonly abort?: AbortSignal;
}

export interface Comparison {
  readonly number: number;
  readonly bench: string;
  readonly same: boolean;
  /** What differs, in words. */
  readonly what: string;
  readonly ticks: number;
  readonly steps: number;
  readonly hands: number;
}

const engines = { 'no-opt': ['--no-opt', '--no-sparkplug'], jitless: ['--jitless'] } as const;

/**
 * Runs the drawn scenarios `numbers` (of one bench, so that a process builds it once) in one process, again in another in
 * reverse order, and derives the first recordings again in a third. On Linux the first runs on one core and the second on
 * two, where there are two. Throws when a process ends in an error.
 */
export async function compare(numbers: readonly number[], wishes: CompareWishes): Promise<Comparison[]> {
  const folders = [1, 2].map(() => fs.mkdtempSync(path.join(os.tmpdir(), 'determinism-')));
  try {
    const order = { benches: wishes.benches, most: wishes.most, planted: wishes.planted };
    const one = await ask<RunDigest>(
      { ...order, work: 'run', numbers, inline: true, folder: folders[0]! },
      { ...wishes, cores: '0' },
      [],
    );
    const two = await ask<RunDigest>(
      { ...order, work: 'run', numbers: [...numbers].reverse(), inline: false, folder: folders[1]! },
      { ...wishes, cores: '0,1' },
      wishes.interpreted === undefined ? [] : engines[wishes.interpreted],
    );
    const again = await ask<Derived>(
      { ...order, work: 'derive', numbers, inline: false, folder: folders[0]! },
      { ...wishes, cores: '0,1' },
      [],
    );
    return numbers.map((number) => {
      const first = one.get(number)!;
      const second = two.get(number)!;
      const derived = again.get(number)!;
      const what = [first, second, derived]
        .map((each) => (each as { error?: string }).error)
        .filter((error): error is string => error !== undefined);
      if (what.length === 0) {
        if (first.digest !== second.digest) what.push('two runs of the same scenario differ');
        if (!derived.identical) what.push(`derived again it differs from tick ${derived.firstTick} on`);
        if (derived.compared !== first.ticks)
          what.push(`${derived.compared} of ${first.ticks} ticks could be compared when it was derived again`);
      }
      const { bench, ticks, steps, hands } = first;
      return { number, bench, same: what.length === 0, what: what.join('; '), ticks, steps, hands };
    });
  } finally {
    for (const folder of folders) fs.rmSync(folder, { recursive: true, force: true });
  }
}

async function ask<Answer extends { number: number }>(
  order: ChildOrder,
  wishes: CompareWishes & { cores: string },
  flags: readonly string[],
): Promise<Map<number, Answer>> {
  const file = path.join(packageRoot(), 'dist', 'tools', 'determinism', 'child.js');
  const words = [...flags, file, JSON.stringify(order)];
  const pinned = process.platform === 'linux' && os.availableParallelism() > 1;
  const child = pinned
    ? spawn('taskset', ['-c', wishes.cores, process.execPath, ...words], { stdio: ['ignore', 'pipe', 'pipe'] })
    : spawn(process.execPath, words, { stdio: ['ignore', 'pipe', 'pipe'] });
  const stop = () => child.kill('SIGTERM');
  wishes.abort?.addEventListener('abort', stop);
  let output = '';
  let errors = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => (output += text));
  child.stderr.setEncoding('utf8').on('data', (text: string) => (errors += text));
  const code = await new Promise<number | null>((resolve, reject) => {
    child.once('error', reject);
    child.once('close', resolve);
  });
  wishes.abort?.removeEventListener('abort', stop);
  if (code !== 0) throw new Error(`a process ended with ${code}: ${errors.trim() || 'stopped'}`);
  const answers = output
    .trim()
    .split('\n')
    .map((line) => JSON.parse(line) as Answer);
  return new Map(answers.map((answer) => [answer.number, answer]));
}
