import os from 'node:os';
import path from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import pc from 'picocolors';
import { parseQuantity } from '../../configs/quantity.js';
import { exitCode } from '../../runtime/verdict.js';
import { packageRoot } from '../loop/controller-module.js';
import { answerFile, keepAnswer, type ReadinessAnswer, thisComputer } from '../readiness/answer.js';
import { type LatenessCounts, runCyclictest } from '../readiness/cyclictest.js';
import { type DiskSpeed, measureDisk } from '../readiness/disk.js';
import { type Finding, findings, thisMachine } from '../readiness/findings.js';
import { measureLateness } from '../readiness/lateness.js';
import { pool, quantiles, type StepVerdict, stepsHeld } from '../readiness/tail.js';
import { systemdUnit } from '../readiness/unit.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';
import { table } from './table.js';

/** Turns of the loop's waiting and cyclictest. */
const SLICES = 4;
/** Steps that are judged, s. */
const STEPS = [0.00025, 0.0005, 0.001, 0.002, 0.005, 0.01];

interface ReadinessFlags {
  readonly for: number;
  readonly core?: number;
  readonly unit?: boolean;
  readonly json?: boolean;
}

export function readinessCommand(): Command {
  return new Command('readiness')
    .description('is this computer ready for live runs? Looks at it, measures its wake-ups, says what to change')
    .option('--for <60s>', 'how long to measure, and as long again with cyclictest; 0s: look only', seconds, 60)
    .option('--core <N>', 'processor to measure on; default: as the kernel likes', whole)
    .option('--unit', 'print a systemd unit that gives a live run its rights and no more, and stop')
    .option('--json', 'one object on standard output')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring readiness --for 10s\n\nExit code 0: live runs are possible, 3: they are not, 5: stopped.',
    )
    .action(async (flags: ReadinessFlags) => {
      if (flags.unit) {
        process.stdout.write(
          systemdUnit({ folder: packageRoot(), node: process.execPath, user: os.userInfo().username }),
        );
        return;
      }
      const machine = thisMachine();
      const found = findings(machine);
      const disk = tryDisk();
      const answer = await measure(flags, found, disk, machine.notLive === '');
      if (answer.lateness.count > 0 && !keepAnswer(answer))
        process.stderr.write(`not kept for the records of later runs: ${answerFile()} cannot be written\n`);
      process.stdout.write(flags.json ? `${JSON.stringify(answer, undefined, 2)}\n` : `${report(answer)}\n`);
      process.exitCode = machine.notLive === '' ? exitCode.fine : exitCode.notValid;
    });
}

async function measure(
  flags: ReadinessFlags,
  found: readonly Finding[],
  disk: DiskSpeed | undefined,
  possible: boolean,
): Promise<ReadinessAnswer> {
  const answer: ReadinessAnswer = {
    measured: new Date().toISOString(),
    computer: thisComputer(),
    seconds: flags.for,
    policy: 'SCHED_OTHER',
    core: flags.core ?? null,
    load: os.loadavg()[0]!,
    share: 0,
    lateness: quantiles(new Map()),
    cyclictest: null,
    steps: [],
    disk: disk ?? null,
    findings: found.map((one) => ({ ...one, remedy: [...one.remedy] })),
  };
  if (!possible || flags.for === 0) return answer;
  const progress = new Progress('wake-ups', flags.json);
  const began = performance.now();
  const timer = setInterval(() => progress.update((performance.now() - began) / (2 * flags.for * 1000 + 3000)), 200);
  try {
    const wish = { seconds: flags.for / SLICES, core: flags.core };
    const own: LatenessCounts = new Map();
    const floor: LatenessCounts = new Map();
    let share = 0;
    let policy = '';
    for (let i = 0; i < SLICES; i += 1) {
      // one after the other in turns: side by side each would disturb the other
      const part = await measureLateness({ ...wish, period: 1e6, holdIdle: true }, progress.signal);
      pool(own, part.counts);
      share += part.share / SLICES;
      policy = part.policy;
      pool(floor, (await runCyclictest({ ...wish, interval: 1000 })) ?? new Map());
      if (progress.signal.aborted) throw new Error('stopped');
    }
    return {
      ...answer,
      policy,
      share,
      lateness: quantiles(own),
      cyclictest: floor.size > 0 ? quantiles(floor) : null,
      steps: stepsHeld(own, STEPS),
    };
  } catch (error) {
    if (progress.signal.aborted)
      throw new CommandError('stopped before the end of the measurement', exitCode.unfinished);
    throw error;
  } finally {
    clearInterval(timer);
    progress.done();
  }
}

