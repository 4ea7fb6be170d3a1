import type { History } from './source.js';

/** One ring of intervals, all of `ticks` ticks: the least and greatest value of every signal. */
class Tier {
  private readonly least: Float32Array;
  private readonly most: Float32Array;
  /** Number of the interval that stands in a slot: floor(tick / ticks); -1 while empty. */
  private readonly numbers: Float64Array;
  /** Number of the newest interval, -1 before the first row. */
  newest = -1;

  constructor(
    readonly ticks: number,
    readonly slots: number,
    private readonly signals: number,
  ) {
    this.least = new Float32Array(slots * signals);
    this.most = new Float32Array(slots * signals);
    this.numbers = new Float64Array(slots).fill(-1);
  }

  get bytes(): number {
    return this.least.byteLength + this.most.byteLength + this.numbers.byteLength;
  }

  add(tick: number, values: Float32Array, at: number): void {
    const { signals, least, most } = this;
    const number = Math.floor(tick / this.ticks);
    const slot = number % this.slots;
    const base = slot * signals;
    if (this.numbers[slot] !== number) {
      this.numbers[slot] = number;
      if (number > this.newest) this.newest = number;
      for (let i = 0; i < signals; i += 1) {
        least[base + i] = values[at + i];
        most[base + i] = values[at + i];
      }
      return;
    }
    for (let i = 0; i < signals; i += 1) {
      const value = values[at + i];
      // written so that NaN never displaces a number and a number displaces NaN
      if (value < least[base + i] || Number.isNaN(least[base + i])) least[base + i] = value;
      if (value > most[base + i] || Number.isNaN(most[base + i])) most[base + i] = value;
    }
  }

  /** First tick that is certainly still here. */
  get oldestTick(): number {
    return Math.max(0, (this.newest - this.slots + 1) * this.ticks);
  }

  /** Merges interval `number` of one signal into `least[at]` and `most[at]`; false when it is not here. */
  merge(number: number, signal: number, into: { least: Float32Array; most: Float32Array }, at: number): boolean {
    const slot = number % this.slots;
    if (this.numbers[slot] !== number) return false;
    const low = this.least[slot * this.signals + signal];
    const high = this.most[slot * this.signals + signal];
    if (low < into.least[at] || Number.isNaN(into.least[at])) into.least[at] = low;
    if (high > into.most[at] || Number.isNaN(into.most[at])) into.most[at] = high;
    return true;
  }
}

export interface DecimatorOptions {
  readonly signals: number;
  /** Ticks of the finest interval: what one display frame covers. */
  readonly interval: number;
  /** Factor and number of slots of each ring; the first factor is 1. */
  readonly tiers?: readonly { readonly factor: number; readonly slots: number }[];
}

/** At 1 kHz and 40-tick intervals: one minute at 40 ms, 15 minutes at 200 ms, two hours at 2 s. */
const usualTiers = [
  { factor: 1, slots: 1500 },
  { factor: 5, slots: 4500 },
  { factor: 50, slots: 3600 },
];

/**
 * Reduces rows to the least and greatest value of every signal over each display interval, so that a spike of one
 * tick is always drawn, and keeps them in rings of fixed size for looking back. Min/max decimation keeps extremes
 * exactly; nothing is averaged.
 */
export class Decimator {
  readonly interval: number;
  /** Values of the newest row. */
  readonly last: Float32Array;
  /** Newest tick, -1 before the first row. */
  lastTick = -1;
  /** Rows taken. */
  rowCount = 0;
  /** Ticks that never came: dropped before they reached the host thread. */
  missing = 0;
  private readonly signals: number;
  private readonly tiers: readonly Tier[];

  constructor(options: DecimatorOptions) {
    this.signals = options.signals;
    this.interval = options.interval;
    this.last = new Float32Array(options.signals).fill(Number.NaN);
    this.tiers = (options.tiers ?? usualTiers).map(
      (tier) => new Tier(options.interval * tier.factor, tier.slots, options.signals),
    );
  }

  /** Fixed from the start, bytes. */
  get bytes(): number {
    return this.tiers.reduce((sum, tier) => sum + tier.bytes, this.last.byteLength);
  }

  rows(ticks: Float64Array, values: Float32Array, count: number): void {
    for (let row = 0; row < count; row += 1) {
      const tick = ticks[row];
      if (!(tick > this.lastTick)) continue;
      const at = row * this.signals;
      for (const tier of this.tiers) tier.add(tick, values, at);
      if (this.lastTick >= 0) this.missing += tick - this.lastTick - 1;
      this.lastTick = tick;
      this.rowCount += 1;
    }
    if (count > 0) this.last.set(values.subarray((count - 1) * this.signals, count * this.signals));
  }

  /** The oldest tick that the coarsest ring still holds. */
  get oldestTick(): number {
    return this.tiers[this.tiers.length - 1].oldestTick;
  }

  /** Number of the newest whole display interval, -1 while there is none. */
  get newestWhole(): number {
    return Math.floor((this.lastTick + 1) / this.interval) - 1;
  }

  /**
   * `signals` over [from, to] in at most `bins` equal intervals, from the finest ring that reaches back to `from`.
   * Intervals without any row are left out; an empty answer is possible.
   */
  history(signals: readonly number[], from: number, to: number, bins: number): History {
    const first = Math.max(0, from);
    const last = Math.min(to, this.lastTick);
    const tier = this.tiers.find((candidate) => candidate.oldestTick <= first) ?? this.tiers[this.tiers.length - 1];
    const start = Math.max(Math.floor(first / tier.ticks), Math.floor(tier.oldestTick / tier.ticks));
    const end = Math.floor(last / tier.ticks);
    if (end < start || last < 0)
      return { ticks: new Float64Array(0), least: new Float32Array(0), most: new Float32Array(0) };
    const perBin = Math.max(1, Math.ceil((end - start + 1) / Math.max(1, bins)));
    // bins begin at multiples of their width: a picture that moves on does not shimmer
    const firstBin = perBin === 1 ? start : Math.floor(start / perBin);
    const binCount = perBin === 1 ? end - start + 1 : Math.floor(end / perBin) - firstBin + 1;
    const into = {
      least: new Float32Array(binCount * signals.length).fill(Number.NaN),
      most: new Float32Array(binCount * signals.length).fill(Number.NaN),
    };
    const ticks = new Float64Array(binCount);
    const filled: number[] = [];
    for (let bin = 0; bin < binCount; bin += 1) {
      const lowest = Math.max(start, (firstBin + bin) * perBin);
      const highest = Math.min(end, (firstBin + bin + 1) * perBin - 1);
      ticks[bin] = (firstBin + bin) * perBin * tier.ticks;
      let some = false;
      for (let number = lowest; number <= highest; number += 1) {
        for (let s = 0; s < signals.length; s += 1)
          some = tier.merge(number, signals[s], into, s * binCount + bin) || some;
      }
      if (some) filled.push(bin);
    }
    return filled.length === binCount ? { ticks, ...into } : compact(ticks, into, filled, signals.length);
  }
}

function compact(
  ticks: Float64Array,
  from: { least: Float32Array; most: Float32Array },
  keep: number[],
  signals: number,
): History {
  const bins = ticks.length;
  const least = new Float32Array(keep.length * signals);
  const most = new Float32Array(keep.length * signals);
  for (let s = 0; s < signals; s += 1) {
    keep.forEach((bin, at) => {
      least[s * keep.length + at] = from.least[s * bins + bin];
      most[s * keep.length + at] = from.most[s * bins + bin];
    });
  }
  return { ticks: Float64Array.from(keep, (bin) => ticks[bin]), least, most };
}
