import type { BlockLayout } from './block.js';
import { BuildError, type Problem } from './contract.js';
import { watchSignals, watchSignalsOf } from './own-signals.js';
import type { SignalTable } from './signals.js';
import { laddersOf, type WatchInput, type WatchLadder } from './watch-ladders.js';

/**
 * The prediction: the pressure against a lag of an eighth of the look-ahead time is its smoothed rate. Whatever is below
 * half the gauge setting counts as half of it: a line that fills says nothing about its relief valve. It warns after the
 * predicted time has been within the look-ahead for a quarter of that, and keeps on up to 1.5 times of it.
 */
const smoothing = 0.125;
const confirming = 0.25;
export const keeping = 1.5;

/**
 * Slots of a warning in the block. Levels by their place on the ladder, from 1; 0: none. `since` is its first tick since
 * it was last closed, `began` that of the present time it is on.
 */
export const warningSlots = ['present', 'worst', 'since', 'until', 'peak', 'acknowledged', 'times', 'began'] as const;
export const SLOT = {
  present: 0,
  worst: 1,
  since: 2,
  until: 3,
  peak: 4,
  acknowledged: 5,
  times: 6,
  began: 7,
  count: 8,
} as const;

export interface WatchSetup {
  readonly watched: readonly WatchInput[];
  /** Tick length, s. */
  readonly step: number;
  /** What a gauge reads as zero, Pa. */
  readonly ambientPressure: number;
  readonly layout: BlockLayout;
  readonly signals: SignalTable;
}

/** What the watch looks up in a tick: settings, places in the block, indices of signals. Fixed once built. */
export class WatchTables {
  readonly ladders: readonly WatchLadder[];

  // By watched signal.
  readonly source: Int32Array;
  /** The ladders of signal i stand from ladderAt[i] to ladderAt[i + 1]. */
  readonly ladderAt: Int32Array;
  readonly peakSlot: number;
  /** -1 where the least value is the peak: signals watched from below only. */
  readonly peakSign: Float64Array;
  readonly levelSignal: Int32Array;
  readonly peakSignal: Int32Array;

  // By ladder. Values are multiplied by the sign, so that every setting is exceeded upwards.
  readonly sign: Float64Array;
  readonly sourceOf: Int32Array;
  readonly rungAt: Int32Array;
  readonly least: Float64Array;
  readonly slot: number;
  /** Place among the ladders with relief, or -1. */
  readonly reliefOf: Int32Array;

  // By rung.
  readonly begins: Float64Array;
  readonly ends: Float64Array;
  readonly setting: Float64Array;
  readonly number: Int32Array;

  // By ladder with relief.
  readonly relief: Float64Array;
  readonly floor: Float64Array;
  readonly gain: Float64Array;
  readonly lag: Float64Array;
  readonly lookAhead: Float64Array;
  readonly confirm: Float64Array;
  /** Place of `near relief` on the ladder, from 1. */
  readonly near: Int32Array;
  readonly timeSignal: Int32Array;
  readonly reliefSlot: number;

  readonly acknowledgeSlot: number;
  readonly worstSignal: number;
  readonly countSignal: number;
  readonly unseenSignal: number;

