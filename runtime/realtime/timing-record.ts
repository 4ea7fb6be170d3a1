import { type DurationSummary, Histogram } from './histogram.js';

/** What a live run says about its own timing. Durations in µs, drift in s. */
export interface TimingSummary {
  /** From the start of one tick to the start of the next. */
  readonly period: DurationSummary;
  /** From a tick's deadline to its start. */
  readonly lateness: DurationSummary;
  /** From a tick's start to its end. */
  readonly step: DurationSummary;
  /** Ticks that started when the next one should have, or after their forerunner overstayed. */
  readonly overruns: number;
  /** Sum of all re-phasings of the schedule, s: how far the bench lags behind wall time. */
  readonly drift: number;
}

const COUNTERS = 2;

/**
 * Timing counts over shared memory: the loop thread writes, the host may read at any time (a row may be half counted
 * then; after the loop has ended it is exact).
 */
export class TimingRecord {
  static readonly bytes = COUNTERS * 8 + 3 * Histogram.bytes;
  readonly memory: SharedArrayBuffer;
  readonly period: Histogram;
  readonly lateness: Histogram;
  readonly step: Histogram;
  /** [overruns, drift in ns] */
  readonly counters: Float64Array;

  constructor(memory: SharedArrayBuffer = new SharedArrayBuffer(TimingRecord.bytes)) {
    this.memory = memory;
    this.counters = new Float64Array(memory, 0, COUNTERS);
    const first = COUNTERS * 8;
    this.period = new Histogram(memory, first);
    this.lateness = new Histogram(memory, first + Histogram.bytes);
    this.step = new Histogram(memory, first + 2 * Histogram.bytes);
  }

  /** Forgets everything, at the first tick that counts. */
  reset(): void {
    this.counters.fill(0);
    this.period.reset();
    this.lateness.reset();
    this.step.reset();
  }

  summary(): TimingSummary {
    return {
      period: this.period.summary(),
      lateness: this.lateness.summary(),
      step: this.step.summary(),
      overruns: this.counters[0]!,
      drift: this.counters[1]! / 1e9,
    };
  }
}
