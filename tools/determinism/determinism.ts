#!/usr/bin/env node
import fs from 'node:fs';
import path from 'node:path';
import { Command } from 'commander';
import { exitCode } from '../../runtime/verdict.js';
import { Progress } from '../commands/progress.js';
import { packageRoot } from '../loop/controller-module.js';
import { type Comparison, compare } from './compare.js';

/**
 * `npm run determinism`: random scenarios over the ready benches, each run twice and derived again in processes of their
 * own, on one core and on two, some with V8's compilers off: the same hash after every tick. Stopped by Ctrl-C it goes on
 * where it was the next time.
 */
const program = new Command('determinism')
  .description('runs random scenarios twice, derives them again, and compares every tick')
  .option('--count <N>', 'scenarios', Number, 1000)
  .option('--first <N>', 'number of the first one; a number is its seed', Number, 1)
  .option('--interpreted <N>', "short ones whose second run has V8's compilers off", Number, 20)
  .option('--batch <N>', 'scenarios that one process runs', Number, 20)
  .option('--keep <FILE>', 'what is done already, a line each', path.join('recordings', 'determinism.jsonl'))
  .parse();
const wish = program.opts<{ count: number; first: number; interpreted: number; batch: number; keep: string }>();

const root = packageRoot();
const benches = [
  'harbour-truck/bench.yaml',
  'harbour-truck/bench-can.yaml',
  'flywheel-stand/bench.yaml',
  'refuse-collector/bench.yaml',
  'shuttle-bus/bench.yaml',
  'hand-bench/bench.yaml',
].map((name) => path.join(root, 'configs', name));

interface Kept extends Comparison {
  readonly how: 'compiled' | 'no-opt' | 'jitless';
}
fs.mkdirSync(path.dirname(wish.keep), { recursive: true });
const kept: Kept[] = fs.existsSync(wish.keep)
  ? fs
      .readFileSync(wish.keep, 'utf8')
      .split('\n')
      .filter((line) => line.endsWith('}'))
      .map((line) => JSON.parse(line) as Kept)
  : [];
const done = new Set(kept.map((one) => `${one.how} ${one.number}`));

interface Batch {
  readonly how: Kept['how'];
  readonly numbers: number[];
}
const batches: Batch[] = [];
const interpreted = Array.from({ length: wish.interpreted }, (_, i) => wish.first + i);
for (const [i, number] of interpreted.entries())
  batches.push({ how: i % 2 === 0 ? 'no-opt' : 'jitless', numbers: [number] });
for (let from = 0; from < wish.count; from += wish.batch * benches.length) {
  const some = Array.from(
    { length: Math.min(wish.batch * benches.length, wish.count - from) },
    (_, i) => wish.first + from + i,
  );
  for (let bench = 0; bench < benches.length; bench += 1)
    batches.push({ how: 'compiled', numbers: some.filter((number) => number % benches.length === bench) });
}

const total = wish.count + wish.interpreted;
const progress = new Progress('determinism');
const all = kept.filter(({ number }) => number >= wish.first && number < wish.first + wish.count);
for (const { how, numbers } of batches) {
  const left = numbers.filter((number) => !done.has(`${how} ${number}`));
  if (left.length === 0) continue;
  if (!progress.update(all.length / total)) break;
  let found: Comparison[];
  try {
    found = await compare(left, {
      benches,
      most: how === 'compiled' ? 800 : 150,
      interpreted: how === 'compiled' ? undefined : how,
      abort: progress.signal,
    });
  } catch (error) {
    if (progress.signal.aborted) break;
    throw error;
  }
  for (const one of found) {
    all.push({ ...one, how });
    fs.appendFileSync(wish.keep, `${JSON.stringify({ ...one, how })}\n`);
    if (!one.same) process.stderr.write(`${one.bench}, number ${one.number}, ${how}: ${one.what}\n`);
  }
  if (!process.stderr.isTTY) process.stderr.write(`${all.length} of ${total}\n`);
}
progress.done();

const differing = all.filter((one) => !one.same);
const sum = (key: 'ticks' | 'steps' | 'hands') => all.reduce((count, one) => count + one[key], 0);
const off = all.filter((one) => one.how !== 'compiled').length;
process.stdout.write(
  `${all.length} of ${total} random scenarios (${off} of them with the compilers off), ${sum('ticks')} ticks, ${sum('steps')} steps, ${sum('hands')} hands: ` +
    `${differing.length === 0 ? 'all the same' : `${differing.length} differ`}\n`,
);
for (const one of differing) process.stdout.write(`  number ${one.number} (${one.how}) ${one.bench}: ${one.what}\n`);
process.exitCode = differing.length > 0 ? exitCode.differs : all.length < total ? exitCode.unfinished : exitCode.fine;
