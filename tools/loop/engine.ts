import type { Assembly } from '../../configs/assemble.js';
import { hashText } from '../../runtime/block.js';
import { Clock } from '../../runtime/realtime/clock.js';
import type { CodeWatch } from '../../runtime/realtime/code-watch.js';
import type { Pacer } from '../../runtime/realtime/pacer.js';
import { PACER } from '../../runtime/realtime/pacer.js';
import type { BoardWriter } from '../../runtime/status-board.js';
import type { Barrier } from './controller-module.js';

/** Words of the small shared memory between host and loop thread. */
export const CONTROL = { stop: 0, phase: 1, refined: 2, words: 16 } as const;
export const PROGRESS = { tick: 0, words: 4 } as const;
export const phases = ['building', 'warming up', 'pre-roll', 'running', 'finished', 'failed'] as const;

export interface LoopControl {
  readonly control: Int32Array;
  readonly progress: Float64Array;
}

export function createLoopControl(
  memory: SharedArrayBuffer = new SharedArrayBuffer(4 * CONTROL.words + 8 * PROGRESS.words),
): LoopControl & { memory: SharedArrayBuffer } {
  return {
    memory,
    control: new Int32Array(memory, 0, CONTROL.words),
    progress: new Float64Array(memory, 4 * CONTROL.words, PROGRESS.words),
  };
}

export interface LoopOptions {
  readonly assembly: Assembly;
  /** Number of counted ticks to run. */
  readonly ticks: number;
  /** The first tick; default: the bench's. */
  readonly firstTick?: number | undefined;
  readonly shared: LoopControl;
  /** Barriers to be told the end of each tick. */
  readonly barriers: readonly Barrier[];
  /** Live: paces the ticks. Absent: as fast as it goes. */
  readonly pacer?: Pacer | undefined;
  /** Live: indices of the signals that get lateness and step of the tick before, s. */
  readonly timingSignals?: { readonly lateness: number; readonly step: number } | undefined;
  /** What the host may look at between rows. */
  readonly board?: BoardWriter | undefined;
  /** Largest values are kept of these signals. */
  readonly peaks: Int32Array;
  /** Asked in every tick whether the code is still what it was. */
  readonly code?: CodeWatch | undefined;
  /** Called between the pre-roll and tick 0, and once after the last counted tick: with how many there were. */
  readonly onCount?: ((ticks: number) => void) | undefined;
  /** Two signals that are kept every `stride` ticks: as many values as the arrays have room for. */
  readonly samples?: Samples | undefined;
  /** Ticks behind the last counted one, however the run ended. Absent: none. */
  readonly afterRun?: number | undefined;
}

export interface LoopEnd {
  /** Counted ticks done. */
  readonly ticks: number;
  readonly stopped: boolean;
  readonly peaks: Float64Array;
  readonly hash: string;
  /** What ended the run before its time. */
  readonly failure?: string;
  /** Wall time of the counted ticks, s. */
  readonly wall: number;
  /** Processor time of this thread in the counted ticks, s. */
  readonly processor: number;
}

export interface Samples {
  readonly signals: Int32Array;
  readonly stride: number;
  readonly into: readonly [Float64Array, Float64Array];
}

const noSamples: Samples = { signals: new Int32Array(2), stride: 1, into: [new Float64Array(0), new Float64Array(0)] };
const nobody: Barrier = { end() {} };

/**
 * What one tick of the loop does besides the bench's own tick, as a class: a method is compiled once and stays so, while
 * the body of a function that runs for ever has to be replaced under way, and boxes every number until then.
 */
export class LoopBody {
  readonly peaks: Float64Array;
  private readonly assembly: Assembly;
  private readonly block: Float64Array;
  private readonly signals: Float64Array;
  private readonly control: Int32Array;
  private readonly progress: Float64Array;
  private readonly ticks: number;
  private readonly peakSignals: Int32Array;
  private readonly barriers: readonly Barrier[];
  private readonly barrierCount: number;
  private readonly pacer: Pacer | undefined;
  private readonly board: BoardWriter | undefined;
  private readonly code: CodeWatch | undefined;
  private readonly lateness: number;
  private readonly step: number;
  private readonly samples: Samples;

  constructor(options: LoopOptions) {
    const { assembly, shared } = options;
    this.assembly = assembly;
    this.block = assembly.block;
    this.signals = assembly.signals;
    this.control = shared.control;
    this.progress = shared.progress;
    this.ticks = options.ticks;
    this.peakSignals = options.peaks;
    this.peaks = new Float64Array(options.peaks.length).fill(Number.NEGATIVE_INFINITY);
    // with a place more than is used: to the engine an empty array is of another kind than one that holds objects
    this.barriers = [...options.barriers, nobody];
    this.barrierCount = options.barriers.length;
    this.pacer = options.pacer;
    this.board = options.board;
    this.code = options.code;
    this.lateness = options.timingSignals?.lateness ?? -1;
    this.step = options.timingSignals?.step ?? -1;
    this.samples = options.samples ?? noSamples;
  }

