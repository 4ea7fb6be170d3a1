#!/usr/bin/env node
import fs from 'node:fs';
import path from 'node:path';
import { Command } from 'commander';
import { exitCode } from '../../runtime/verdict.js';
import { table } from '../commands/table.js';
import { Coverage } from './coverage.js';
import { fuzz } from './fuzzer.js';

/**
 * `npm run fuzz-inputs`: random inputs to every decoder and parser, those kept that reach new code. The corpus is kept from one
 * time to the next; an input that fails is written beside it. Ctrl-C goes on to the table.
 */
const program = new Command('fuzz')
  .description('feeds random inputs to every decoder and parser')
  .option('--part <a,b>', 'some of them; default: all')
  .option('--inputs <N>', 'inputs to each', Number, 10_000_000)
  .option('--minutes <N>', 'at most, for each', Number, 10)
  .option('--seed <N>', 'default: another each time', Number)
  .option('--corpus <FOLDER>', 'inputs that reached something new', path.join('recordings', 'fuzz'))
  .parse();
const wish = program.opts<{ part?: string; inputs: number; minutes: number; seed?: number; corpus: string }>();
const names = wish.part?.split(',').map((name) => name.trim());
// ahead of what it is to count: V8 counts blocks only in functions that it compiles from now on
const coverage = new Coverage();
const { allTargets } = await import('./targets.js');
const targets = (await allTargets()).filter((target) => names?.includes(target.name) ?? true);
const seed = wish.seed ?? Date.now() % 2 ** 31;
const rows = [['decoder', 'inputs', 'a second', 'read', 'kept', 'reached', 'failures']];
let failed = 0;
for (const target of targets) {
  const began = performance.now();
  const corpus = path.join(wish.corpus, target.name);
  const found = fuzz(target, {
    seed,
    inputs: wish.inputs,
    coverage,
    corpus,
    goOn: () => performance.now() - began < 60_000 * wish.minutes,
  });
  const seconds = (performance.now() - began) / 1000;
  for (const { input, error } of found.failures) {
    failed += 1;
    fs.mkdirSync(wish.corpus, { recursive: true });
    const file = path.join(wish.corpus, `failed-${target.name}-${failed}`);
    fs.writeFileSync(file, input);
    process.stderr.write(`${target.name}: ${error.stack ?? error.message}\n  input in ${file}\n`);
  }
  const share = `${((100 * found.read) / Math.max(1, found.inputs)).toFixed(0)} %`;
  const row = [
    target.name,
    String(found.inputs),
    (found.inputs / seconds).toFixed(0),
    share,
    String(found.kept),
    String(found.reached),
    String(found.failures.length),
  ];
  rows.push(row);
  process.stderr.write(`${row.join('  ')}\n`);
}
coverage.close();
process.stdout.write(`seed ${seed}\n${table(rows, [1, 2, 3, 4, 5, 6])}\n`);
process.exitCode = failed > 0 ? exitCode.failed : exitCode.fine;