function tryDisk(): DiskSpeed | undefined {
  try {
    return measureDisk(path.resolve('recordings'));
  } catch {
    return undefined;
  }
}

const marks = {
  good: pc.green('good'),
  'could be better': pc.yellow('could be better'),
  bad: pc.red('bad'),
  unknown: 'unknown',
} as const;

/** The answer in plain words. */
export function report(answer: ReadinessAnswer): string {
  const lines: string[] = [pc.bold(answer.computer), ''];
  for (const one of answer.findings) {
    lines.push(`${one.name}: ${one.found} (${marks[one.verdict]})`, `    ${one.meaning}`);
    if (one.verdict !== 'good') for (const remedy of one.remedy) lines.push(`    > ${remedy}`);
  }
  const { disk } = answer;
  lines.push(
    disk === null
      ? 'disk: recordings/ cannot be written here (bad)'
      : `disk: ${(disk.rate / 1e6).toFixed(0)} MB/s, longest write ${(disk.longest * 1000).toFixed(0)} ms, ${(disk.free / 1e9).toFixed(1)} GB free (${disk.rate > 20e6 ? marks.good : marks['could be better']})`,
    '    a bench of 500 signals records about 2.5 MB/s; a slow disk delays no step, it only loses rows in the end',
  );
  if (answer.lateness.count === 0) return [...lines, '', 'wake-ups: not measured'].join('\n');
  const row = (name: string, q: ReadinessAnswer['lateness'], note: string) => [
    name,
    String(q.count),
    ...[q.p50, q.p99, q.p999, q.max].map((value) => value.toFixed(1)),
    note,
  ];
  const rows = [
    ['', 'wake-ups', 'median', '99 %', '99.9 %', 'worst', ''],
    row("the loop's waiting", answer.lateness, `${answer.policy}, ${(100 * answer.share).toFixed(1)} % of a processor`),
    ...(answer.cyclictest ? [row('cyclictest', answer.cyclictest, 'same policy, in turns with it')] : []),
  ];
  lines.push(
    '',
    `lateness over ${answer.seconds} s at 1 kHz, µs; load of the computer ${answer.load.toFixed(1)}`,
    table(rows, [1, 2, 3, 4, 5]),
  );
  if (!answer.cyclictest) lines.push('cyclictest: not run: not installed (sudo apt install rt-tests)');
  lines.push('', 'steps that start within half their length, from these wake-ups alone and nothing beyond them:');
  lines.push(table([['step', 'later', 'with 95 % confidence at most'], ...answer.steps.map(stepRow)], [0, 1]));
  lines.push(
    'Late wake-ups come in bursts: measure for minutes, under the load of the day. A run judges its own timing in any case.',
  );
  return lines.join('\n');
}

function stepRow({ step, later, of, atMost }: StepVerdict): string[] {
  return [
    `${step * 1000} ms`,
    `${later} of ${of}`,
    `1 step in ${Math.floor(1 / atMost)}${atMost <= 1e-3 ? '' : ': not held'}`,
  ];
}

function seconds(text: string): number {
  try {
    const { value } = parseQuantity(text.trim().replace(/^([\d.]+)\s*([a-z]+)$/i, '$1 $2'), { unit: 's' });
    if (value >= 0 && value <= 86_400) return value;
  } catch {
    // said below
  }
  throw new InvalidArgumentError('a time from 0s to 24h, such as 10s or 5 min');
}

function whole(value: string): number {
  const number = Number(value);
  if (!Number.isInteger(number) || number < 0 || number >= os.cpus().length)
    throw new InvalidArgumentError(`a processor number 0 .. ${os.cpus().length - 1}`);
  return number;
}
