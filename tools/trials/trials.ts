#!/usr/bin/env node
import { Command } from 'commander';
import { exitCode } from '../../runtime/verdict.js';
import { table } from '../commands/table.js';
import { trials } from './all.js';
import { Place } from './place.js';
import { Broken } from './trial.js';

/**
 * `npm run trials`: what goes wrong around a run, on purpose and many times: kill -9, full and stalled disks, floods, dying
 * controllers, failing system calls. The benches' ports are fixed: nothing else may run, or use a network of its own
 * (`unshare -n`). Ctrl-C ends it behind the round at hand.
 */
const program = new Command('trials')
  .description('breaks runs on purpose and looks at what they leave')
  .option('--part <a,b>', `some of ${trials.map((trial) => trial.name.replaceAll(' ', '-')).join(', ')}; default: all`)
  .option('--rounds <N>', 'rounds of each; default: as many as each says', Number)
  .option('--seed <N>', 'of the first round; the next has the next', Number, 1)
  .parse();
const wish = program.opts<{ part?: string; rounds?: number; seed: number }>();
const names = wish.part?.split(',').map((name) => name.trim());
for (const name of names ?? [])
  if (!trials.some((trial) => trial.name.replaceAll(' ', '-') === name)) program.error(`there is no trial ${name}`);

let stopped = false;
process.once('SIGINT', () => {
  stopped = true;
});
const rows: string[][] = [['trial', 'rounds', 'broken', 'the last one']];
let broken = 0;
for (const trial of trials) {
  if (stopped || (names && !names.includes(trial.name.replaceAll(' ', '-')))) continue;
  const why = trial.why?.() ?? '';
  if (why !== '') {
    rows.push([trial.name, '0', '0', `not run: ${why}`]);
    continue;
  }
  const rounds = wish.rounds ?? trial.rounds;
  let failed = 0;
  let done = 0;
  let last = '';
  for (let i = 0; i < rounds && !stopped; i += 1) {
    const place = new Place(wish.seed + i);
    try {
      last = await trial.round(place);
      process.stderr.write(`${trial.name}, seed ${wish.seed + i}: ${last}\n`);
    } catch (error) {
      failed += 1;
      const what = error instanceof Broken ? error.message : (error as Error).stack;
      process.stderr.write(`${trial.name}, seed ${wish.seed + i}: BROKEN ${what}\n${place.words()}`);
    } finally {
      await place.leave();
    }
    done += 1;
  }
  broken += failed;
  rows.push([trial.name, String(done), String(failed), last]);
}
process.stdout.write(`${table(rows, [1, 2])}\n`);
process.exitCode = broken > 0 ? exitCode.failed : stopped ? exitCode.unfinished : exitCode.fine;
