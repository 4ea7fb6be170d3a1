import { readFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { Worker } from 'node:worker_threads';
import { machineFacts } from '../../runtime/realtime/machine-facts.js';
import { TimingRecord } from '../../runtime/realtime/timing-record.js';
import { FORMAT, type RecordingHeader } from '../../runtime/recording/format.js';
import { Recorder } from '../../runtime/recording/recorder.js';
import { RecordingWriter } from '../../runtime/recording/writer.js';
import { createRing } from '../../runtime/ring.js';
import { BoardReader } from '../../runtime/status-board.js';
import { packageRoot } from '../loop/controller-module.js';
import { CONTROL, createLoopControl, PROGRESS, phases } from '../loop/engine.js';
import type { LoopMessage, RunDone, RunFailed, RunOrder, RunReady } from '../loop/run-order.js';
import { answerText, keptAnswer } from '../readiness/answer.js';
import { ControllerChild } from './controller-child.js';
import { HandChannel } from './hand-channel.js';
import type { RunPlan } from './plan.js';

/** What the host sees of a run while it goes on. */
export interface RunView {
  readonly plan: RunPlan;
  readonly phase: string;
  readonly tick: number;
  /** The last row that was read: values of `ready.signals`. */
  readonly values: Float32Array | undefined;
  readonly ready: RunReady | undefined;
  readonly timing: TimingRecord;
  readonly controller: ControllerChild | undefined;
  /** What stands beside the rows: warnings, ages and counts; from `onReady` on. */
  readonly board: BoardReader | undefined;
  /** Rows that the ring dropped, and records that must not be lost and were. */
  readonly droppedRows: number;
  /** Only when hands may act. */
  readonly hands: HandChannel | undefined;
}

/** An event as the host takes it from the ring; `code` and `subject` index the catalogue of the run. */
export interface JournaledEvent {
  readonly tick: number;
  readonly code: number;
  readonly subject: number;
  readonly a: number;
  readonly b: number;
  readonly c: number;
}

export interface RunHooks {
  /** Everything is built; the recording is open. */
  onReady?(view: RunView): void;
  /** Hands may act on the run. */
  readonly control?: boolean;
  /** All rows in batches, values row after row, in arrays that the next batch overwrites. */
  onRows?(view: RunView, ticks: Float64Array, values: Float32Array, count: number): void;
  /** The last row of each look at the ring, and each event. */
  onRow?(view: RunView, tick: number, values: Float32Array): void;
  onEvent?(view: RunView, event: JournaledEvent): void;
  /** From the host's timer, about every 200 ms. */
  onTimer?(view: RunView): void;
  readonly abort?: AbortSignal;
}

export interface RunOutcome {
  readonly plan: RunPlan;
  readonly ready: RunReady | undefined;
  readonly done: RunDone | undefined;
  readonly failed: RunFailed | undefined;
  readonly timing: TimingRecord;
  readonly recording: string | undefined;
  readonly recordingFailure: string | undefined;
  readonly rows: number;
  /** Counted ticks up to the last one that was read, also of a loop that could not say how far it came. */
  readonly ticks: number;
  /** Processor time of the whole process in the run, s. */
  readonly processor: number;
  /** Wall time from the order to the first counted tick, s. */
  readonly startUp: number;
  /** How a controller that we started ended before the run did; undefined when it did not. */
  readonly controllerEnded: string | undefined;
  /** Hands that acted on the run, one sentence each. */
  readonly hands: readonly string[];
  /** Completes the recording with the summary and closes it. */
  finish(summary: Readonly<Record<string, unknown>>): Promise<void>;
}

/** Runs a planned bench on a loop thread of its own and records it. Resolves when the loop has ended. */
export async function hostRun(plan: RunPlan, hooks: RunHooks = {}): Promise<RunOutcome> {
  const { wish, spec } = plan;
  const began = performance.now();
  const usage = process.cpuUsage();
  const ring = createRing({ capacity: 16 << 20, whenFull: wish.pace === 'live' ? 'drop' : 'wait' });
  const shared = createLoopControl();
  const timing = new TimingRecord();
  const hands = hooks.control ? new HandChannel(spec.step) : undefined;
  let board: BoardReader | undefined;
  const order: RunOrder = {
    sources: plan.benchSources,
    script: plan.script,
    seed: plan.seed,
    pace: wish.pace,
    ticks: plan.ticks,
    folder: plan.folder,
    controller: plan.controller.kind === 'process' ? { kind: 'udp' } : plan.controller,
    ring,
    control: shared.memory,
    hands: hands?.ring,
    timing: timing.memory,
    patterns: spec.record.patterns,
    peaks: spec.record.peaks,
    profile: wish.profile ?? false,
    core: wish.core,
    ordered: performance.timeOrigin + began,
  };
  const child =
    plan.controller.kind === 'process' && plan.controller.command !== undefined
      ? new ControllerChild(plan, plan.controller.command)
      : undefined;
  let ready: RunReady | undefined;
  let done: RunDone | undefined;
  let failed: RunFailed | undefined;
  let recorder: Recorder | undefined;
  let writer: RecordingWriter | undefined;
  let startUp = 0;
  let tick = Number.NEGATIVE_INFINITY;
  let values: Float32Array | undefined;
  const view: RunView = {
    plan,
    timing,
    controller: child,
    hands,
    get droppedRows() {
      return (recorder?.dropped ?? 0) + (recorder?.overflows ?? 0);
    },
    get board() {
      return board;
    },
    get phase() {
      return phases[Atomics.load(shared.control, CONTROL.phase)]!;
    },
    get tick() {
      return ready === undefined ? tick : shared.progress[PROGRESS.tick]!;
    },
    get values() {
      return values;
    },
    get ready() {
      return ready;
    },
  };

  const stop = () => {
    Atomics.store(shared.control, CONTROL.stop, 1);
  };
  hooks.abort?.addEventListener('abort', stop);
  const here = fileURLToPath(import.meta.url);
  const worker = new Worker(path.join(path.dirname(here), '..', 'loop', 'loop-worker.js'), {
    workerData: order,
    stdout: false,
    stderr: false,
  });
  const timer = setInterval(() => {
    if (startUp === 0 && Atomics.load(shared.control, CONTROL.phase) >= 3) startUp = (performance.now() - began) / 1000;
    hooks.onTimer?.(view);
  }, 200);
  try {
    await new Promise<void>((resolve) => {
      worker.on('message', (message: LoopMessage) => {
        if (message.kind === 'ready') {
          ready = message;
          board = new BoardReader(message.board);
          hands?.know(message);
          try {
            if (plan.recording !== undefined) writer = new RecordingWriter(plan.recording, headerOf(plan, message));
          } catch (error) {
            failed = { kind: 'failed', what: (error as Error).message, code: 2 };
            stop();
          }
          recorder = new Recorder(ring, writer, {
            signals: message.signals.length,
            onRow: (at, row) => {
              tick = at;
              values = row;
              hooks.onRow?.(view, at, row);
            },
            ...(hooks.onRows === undefined
              ? {}
              : { onRows: (ticks, rows, count) => hooks.onRows?.(view, ticks, rows, count) }),
            onEvent: (at, code, subject, a, b, c) => {
              hands?.answered(at, code, c);
              hooks.onEvent?.(view, { tick: at, code, subject, a, b, c });
            },
          });
          recorder.start();
          hooks.onReady?.(view);
        } else if (message.kind === 'done') done = message;
        else failed ??= message;
      });
      worker.on('error', (error) => {
        failed ??= { kind: 'failed', what: `the loop thread ended in an error: ${error.message}`, code: 5 };
        resolve();
      });
      worker.on('exit', (code) => {
        // a controller's module may end the thread that it runs in
        if (done === undefined)
          failed ??= { kind: 'failed', what: `the loop thread ended without a word, with exit code ${code}`, code: 5 };
        resolve();
      });
    });
  } finally {
    clearInterval(timer);
    hands?.end();
    hooks.abort?.removeEventListener('abort', stop);
    await child?.stop();
  }
  const used = process.cpuUsage(usage);
  return {
    plan,
    ready,
    done,
    failed,
    timing,
    recording: writer?.file,
    get recordingFailure() {
      return writer?.failure === undefined ? undefined : writer.failureError().message;
    },
    get rows() {
      return recorder?.rows ?? 0;
    },
    get ticks() {
      return done?.ticks ?? (ready === undefined ? 0 : Math.max(0, shared.progress[PROGRESS.tick]! + 1));
    },
    processor: (used.user + used.system) / 1e6,
    startUp,
    controllerEnded: child?.ended,
    hands: hands?.sentences() ?? [],
    finish: async (summary) => {
      await recorder?.finish(summary);
    },
  };
}

export function softwareVersion(): string {
  return (JSON.parse(readFileSync(path.join(packageRoot(), 'package.json'), 'utf8')) as { version: string }).version;
}

function headerOf(plan: RunPlan, ready: RunReady): RecordingHeader {
  const { wish, spec } = plan;
  return {
    format: FORMAT,
    run: `${new Date().toISOString()}-${process.pid}`,
    created: new Date().toISOString(),
    software: { version: softwareVersion(), node: process.version, v8: process.versions.v8 },
    machine: {
      ...machineFacts(),
      scheduling: ready.scheduling.join('; '),
      ...(wish.pace === 'live' ? { readiness: answerText(keptAnswer()) } : {}),
    },
    bench: { name: spec.name, files: plan.benchSources.map((source) => ({ path: source.path, text: source.text })) },
    scenario:
      plan.scenarioSources.length === 0
        ? null
        : { path: plan.scenarioSources[0]!.path, text: plan.scenarioSources[0]!.text },
    seed: plan.seed,
    step: spec.step,
    pace: wish.pace,
    options: { ticks: plan.ticks, controller: plan.controller.kind, script: JSON.stringify(plan.script) },
    signals: ready.signals.map((signal) => ({ ...signal })),
    events: { kinds: ready.events.kinds.map((kind) => ({ ...kind })), subjects: [...ready.events.subjects] },
    links: [...ready.links],
    block: [...ready.block],
  };
}