  /** Waits for the tick's deadline (live) and shows how late the last one was. */
  wait(tick: number): void {
    const { pacer, signals, lateness } = this;
    if (pacer === undefined) return;
    pacer.wait();
    if (lateness < 0 || tick <= 0) return;
    signals[lateness] = pacer.times[PACER.lateness]! * 1e-9;
    signals[this.step] = pacer.times[PACER.step]! * 1e-9;
  }

  /** Runs tick number `tick`; true when the loop is to go on. */
  run(tick: number): boolean {
    const { assembly, block, signals, barriers, barrierCount, board, peaks, peakSignals } = this;
    assembly.tick.run(tick);
    for (let i = 0; i < barrierCount; i += 1) barriers[i]!.end(tick);
    if (tick >= 0) {
      for (let i = 0; i < peaks.length; i += 1) {
        const value = signals[peakSignals[i]!]!;
        if (value > peaks[i]!) peaks[i] = value;
      }
      this.sample(tick);
    }
    this.progress[PROGRESS.tick] = tick;
    if (board !== undefined && tick % board.every === 0) board.write(block, signals, tick);
    if (this.code !== undefined) this.code.check(tick);
    return !(assembly.plant.solver.failed || this.control[CONTROL.stop] !== 0 || block[assembly.hands.endedSlot] !== 0);
  }

  private sample(tick: number): void {
    const { signals, samples } = this;
    const { stride, into } = samples;
    if (tick % stride !== 0 || tick >= stride * into[0].length) return;
    into[0][tick / stride] = signals[samples.signals[0]!]!;
    into[1][tick / stride] = signals[samples.signals[1]!]!;
  }

  /** `count` ticks of after-run, the first of them `from`: nothing is counted any more. */
  afterRun(from: number, count: number): void {
    const { assembly, barriers, barrierCount, pacer, board, block, signals } = this;
    if (count > 0) assembly.tick.beginAfterRun(from);
    for (let tick = from; tick < from + count && !assembly.plant.solver.failed; tick += 1) {
      if (pacer !== undefined) pacer.wait();
      assembly.tick.run(tick);
      for (let i = 0; i < barrierCount; i += 1) barriers[i]!.end(tick);
      this.progress[PROGRESS.tick] = tick;
      if (board !== undefined && tick % board.every === 0) board.write(block, signals, tick);
    }
  }

  /** True past the last counted tick: a scenario that was held by hand ends later by as much. */
  over(tick: number): boolean {
    return tick >= this.ticks + this.block[this.assembly.scriptDelaySlot]!;
  }
}

/** Runs an assembled bench from its first tick. Nothing in the loop allocates. */
export function runLoop(options: LoopOptions): LoopEnd {
  const { assembly, shared, pacer, board } = options;
  const { tick: stage, block, signals, plant, hands } = assembly;
  const firstTick = options.firstTick ?? assembly.firstTick;
  const { control } = shared;
  const clock = new Clock();
  const times = new Float64Array(4);
  const body = new LoopBody(options);
  let tick = firstTick;
  let failure: string | undefined;
  let counted = -1;
  Atomics.store(control, CONTROL.phase, firstTick < 0 ? 2 : 3);
  try {
    pacer?.begin();
    while (!body.over(tick)) {
      if (tick === 0) {
        options.onCount?.(0);
        pacer?.count();
      }
      body.wait(tick);
      if (tick === 0) {
        Atomics.store(control, CONTROL.phase, 3);
        clock.now(times, 0);
        clock.threadTime(times, 1);
      }
      const goesOn = body.run(tick);
      tick += 1;
      if (!goesOn) break;
    }
    if (plant.solver.failed)
      failure = `the plant has no finite state any more after tick ${tick - 1}: see \`oilspring check\` for its fastest modes and accuracy`;
    pacer?.finish();
    clock.now(times, 2);
    clock.threadTime(times, 3);
    counted = Math.max(0, tick);
    options.onCount?.(counted);
    if (failure === undefined && tick >= 0) {
      try {
        body.afterRun(tick, options.afterRun ?? 0);
      } catch (error) {
        failure = `in the after-run: ${error instanceof Error ? error.message : String(error)}`;
      }
    }
  } catch (error) {
    failure = error instanceof Error ? error.message : String(error);
  }
  if (counted < 0) {
    // broken off in the middle: this is the end
    clock.now(times, 2);
    clock.threadTime(times, 3);
    counted = Math.max(0, tick);
    options.onCount?.(counted);
  }
  board?.write(block, signals, tick - 1);
  Atomics.store(control, CONTROL.phase, failure === undefined ? 4 : 5);
  return {
    ticks: counted,
    stopped: control[CONTROL.stop] !== 0 || block[hands.endedSlot] !== 0,
    peaks: body.peaks,
    hash: hashText(stage.hash[0]!, stage.hash[1]!),
    ...(failure === undefined ? {} : { failure }),
    wall: counted > 0 ? (times[2]! - times[0]!) * 1e-9 : 0,
    processor: counted > 0 ? (times[3]! - times[1]!) * 1e-9 : 0,
  };
}
