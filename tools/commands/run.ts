import path from 'node:path';
import { Command, InvalidArgumentError } from 'commander';
import { BuildError } from '../../runtime/contract.js';
import { exitCode } from '../../runtime/verdict.js';
import { type LivePage, type PageWish, readPageWish } from '../live/live-page.js';
import { pageHooks, placeOfPage } from '../live/page-of-run.js';
import { Frames } from '../run/frames.js';
import { hostRun, type RunOutcome, softwareVersion } from '../run/host-run.js';
import { planRun, type RunPlan, type RunWish } from '../run/plan.js';
import { summarise } from '../run/summarise.js';
import { lastWithoutEnd } from '../salvage/last-without-end.js';
import { eventText } from '../terminal/event-text.js';
import { renderStart } from '../terminal/start-up.js';
import { styleOf } from '../terminal/style.js';
import { renderSummary } from '../terminal/summary.js';
import { clean } from '../terminal/text.js';
import { TerminalView } from '../terminal/view.js';
import { complain } from './failure.js';
import { writeReports } from './report.js';

interface RunFlags {
  readonly scenario?: string;
  readonly case?: string;
  readonly set?: Readonly<Record<string, string>>;
  readonly for?: string;
  readonly pace: 'live' | 'fast';
  readonly controller?: string;
  readonly without?: readonly string[];
  readonly disturb?: readonly string[];
  readonly record?: string | false;
  readonly seed?: number;
  readonly json?: boolean;
  readonly report?: string;
  readonly profile?: boolean;
  readonly core?: number;
  readonly page?: string | boolean;
  readonly control?: boolean;
  readonly liveName?: readonly string[];
}

export function runCommand(): Command {
  return new Command('run')
    .description('runs a bench: live in real time, or fast in lockstep')
    .argument('BENCH', 'bench file')
    .option('--scenario <FILE>', "scenario; default: the bench's duty")
    .option('--case <NAME>', "one of the scenario's cases")
    .option('--set <NAME=VALUE>', "a parameter of the scenario, such as payload='900 kg'; may be given again", setting)
    .option('--for <20s>', 'how long; default: as long as the scenario')
    .option('--pace <live|fast>', 'live: real time; fast: no waiting', pace, 'live')
    .option('--controller <CMD>', 'a command to start; or module, process, external (it is there already), none')
    .option('--without <UNIT...>', 'control units that are really there: the bench does not stand in for them')
    .option(
      '--disturb <PATH=VALUE@TIME...>',
      "a command disturbed from a time on, or to another: 'bus.sentDrop=0.3@5s..8s'",
    )
    .option('--record <FILE>', 'recording; default: a new file under recordings/')
    .option('--no-record', 'record nothing')
    .option('--seed <N>', "seed of all noise; default: the bench's", whole)
    .option('--core <N>', 'processor that the loop thread stays on (live)', whole)
    .option('--page [ADDRESS:PORT]', 'serve the live page; default 127.0.0.1 and a free port; off: none')
    .option('--control', 'let hands act through the live page, with the token that is printed (live)')
    .option('--live-name <NAME...>', 'names by which other machines may call the live page')
    .option('--report <FILE.html>', 'the report of the run, made from its recording')
    .option('--profile', 'measure each stage of the tick')
    .option('--json', 'one object on standard output at the end, and nothing else')
    .addHelpText(
      'after',
      `
Examples:
  oilspring run configs/harbour-truck/bench.yaml
  oilspring run configs/harbour-truck/bench.yaml --pace fast --json
  oilspring run configs/harbour-truck/bench.yaml --page --control
  oilspring run my/bench.yaml --scenario my/hill.yaml --controller external --for 2min

Ctrl-C ends a run cleanly at any moment, with the recording whole.`,
    )
    .action(async (bench: string, flags: RunFlags) => {
      const wish: RunWish = { ...flags, bench, record: flags.record === false ? '' : flags.record };
      const plan = planRun(wish);
      if (flags.report !== undefined && plan.recording === undefined)
        throw new BuildError([
          {
            path: '--report',
            what: 'a report is made from the recording, and nothing is recorded',
            remedy: 'leave --no-record away',
          },
        ]);
      const page = readPageWish(flags.page, flags.control ?? false, flags.liveName);
      process.exitCode = await runAndShow(plan, {
        json: flags.json ?? false,
        ...(flags.report === undefined ? {} : { report: flags.report }),
        ...(page === undefined ? {} : { page }),
      });
    });
}

export interface ShowOptions {
  /** File for the report of the run. */
  readonly report?: string;
  /** One object on standard output and nothing else. */
  readonly json?: boolean;
  /** Serve the live page: where, and whether hands may act; true: at the usual place, without hands. */
  readonly page?: PageWish | boolean;
}