  /** Throws BuildError for paths that are no signals. */
  constructor({ watched, step, ambientPressure, layout, signals }: WatchSetup) {
    requireSignals(watched, signals);
    const bySignal = watched.map((input) => laddersOf(input, ambientPressure));
    const ladders = bySignal.flat();
    this.ladders = ladders;

    this.source = Int32Array.from(watched, (input) => signals.find(input.path));
    this.ladderAt = offsets(bySignal.map((some) => some.length));
    this.peakSign = Float64Array.from(bySignal, (some) => (some.length === 1 && some[0].side === 'below' ? -1 : 1));
    this.sign = Float64Array.from(ladders, (ladder) => (ladder.side === 'above' ? 1 : -1));
    this.sourceOf = Int32Array.from(ladders, (ladder) => signals.find(ladder.path));
    this.rungAt = offsets(ladders.map((ladder) => ladder.rungs.length));
    const rungs = ladders.flatMap((ladder) =>
      ladder.rungs.map((rung) => ({ ...rung, sign: ladder.side === 'above' ? 1 : -1 })),
    );
    this.begins = Float64Array.from(rungs, (rung) => rung.sign * rung.begins);
    this.ends = Float64Array.from(rungs, (rung) => rung.sign * rung.ends);
    this.setting = Float64Array.from(rungs, (rung) => rung.setting);
    this.number = Int32Array.from(rungs, (rung) => rung.number);
    this.least = Float64Array.from(ladders, (_, i) =>
      Math.min(...this.begins.subarray(this.rungAt[i], this.rungAt[i + 1])),
    );

    const predicting = ladders.flatMap((ladder) => (ladder.relief ? [{ ladder, ...ladder.relief }] : []));
    let count = 0;
    this.reliefOf = Int32Array.from(ladders, (ladder) => (ladder.relief ? count++ : -1));
    this.relief = Float64Array.from(predicting, (one) => one.setting);
    this.floor = this.relief.map((setting) => ambientPressure + 0.5 * (setting - ambientPressure));
    this.lag = Float64Array.from(predicting, (one) => Math.max(step, smoothing * one.lookAhead));
    this.gain = this.lag.map((lag) => step / (lag + step));
    this.lookAhead = Float64Array.from(predicting, (one) => one.lookAhead);
    this.confirm = this.lookAhead.map((time) => Math.max(1, Math.round((confirming * time) / step)));
    this.near = Int32Array.from(
      predicting,
      (one) => one.ladder.rungs.findIndex((rung) => rung.level === 'near relief') + 1,
    );

    this.acknowledgeSlot = layout.add('watch.acknowledge');
    layout.add('watch.acknowledge.before');
    this.slot = layout.length;
    for (const { path, side } of ladders)
      for (const name of warningSlots) layout.add(`watch.${path}.${side}.${name}`, name === 'until' ? -1 : 0);
    this.reliefSlot = layout.length;
    for (const { ladder } of predicting) {
      layout.add(`watch.${ladder.path}.smoothed`);
      layout.add(`watch.${ladder.path}.approaching`);
    }
    this.peakSlot = layout.length;
    for (const { path } of watched) layout.add(`watch.${path}.peak`);

    this.worstSignal = signals.add(watchSignals.worst);
    this.countSignal = signals.add(watchSignals.count);
    this.unseenSignal = signals.add(watchSignals.unacknowledged);
    this.levelSignal = new Int32Array(watched.length);
    this.peakSignal = new Int32Array(watched.length);
    const times: number[] = [];
    watched.forEach(({ path, unit }, i) => {
      const own = watchSignalsOf(path, unit, this.peakSign[i] < 0 ? 'least' : 'largest');
      this.levelSignal[i] = signals.add(own.level);
      this.peakSignal[i] = signals.add(own.peak);
      if (bySignal[i].some((ladder) => ladder.relief)) times.push(signals.add(own.timeToRelief));
    });
    this.timeSignal = Int32Array.from(times);
  }
}

/** Where each of several stretches begins, and the end of the last. */
function offsets(lengths: readonly number[]): Int32Array {
  const found = new Int32Array(lengths.length + 1);
  lengths.forEach((length, i) => {
    found[i + 1] = found[i] + length;
  });
  return found;
}

function requireSignals(watched: readonly WatchInput[], signals: SignalTable): void {
  const problems: Problem[] = watched
    .filter((input) => signals.find(input.path) < 0)
    .map((input) => {
      const near = signals.nearest(input.path);
      return {
        path: 'watch',
        what: 'no such signal',
        value: input.path,
        remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see `oilspring list signals BENCH`',
      };
    });
  if (problems.length > 0) throw new BuildError(problems);
}
