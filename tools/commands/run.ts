import { Command, InvalidArgumentError } from 'commander';
import { exitCode } from '../../runtime/verdict.js';
import { Frames } from '../run/frames.js';
import { hostRun, type RunOutcome, softwareVersion } from '../run/host-run.js';
import { planRun, type RunPlan, type RunWish } from '../run/plan.js';
import { summarise } from '../run/summarise.js';
import { eventText } from '../terminal/event-text.js';
import { renderStart } from '../terminal/start-up.js';
import { styleOf } from '../terminal/style.js';
import { renderSummary } from '../terminal/summary.js';
import { TerminalView } from '../terminal/view.js';
import { complain } from './failure.js';

interface RunFlags {
  readonly scenario?: string;
  readonly for?: string;
  readonly pace: 'live' | 'fast';
  readonly controller?: string;
  readonly record?: string | false;
  readonly seed?: number;
  readonly json?: boolean;
  readonly profile?: boolean;
  readonly core?: number;
}

export function runCommand(): Command {
  return new Command('run')
    .description('runs a bench: live in real time, or fast in lockstep')
    .argument('BENCH', 'bench file')
    .option('--scenario <FILE>', "scenario; default: the bench's duty")
    .option('--for <20s>', 'how long; default: as long as the scenario')
    .option('--pace <live|fast>', 'live: real time; fast: no waiting', pace, 'live')
    .option('--controller <CMD>', 'a command to start; or module, process, external (it is there already), none')
    .option('--record <FILE>', 'recording; default: a new file under recordings/')
    .option('--no-record', 'record nothing')
    .option('--seed <N>', "seed of all noise; default: the bench's", whole)
    .option('--core <N>', 'processor that the loop thread stays on (live)', whole)
    .option('--profile', 'measure each stage of the tick')
    .option('--json', 'one object on standard output at the end, and nothing else')
    .addHelpText(
      'after',
      `
Examples:
  oilspring run configs/harbour-truck/bench.yaml
  oilspring run configs/harbour-truck/bench.yaml --pace fast --json
  oilspring run my/bench.yaml --scenario my/hill.yaml --controller external --for 2min

Ctrl-C ends a run cleanly at any moment, with the recording whole.`,
    )
    .action(async (bench: string, flags: RunFlags) => {
      const wish: RunWish = { ...flags, bench, record: flags.record === false ? '' : flags.record };
      const plan = planRun(wish);
      process.exitCode = await runAndShow(plan, { json: flags.json ?? false });
    });
}

export interface ShowOptions {
  /** One object on standard output and nothing else. */
  readonly json?: boolean;
  /** Serve the live page. */
  readonly page?: boolean;
}

/** Runs a plan with the terminal view, records, prints the summary; the exit code. */
export async function runAndShow(plan: RunPlan, options: ShowOptions): Promise<number> {
  const json = options.json ?? false;
  const abort = new AbortController();
  const onSignal = () => abort.abort();
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  let outcome: RunOutcome;
  const view = json ? undefined : new TerminalView({ stream: process.stdout });
  if (view) process.stdout.write(startText(plan, view.columns));
  try {
    let frames: Frames | undefined;
    outcome = await hostRun(plan, {
      abort: abort.signal,
      onReady: (run) => {
        frames = new Frames(run);
      },
      onEvent: (_run, event) => {
        const note = frames?.note(event, eventText);
        if (note) view?.note(note);
      },
      onTimer: (run) => view?.update((frames ?? new Frames(run)).frame()),
    });
  } finally {
    view?.close();
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
  }
  const summary = summarise(outcome);
  try {
    await outcome.finish({ ...summary });
  } catch (error) {
    complain(error);
  }
  if (outcome.failed) complainAboutLoop(outcome);
  const final = outcome.recordingFailure === undefined ? summary : summarise(outcome);
  if (json) process.stdout.write(`${JSON.stringify(final)}\n`);
  else if (outcome.done) process.stdout.write(renderSummary(final, process.stdout.columns ?? 80, styleOf(process.stdout), deriveCommand(final.recording)));
  return final.exitCode;
}

function deriveCommand(recording: string | null): string | undefined {
  return recording === null ? undefined : `npm run -s oilspring -- rederive ${recording}`;
}

function startText(plan: RunPlan, columns: number): string {
  const { spec, script, wish } = plan;
  const link = spec.map.links[0];
  const controllers = {
    module: 'a module in the loop thread, in lockstep',
    none: 'nobody: substitutes count',
    process: `a process of its own over UDP${link?.remoteAddress ? `, ${link.remoteAddress}:${link.remotePort}` : ''}`,
  };
  return renderStart(
    {
      version: softwareVersion(),
      bench: spec.name,
      about: spec.about,
      benchFile: wish.bench,
      scenario: script.name,
      length: plan.ticks * spec.step,
      pace: wish.pace,
      controller: controllers[plan.controller.kind],
      seed: plan.seed,
      recording: plan.recording ?? null,
      remarks: spec.remarks.map((remark) => `${remark.path}: ${remark.what}`),
      relief: Object.fromEntries(spec.watched.flatMap((input) => (input.relief ? [[input.path, input.relief.setting]] : []))),
    },
    columns,
    styleOf(process.stdout),
  );
}

function complainAboutLoop(outcome: RunOutcome): void {
  process.stderr.write(`error ${outcome.failed!.what}\n`);
  if (outcome.controllerEnded !== undefined) process.stderr.write(`error the controller ${outcome.controllerEnded}\n`);
  if (outcome.failed!.code === exitCode.unfinished && outcome.recording !== undefined) process.stderr.write(`what was recorded until then is in ${outcome.recording}\n`);
}

function pace(value: string): 'live' | 'fast' {
  if (value !== 'live' && value !== 'fast') throw new InvalidArgumentError('live or fast');
  return value;
}

function whole(value: string): number {
  const number = Number(value);
  if (!Number.isInteger(number) || number < 0) throw new InvalidArgumentError('a whole number, 0 or more');
  return number;
}
