import { writeFileSync } from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import pc from 'picocolors';
import { marginText } from '../report/text.js';
import { readBenchFile } from '../run/plan.js';
import { benchAbove, suiteEntries } from '../suite/entries.js';
import { judgeSuite, type SuiteResult } from '../suite/result.js';
import { runSuite } from '../suite/run-suite.js';
import { suiteHtml } from '../suite/suite-html.js';
import { suiteJunit } from '../suite/suite-junit.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';
import { writeReports } from './report.js';
import { pace } from './run.js';

interface SuiteFlags {
  readonly bench?: string;
  readonly jobs: number;
  readonly pace: 'live' | 'fast';
  readonly out?: string;
  readonly junit?: string;
  readonly report?: string;
  readonly resume?: boolean;
  readonly controller?: string;
  readonly seed?: number;
  readonly keep: 'all' | 'rule' | 'none';
  readonly json?: boolean;
}

export function suiteCommand(): Command {
  return new Command('suite')
    .description('runs all scenarios of a folder, at fast pace several at a time, and gives one verdict')
    .argument('FOLDER', 'folder with scenario files; each case of a file is a run of its own')
    .option('--bench <FILE>', 'bench file; default: the nearest bench.yaml above the folder')
    .option(
      '--pace <live|fast>',
      'fast: no waiting; live: in real time, one after another, with the reset procedure of the bench between',
      pace,
      'fast',
    )
    .option('--jobs <N>', 'runs at a time (fast); default: one for each processor', whole, os.availableParallelism())
    .option('--out <FOLDER>', 'results and recordings; default: recordings/suites/ and the name of the folder')
    .option('--resume', 'go on where an earlier suite stopped: runs whose files have not changed are not run again')
    .option('--controller <CMD>', 'as of run')
    .option('--seed <N>', "seed of all noise; default: the bench's", whole)
    .option(
      '--keep <rule|all|none>',
      'recordings: those of runs that did not pass and those with the least margins; all; none',
      keep,
      'rule',
    )
    .option('--junit <FILE>', 'JUnit XML of all runs')
    .option('--report <FILE.html>', 'a page over all runs, and one for each run that did not pass, beside it')
    .option('--json', 'one object on standard output at the end, and nothing else')
    .addHelpText(
      'after',
      '\nExamples:\n  oilspring suite configs/harbour-truck/scenarios/suite --junit suite.xml --report suite.html\n  oilspring suite my/scenarios --pace live --controller external\n\nExit code 0: pass, or something was not exercised; 1: a requirement failed; 3: a run is not valid or broke; 5: stopped.\nCtrl-C ends it cleanly; --resume goes on from there.',
    )
    .action(async (folder: string, flags: SuiteFlags) => {
      process.exitCode = await suite(folder, flags);
    });
}

async function suite(folder: string, flags: SuiteFlags): Promise<number> {
  const bench = flags.bench ?? benchAbove(folder);
  const { spec } = readBenchFile(bench);
  const seed = flags.seed ?? spec.seed;
  const entries = suiteEntries(folder, spec, seed, `${flags.pace} ${flags.controller ?? ''}`);
  const out = flags.out ?? path.join('recordings', 'suites', path.basename(path.resolve(folder)));
  const say = (text: string) => {
    if (!flags.json) process.stdout.write(`${text}\n`);
  };
  const jobs = flags.pace === 'live' ? 1 : flags.jobs;
  const how = flags.pace === 'live' ? 'live, one after another' : `${jobs} at a time`;
  say(`${entries.length} runs on ${spec.name}, ${how}, results in ${out}`);
  const progress = new Progress('suite', flags.json ?? false);
  const began = performance.now();
  let results: SuiteResult[];
  let fresh = 0;
  try {
    results = await runSuite({
      bench,
      entries,
      out,
      jobs,
      pace: flags.pace,
      seed,
      controller: flags.controller,
      resume: flags.resume ?? false,
      keep: flags.keep,
      abort: progress.signal,
      onProgress: (share) => {
        progress.update(share);
      },
      onResult: (result, again) => {
        if (!again) fresh += 1;
        say(line(result, again));
      },
    });
  } finally {
    progress.done();
  }
  const took = (performance.now() - began) / 1000;
  const judgement = judgeSuite(results, entries.length);
  if (flags.junit !== undefined) writeFileSync(flags.junit, suiteJunit(results));
  if (flags.report !== undefined) {
    const pages = new Map<string, string>();
    for (const one of results) {
      if (one.verdict === 'pass' || one.recording === null) continue;
      const page = `${path.basename(flags.report, '.html')}-${one.name}.html`;
      writeReports(path.join(out, one.recording), { to: path.join(path.dirname(flags.report), page) });
      pages.set(one.name, page);
    }
    const created = `${new Date().toISOString().replace('T', ' ').replace(/\..*/, '')} UTC`;
    writeFileSync(
      flags.report,
      suiteHtml({
        title: path.basename(path.resolve(folder)),
        bench: spec.name,
        created,
        took,
        how,
        judgement,
        results,
        pages,
      }),
    );
  }
  if (flags.json)
    process.stdout.write(
      `${JSON.stringify({ ...judgement, took, runs: results.map(({ summary: _, ...one }) => one) })}\n`,
    );
  say('');
  for (const one of judgement.requirements) {
    if (one.failed.length === 0) continue;
    say(
      `${pc.red(`${one.id} failed`)} in ${one.failed.join(', ')}, worst margin ${one.least ? marginText(one.least.margin, one.unit) : '-'}: ${one.text}`,
    );
  }
  say(`${judgement.verdict.toUpperCase()}  ${judgement.summary}`);
  if (fresh > 0) say(`${fresh} runs in ${took.toFixed(0)} s: ${((60 * fresh) / took).toFixed(1)} a minute`);
  if (progress.signal.aborted)
    throw new CommandError(`stopped: ${entries.length - results.length} runs are left, --resume goes on from here`, 5);
  return judgement.exitCode;
}

function line(result: SuiteResult, again: boolean): string {
  const colour = result.verdict === 'pass' ? pc.green : result.verdict === 'fail' ? pc.red : pc.yellow;
  const failed = (result.summary?.requirements ?? []).filter((one) => one.verdict === 'fail').map((one) => one.id);
  const idle =
    result.verdict === 'not exercised'
      ? (result.summary?.requirements ?? [])
          .filter((one) => one.verdict !== 'pass' && !one.optional && one.verdict !== 'fail')
          .map((one) => one.id)
      : [];
  const why = [...failed, ...idle, ...result.why].join('; ');
  return `${colour(result.verdict.padEnd(13))} ${result.name.padEnd(34)} ${again ? 'from before' : `${result.took.toFixed(1)} s`}${why === '' ? '' : `  ${why}`}`;
}

function whole(value: string): number {
  const number = Number(value);
  if (!Number.isInteger(number) || number < 0) throw new InvalidArgumentError('a whole number, 0 or more');
  return number;
}

function keep(value: string): SuiteFlags['keep'] {
  if (value !== 'rule' && value !== 'all' && value !== 'none') throw new InvalidArgumentError('rule, all or none');
  return value;
}
