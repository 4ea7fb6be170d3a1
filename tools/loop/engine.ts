import type { Assembly } from '../../configs/assemble.js';
import { hashText } from '../../runtime/block.js';
import { Clock } from '../../runtime/realtime/clock.js';
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

export function createLoopControl(memory: SharedArrayBuffer = new SharedArrayBuffer(4 * CONTROL.words + 8 * PROGRESS.words)): LoopControl & { memory: SharedArrayBuffer } {
  return { memory, control: new Int32Array(memory, 0, CONTROL.words), progress: new Float64Array(memory, 4 * CONTROL.words, PROGRESS.words) };
}

export interface LoopOptions {
  readonly assembly: Assembly;
  /** Number of counted ticks to run. */
  readonly ticks: number;
  readonly shared: LoopControl;
  /** Barriers to be told the end of each tick. */
  readonly barriers: readonly Barrier[];
  /** Live: paces the ticks. Absent: as fast as it goes. */
  readonly pacer?: Pacer;
  /** Live: indices of the signals that get lateness and step of the tick before, s. */
  readonly timingSignals?: { readonly lateness: number; readonly step: number };
  /** What the host may look at between rows. */
  readonly board?: BoardWriter;
  /** Largest values are kept of these signals. */
  readonly peaks: Int32Array;
  /** Called between the pre-roll and tick 0, and once after the last tick. */
  readonly onCount?: () => void;
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

/** Runs an assembled bench from its first tick. Nothing in the loop allocates. */
export function runLoop(options: LoopOptions): LoopEnd {
  const { assembly, shared, pacer, barriers } = options;
  const { tick: stage, block, signals, plant, firstTick, hands } = assembly;
  const { control, progress } = shared;
  const clock = new Clock();
  const times = new Float64Array(4);
  const peaks = new Float64Array(options.peaks.length).fill(Number.NEGATIVE_INFINITY);
  const timing = options.timingSignals;
  const board = options.board;
  const delay = assembly.scriptDelaySlot;
  let tick = firstTick;
  let failure: string | undefined;
  const last = options.ticks;
  Atomics.store(control, CONTROL.phase, firstTick < 0 ? 2 : 3);
  try {
    pacer?.begin();
    // a scenario that was held by hand ends later by as much
    for (; tick < last + block[delay]!; tick += 1) {
      if (tick === 0) {
        options.onCount?.();
        pacer?.count();
      }
      if (pacer) {
        pacer.wait();
        if (timing && tick > 0) {
          signals[timing.lateness] = pacer.times[PACER.lateness]! * 1e-9;
          signals[timing.step] = pacer.times[PACER.step]! * 1e-9;
        }
      }
      if (tick === 0) {
        Atomics.store(control, CONTROL.phase, 3);
        clock.now(times, 0);
        clock.threadTime(times, 1);
      }
      stage.run(tick);
      for (let i = 0; i < barriers.length; i += 1) barriers[i]!.end(tick);
      if (tick >= 0) {
        for (let i = 0; i < peaks.length; i += 1) {
          const value = signals[options.peaks[i]!]!;
          if (value > peaks[i]!) peaks[i] = value;
        }
      }
      progress[PROGRESS.tick] = tick;
      if (board && tick % board.every === 0) board.write(block, signals, tick);
      if (plant.solver.failed) {
        failure = `the plant has no finite state any more after tick ${tick}: see \`oilspring check\` for its fastest modes and accuracy`;
        tick += 1;
        break;
      }
      if (control[CONTROL.stop] !== 0 || block[hands.endedSlot] !== 0) {
        tick += 1;
        break;
      }
    }
    pacer?.finish();
  } catch (error) {
    failure = error instanceof Error ? error.message : String(error);
  }
  clock.now(times, 2);
  clock.threadTime(times, 3);
  board?.write(block, signals, tick - 1);
  options.onCount?.();
  Atomics.store(control, CONTROL.phase, failure === undefined ? 4 : 5);
  const counted = Math.max(0, tick);
  return {
    ticks: counted,
    stopped: control[CONTROL.stop] !== 0 || block[hands.endedSlot] !== 0,
    peaks,
    hash: hashText(stage.hash[0]!, stage.hash[1]!),
    ...(failure === undefined ? {} : { failure }),
    wall: counted > 0 ? (times[2]! - times[0]!) * 1e-9 : 0,
    processor: counted > 0 ? (times[3]! - times[1]!) * 1e-9 : 0,
  };
}
