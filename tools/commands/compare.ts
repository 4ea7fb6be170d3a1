import { readdirSync, statSync } from 'node:fs';
import path from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import pc from 'picocolors';
import { parseQuantity, QuantityError } from '../../configs/quantity.js';
import { Recording } from '../../runtime/recording/reader.js';
import { exitCode } from '../../runtime/verdict.js';
import { compareRecordings, type RecordingComparison } from '../compare/compare-recordings.js';
import { type Moved, movedBetween, type Outcome } from '../compare/compare-runs.js';
import { recordedSummary } from '../report/recorded-summary.js';
import { marginText, quantity } from '../report/text.js';
import { readResult } from '../suite/result.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';

interface CompareFlags {
  readonly tolerance: number;
  readonly json?: boolean;
}

export function compareCommand(): Command {
  return new Command('compare')
    .description(
      'says what is different between two runs, or two suites: verdicts, margins, signals, first point of divergence',
    )
    .argument('A', 'recording, or folder of a suite: before')
    .argument('B', 'the same: after')
    .option('--tolerance <SHARE>', "signals: share of a signal's span; margins: share of the margin", share, 1e-6)
    .option('--json', 'one object on standard output')
    .addHelpText(
      'after',
      '\nExamples:\n  oilspring compare before.osrec after.osrec\n  oilspring compare recordings/suites/release-1 recordings/suites/release-2 --tolerance 2%\n\nExit code 0: the same within the tolerance; 1: a verdict or a margin became worse; 4: something else differs.',
    )
    .action((before: string, after: string, flags: CompareFlags) => {
      const folders = [before, after].map((one) => statSync(one).isDirectory());
      if (folders[0] !== folders[1]) throw new CommandError('name two recordings or two folders');
      process.exitCode = folders[0] ? compareFolders(before, after, flags) : compareFiles(before, after, flags);
    });
}

function compareFiles(before: string, after: string, flags: CompareFlags): number {
  const a = new Recording(before);
  const b = new Recording(after);
  const progress = new Progress('compare', flags.json ?? false);
  try {
    const moved = movedBetween(
      outcomeOf(a, path.basename(before)),
      outcomeOf(b, path.basename(after)),
      flags.tolerance,
    );
    const found = compareRecordings(a, b, flags.tolerance, (done) => progress.update(done));
    progress.done();
    if (progress.signal.aborted) throw new CommandError('stopped', exitCode.unfinished);
    if (flags.json) process.stdout.write(`${JSON.stringify({ moved, ...found })}\n`);
    else {
      tellMoved(moved);
      tellSignals(found, a.header.step);
    }
    if (moved.some((one) => one.worse)) return exitCode.failed;
    return moved.length > 0 || found.signals.length > 0 || found.firstState !== undefined
      ? exitCode.differs
      : exitCode.fine;
  } finally {
    progress.done();
    a.close();
    b.close();
  }
}

function outcomeOf(recording: Recording, run: string): Outcome {
  const { ending } = recording.examine();
  const parsed = recordedSummary.safeParse(ending.end?.summary);
  return parsed.success
    ? { run, verdict: parsed.data.verdict, requirements: parsed.data.requirements }
    : { run, verdict: 'not valid', requirements: [] };
}

function compareFolders(before: string, after: string, flags: CompareFlags): number {
  const read = (folder: string) =>
    new Map(
      readdirSync(folder)
        .filter((name) => name.endsWith('.json'))
        .sort()
        .flatMap((name): [string, Outcome][] => {
          const result = readResult(path.join(folder, name));
          return result
            ? [
                [
                  result.name,
                  { run: result.name, verdict: result.verdict, requirements: result.summary?.requirements ?? [] },
                ],
              ]
            : [];
        }),
    );
  const a = read(before);
  const b = read(after);
  if (a.size === 0 || b.size === 0)
    throw new CommandError(`${a.size === 0 ? before : after} holds no results of a suite`);
  const moved: Moved[] = [];
  for (const [name, outcome] of a) {
    const now = b.get(name);
    if (now) moved.push(...movedBetween(outcome, now, flags.tolerance));
    else
      moved.push({
        run: name,
        id: '',
        before: outcome.verdict,
        after: 'not run',
        change: null,
        unit: '1',
        worse: true,
      });
  }
  for (const [name, outcome] of b)
    if (!a.has(name))
      moved.push({
        run: name,
        id: '',
        before: 'not run',
        after: outcome.verdict,
        change: null,
        unit: '1',
        worse: outcome.verdict === 'fail',
      });
  if (flags.json) process.stdout.write(`${JSON.stringify({ runs: [a.size, b.size], moved })}\n`);
  else {
    process.stdout.write(`${a.size} runs before, ${b.size} after\n`);
    tellMoved(moved);
  }
  if (moved.some((one) => one.worse)) return exitCode.failed;
  return moved.length > 0 ? exitCode.differs : exitCode.fine;
}

function tellMoved(moved: readonly Moved[]): void {
  if (moved.length === 0) process.stdout.write('verdicts and margins are the same\n');
  for (const { run, id, before, after, change, unit, worse } of moved) {
    const verdict = before === after ? before : `${before} -> ${after}`;
    const margin = change === null ? '' : `, margin ${marginText(change, unit)}`;
    process.stdout.write(`${worse ? pc.red('worse ') : 'moved '} ${run} ${id} ${verdict}${margin}\n`);
  }
}

function tellSignals(found: RecordingComparison, step: number): void {
  const time = (tick: number) => `${(tick * step).toFixed(3)} s (tick ${tick})`;
  process.stdout.write(`${found.compared} ticks compared\n`);
  if (!found.sameLayout)
    process.stdout.write('the benches are not laid out alike: states cannot be compared, signals can\n');
  else if (found.firstState === undefined) process.stdout.write('the whole state is the same after every tick\n');
  else process.stdout.write(`the states part after ${time(found.firstState)}\n`);
  for (const one of found.signals.slice(0, 20))
    process.stdout.write(
      `  ${one.path}: from ${time(one.first)} on, at most ${quantity(one.most, one.unit, true, 4)} (${(100 * one.share).toPrecision(3)} % of its span) at ${time(one.at)}\n`,
    );
  if (found.signals.length > 20) process.stdout.write(`  and ${found.signals.length - 20} more\n`);
  for (const [what, paths] of [
    ['only before', found.onlyBefore],
    ['only after', found.onlyAfter],
  ] as const)
    if (paths.length > 0)
      process.stdout.write(
        `${what}: ${paths.slice(0, 8).join(', ')}${paths.length > 8 ? ` and ${paths.length - 8} more` : ''}\n`,
      );
}

function share(text: string): number {
  try {
    return parseQuantity(text.replace(/%$/, ' %'), { unit: '1', least: 0, most: 1 }).value;
  } catch (error) {
    if (error instanceof QuantityError) throw new InvalidArgumentError('a share, such as 0.1 % or 1e-6');
    throw error;
  }
}
