import type { History } from '../../live/source.js';
import type { Frame } from '../../live/wire.js';
import { doublesOf, floatsOf } from '../../live/wire.js';

/** Least and greatest values of some signals over intervals, growing to the right, for one chart. SI. */
export class Strip {
  private ticks: number[] = [];
  private least: number[][];
  private most: number[][];

  constructor(
    readonly signals: readonly number[],
    /** Intervals are merged until they are this wide, ticks. */
    public binTicks: number,
  ) {
    this.least = signals.map(() => []);
    this.most = signals.map(() => []);
  }

  get length(): number {
    return this.ticks.length;
  }
  get lastTick(): number {
    return this.ticks.at(-1) ?? -1;
  }

  replace(history: History): void {
    const bins = history.ticks.length;
    this.ticks = [...history.ticks];
    this.least = this.signals.map((_, i) => [...history.least.subarray(i * bins, (i + 1) * bins)]);
    this.most = this.signals.map((_, i) => [...history.most.subarray(i * bins, (i + 1) * bins)]);
  }

  /** `order`: the signals that the frame carries, in its order. */
  append(frame: Frame, order: readonly number[]): void {
    const ticks = doublesOf(frame.ticks);
    const low = floatsOf(frame.least);
    const high = floatsOf(frame.most);
    const at = this.signals.map((signal) => order.indexOf(signal));
    const bins = ticks.length;
    for (let bin = 0; bin < bins; bin += 1) {
      const number = Math.floor(ticks[bin] / this.binTicks);
      const start = number * this.binTicks;
      const lastBin = Math.floor(this.lastTick / this.binTicks);
      if (number < lastBin) continue;
      const merge = number === lastBin && this.ticks.length > 0;
      if (!merge) this.ticks.push(start);
      for (let i = 0; i < at.length; i += 1) {
        const l = at[i] < 0 ? Number.NaN : low[at[i] * bins + bin];
        const m = at[i] < 0 ? Number.NaN : high[at[i] * bins + bin];
        const end = this.ticks.length - 1;
        if (merge) {
          if (!(this.least[i][end] <= l)) this.least[i][end] = l;
          if (!(this.most[i][end] >= m)) this.most[i][end] = m;
        } else {
          this.least[i].push(l);
          this.most[i].push(m);
        }
      }
    }
  }

  /** Forgets what ended before `tick`. */
  forget(tick: number): void {
    let count = 0;
    while (count < this.ticks.length && this.ticks[count] + this.binTicks < tick) count += 1;
    if (count < 64) return;
    this.ticks.splice(0, count);
    for (const list of this.least) list.splice(0, count);
    for (const list of this.most) list.splice(0, count);
  }

  /**
   * For a line chart: two points an interval, the least and the greatest value, so that a spike of one tick stands
   * out at its full height. x in s; y through `scale`.
   */
  points(step: number, scale: (signal: number, value: number) => number): number[][] {
    const n = this.ticks.length;
    const width = n > 1 ? Math.min(this.binTicks, this.ticks[n - 1] - this.ticks[n - 2]) : this.binTicks;
    const x = new Array<number>(2 * n);
    for (let i = 0; i < n; i += 1) {
      x[2 * i] = this.ticks[i] * step;
      x[2 * i + 1] = (this.ticks[i] + width / 2) * step;
    }
    const ys = this.signals.map((_, s) => {
      const low = this.least[s];
      const high = this.most[s];
      const y = new Array<number>(2 * n);
      for (let i = 0; i < n; i += 1) {
        // rising: least first; falling: greatest first, so that a slow signal stays a plain line
        const rising = i === 0 || high[i] + low[i] >= high[i - 1] + low[i - 1];
        y[2 * i] = scale(s, rising ? low[i] : high[i]);
        y[2 * i + 1] = scale(s, rising ? high[i] : low[i]);
      }
      return y;
    });
    return [x, ...ys];
  }

  /** The interval that holds `tick`, or the nearest before it. */
  at(tick: number): { tick: number; least: number[]; most: number[] } | undefined {
    let low = 0;
    let high = this.ticks.length - 1;
    if (high < 0 || tick < this.ticks[0]) return undefined;
    while (low < high) {
      const middle = Math.ceil((low + high) / 2);
      if (this.ticks[middle] <= tick) low = middle;
      else high = middle - 1;
    }
    return {
      tick: this.ticks[low],
      least: this.least.map((list) => list[low]),
      most: this.most.map((list) => list[low]),
    };
  }

  /** Neighbouring interval in direction -1 or 1, its tick. */
  neighbour(tick: number, direction: number): number | undefined {
    const here = this.at(tick);
    const index = here === undefined ? 0 : this.ticks.indexOf(here.tick);
    return this.ticks[Math.min(this.ticks.length - 1, Math.max(0, index + direction))];
  }
}