/** Runs a plan with the terminal view, records, prints the summary; the exit code. */
export async function runAndShow(plan: RunPlan, options: ShowOptions): Promise<number> {
  const page = await placeOfPage(plan, options.page);
  try {
    return await runShown(plan, options, page);
  } finally {
    await page?.close();
  }
}

async function runShown(plan: RunPlan, options: ShowOptions, page: LivePage | undefined): Promise<number> {
  const json = options.json ?? false;
  const abort = new AbortController();
  const onSignal = () => abort.abort();
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  let outcome: RunOutcome;
  const view = json ? undefined : new TerminalView({ stream: process.stdout });
  if (view) mentionCrash(plan);
  if (view) process.stdout.write(startText(plan, view.columns, page?.invitation));
  else if (page) process.stderr.write(`live page ${page.invitation}\n`);
  try {
    let frames: Frames | undefined;
    const remark = (text: string) => {
      if (view) view.note({ time: 0, severity: 'warning', text });
      else process.stderr.write(`${text}\n`);
    };
    const live = page === undefined ? undefined : pageHooks(page, plan, remark);
    outcome = await hostRun(plan, {
      ...live,
      abort: abort.signal,
      onReady: (run) => {
        frames = new Frames(run);
        live?.onReady(run);
      },
      onEvent: (run, event) => {
        live?.onEvent(run, event);
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
  // pages see the last rows, and that it has ended
  await page?.settle();
  if (outcome.failed) complainAboutLoop(outcome);
  const final = outcome.recordingFailure === undefined ? summary : summarise(outcome);
  if (json) process.stdout.write(`${JSON.stringify(final)}\n`);
  else if (outcome.done)
    process.stdout.write(
      renderSummary(final, process.stdout.columns ?? 80, styleOf(process.stdout), deriveCommand(final.recording)),
    );
  if (options.report !== undefined && final.recording !== null && outcome.recordingFailure === undefined)
    writeReports(final.recording, { to: options.report });
  return final.exitCode;
}

/** A run before this one may have been cut off, and nobody has looked yet. */
function mentionCrash(plan: RunPlan): void {
  const file = plan.recording === undefined ? undefined : lastWithoutEnd(path.dirname(plan.recording));
  if (file !== undefined)
    process.stderr.write(`note the last recording before this one has no end: oilspring salvage ${clean(file)}\n`);
}

function deriveCommand(recording: string | null): string | undefined {
  return recording === null ? undefined : `npm run -s oilspring -- rederive ${recording}`;
}

function startText(plan: RunPlan, columns: number, page: string | undefined): string {
  const { spec, script, wish } = plan;
  const link = spec.map.links[0];
  const controllers = {
    module: 'a module in the loop thread, in lockstep',
    none: 'nobody: substitutes count',
    process:
      link?.kind === 'udp' && link.remoteAddress
        ? `a process of its own over UDP, ${link.remoteAddress}:${link.remotePort}`
        : `a process of its own over ${link?.kind ?? 'no link'}${link?.interface ? `, ${link.interface}` : ''}`,
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
      ...(page === undefined ? {} : { page }),
      remarks: spec.remarks.map((remark) => `${remark.path}: ${remark.what}`),
      relief: Object.fromEntries(
        spec.watched.flatMap((input) => (input.relief ? [[input.path, input.relief.setting]] : [])),
      ),
    },
    columns,
    styleOf(process.stdout),
  );
}

function complainAboutLoop(outcome: RunOutcome): void {
  process.stderr.write(`error ${outcome.failed!.what}\n`);
  if (outcome.controllerEnded !== undefined) process.stderr.write(`error the controller ${outcome.controllerEnded}\n`);
  if (outcome.failed!.code === exitCode.unfinished && outcome.recording !== undefined)
    process.stderr.write(`what was recorded until then is in ${outcome.recording}\n`);
}

export function pace(value: string): 'live' | 'fast' {
  if (value !== 'live' && value !== 'fast') throw new InvalidArgumentError('live or fast');
  return value;
}

/** Collects `NAME=VALUE`. */
export function setting(
  value: string,
  before: Readonly<Record<string, string>> = {},
): Readonly<Record<string, string>> {
  const at = value.indexOf('=');
  if (at < 1) throw new InvalidArgumentError('write NAME=VALUE');
  return { ...before, [value.slice(0, at).trim()]: value.slice(at + 1).trim() };
}

function whole(value: string): number {
  const number = Number(value);
  if (!Number.isInteger(number) || number < 0) throw new InvalidArgumentError('a whole number, 0 or more');
  return number;
}
