import { existsSync, readFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { parseArgs } from 'node:util';
import { Progress } from '../commands/progress.js';
import { packageRoot } from '../loop/controller-module.js';
import { readBenchFile } from '../run/plan.js';
import { suiteEntries } from '../suite/entries.js';
import { planted } from './mutant.js';
import { mutations } from './mutate.js';
import { plantedBugs } from './planted-bugs.js';
import { sample } from './sample.js';
import { type MutantResult, tryMutants } from './try-mutants.js';

const usage = `Usage: node dist/tools/mutants/mutants.js [--bench FILE] [--suite FOLDER] [--kind planted|mechanical|all]
  [--only TEXT,TEXT] [--sample N] [--seed N] [--jobs N] [--out FOLDER] [--resume] [--list]

Runs a suite against copies of the bench's demo controller with one mistake in each, and prints the share that it catches
and the copies that it does not. Ctrl-C ends it; --resume goes on from there.
`;

const { values } = parseArgs({
  options: {
    bench: { type: 'string' },
    suite: { type: 'string' },
    kind: { type: 'string', default: 'all' },
    only: { type: 'string' },
    sample: { type: 'string' },
    seed: { type: 'string', default: '1' },
    jobs: { type: 'string', default: String(os.availableParallelism()) },
    out: { type: 'string' },
    resume: { type: 'boolean', default: false },
    list: { type: 'boolean', default: false },
    help: { type: 'boolean', default: false },
  },
});
if (values.help) {
  process.stdout.write(usage);
  process.exit(0);
}
process.exitCode = await main();

async function main(): Promise<number> {
  const bench = values.bench ?? path.join(packageRoot(), 'configs', 'harbour-truck', 'bench.yaml');
  const folder = values.suite ?? path.join(path.dirname(bench), 'scenarios', 'suite');
  const { spec, folder: home } = readBenchFile(bench);
  const module = spec.controller?.module;
  const file = module === undefined ? '' : path.join(home, module.replace(/\.js$/, '.ts'));
  if (!existsSync(file)) throw new Error(`${bench} has no controller module in TypeScript beside it`);
  const source = readFileSync(file, 'utf8');
  const seed = spec.seed;
  const ours = path.basename(home) === 'harbour-truck';
  let mutants = [
    ...(values.kind !== 'mechanical' && ours ? plantedBugs.map((bug) => planted(source, bug)) : []),
    ...(values.kind !== 'planted' ? mutations(source) : []),
  ].filter((one) => values.only === undefined || values.only.split(',').some((part) => one.name.includes(part)));
  if (values.sample !== undefined) mutants = sample(mutants, Number(values.sample), Number(values.seed));
  if (values.list) {
    for (const one of mutants) process.stdout.write(`${one.name}  ${one.what}\n`);
    return 0;
  }
  const entries = suiteEntries(folder, spec, seed, '');
  const out = values.out ?? path.join('recordings', 'mutants', path.basename(home));
  process.stdout.write(`${mutants.length} mutants, ${entries.length} runs each at most, results in ${out}\n`);
  const progress = new Progress('mutants');
  const began = performance.now();
  const { results } = await tryMutants({
    bench,
    folder,
    seed,
    entries,
    source,
    mutants,
    out,
    jobs: Number(values.jobs),
    resume: values.resume,
    abort: progress.signal,
    onResult: (one) => {
      process.stdout.write(
        `${one.caught ? 'caught  ' : 'SURVIVED'} ${one.name.padEnd(44)} ${one.took.toFixed(1).padStart(6)} s  ${one.caught ? `${one.caught.run}: ${one.caught.how}` : `${one.runs} runs, ${one.same} without any difference; ${one.what}`}\n`,
      );
    },
    onProgress: (share) => void progress.update(share),
  }).finally(() => progress.done());
  process.stdout.write(`\n${told(results, mutants.length)}\n${((performance.now() - began) / 60000).toFixed(1)} min\n`);
  return progress.signal.aborted ? 5 : 0;
}

/** Shares and survivors, in words. */
function told(results: readonly MutantResult[], planned: number): string {
  const lines: string[] = [];
  for (const kind of ['planted', 'mechanical'] as const) {
    const own = results.filter((one) => one.kind === kind);
    if (own.length === 0) continue;
    const caught = own.filter((one) => one.caught);
    const idle = own.filter((one) => !one.caught && one.same === one.runs);
    const seen = own.length - idle.length;
    lines.push(
      `${kind}: ${caught.length} of ${own.length} caught (${((100 * caught.length) / own.length).toFixed(0)} %); ${idle.length} do nothing at all in any run; of those that do something ${((100 * caught.length) / Math.max(1, seen)).toFixed(0)} %`,
    );
    for (const one of own)
      if (!one.caught)
        lines.push(
          `  ${one.name}  ${one.same === one.runs ? 'does nothing in any run' : `differs in ${one.runs - one.same} runs`}: ${one.what}`,
        );
  }
  if (results.length < planned) lines.push(`${planned - results.length} were not tried: --resume goes on from here`);
  return lines.join('\n');
}
