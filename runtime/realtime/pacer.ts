import { Clock } from './clock.js';
import { errnoName } from './ffi.js';
import { TimingRecord } from './timing-record.js';

export interface PacerOptions {
  /** Length of a tick, ns. */
  readonly period: number;
  /** How long before a deadline to stop sleeping and start spinning, ns. Default 90 µs, at most half the period. */
  readonly spin?: number;
  readonly record?: TimingRecord;
  readonly clock?: PacerClock;
}

/** What the pacer needs of a clock; tests pass their own. */
export interface PacerClock {
  now(out: Float64Array, index: number): void;
  /** 0 or an error number. */
  sleepUntil(times: Float64Array, index: number): number;
}

/** Slots of `Pacer.times`, all ns: what the last `wait` found. */
export const PACER = { deadline: 0, now: 1, wake: 2, start: 3, period: 4, lateness: 5, step: 6, slip: 7 } as const;
const SLOTS = 8;

/** Readings of a clock that stands still, before the pacer gives up: more than a second of them. */
const MOST_SPINS = 50_000_000;

/**
 * Absolute deadlines one period apart. `wait()` sleeps until shortly before the next one and then spins, so that the
 * wake-up delay of the kernel's timer is spent before the deadline and not after it.
 *
 * A tick that overstays its deadline, or one that starts a whole period late, is an overrun: it is counted and the
 * schedule moves by as much as was lost. Ticks are never caught up in a burst. The sum of the moves is the drift.
 */
export class Pacer {
  readonly record: TimingRecord;
  readonly times = new Float64Array(SLOTS);
  private readonly clock: PacerClock;
  private readonly length: number;
  private readonly spin: number;
  private counting = false;
  private started = false;

  constructor(options: PacerOptions) {
    if (!(options.period >= 10_000)) throw new RangeError(`period ${options.period} ns: at least 10000 ns`);
    this.length = Math.round(options.period);
    this.spin = Math.min(Math.round(options.spin ?? 90_000), Math.floor(this.length / 2));
    this.record = options.record ?? new TimingRecord();
    this.clock = options.clock ?? new Clock();
  }

  /** Sets the first deadline one period from now. Nothing is counted before `count()`. */
  begin(): void {
    const times = this.times;
    this.clock.now(times, PACER.now);
    times[PACER.deadline] = times[PACER.now]! + this.length;
    times[PACER.start] = times[PACER.now]!;
    this.started = false;
    this.counting = false;
  }

  /** From here on everything is counted, from zero. Call it between two ticks. */
  count(): void {
    this.record.reset();
    this.counting = true;
    this.started = false;
  }

  /**
   * Ends the present tick and returns at the deadline of the next. Leaves in `times` what it found. Throws only when the
   * clock itself fails.
   */
  wait(): void {
    const times = this.times;
    const clock = this.clock;
    clock.now(times, PACER.now);
    const deadline = times[PACER.deadline]!;
    times[PACER.step] = times[PACER.now]! - times[PACER.start]!;
    const overstayed = times[PACER.now]! > deadline;
    if (!overstayed) {
      times[PACER.wake] = deadline - this.spin;
      if (times[PACER.wake]! > times[PACER.now]!) {
        const failed = clock.sleepUntil(times, PACER.wake);
        if (failed !== 0) throw new Error(`clock_nanosleep failed: ${errnoName(failed)}`);
      }
      let spins = 0;
      clock.now(times, PACER.now);
      while (times[PACER.now]! < deadline) {
        spins += 1;
        if (spins > MOST_SPINS) throw new Error('the monotonic clock stands still: no live run on this machine');
        clock.now(times, PACER.now);
      }
    }
    const late = times[PACER.now]! - deadline;
    times[PACER.lateness] = late;
    times[PACER.period] = times[PACER.now]! - times[PACER.start]!;
    times[PACER.start] = times[PACER.now]!;
    times[PACER.slip] = overstayed || late >= this.length ? late : 0;
    times[PACER.deadline] = deadline + times[PACER.slip]! + this.length;
    if (this.counting) this.tally(overstayed || late >= this.length);
    this.started = true;
  }

  private tally(overrun: boolean): void {
    const record = this.record;
    record.lateness.record(this.times, PACER.lateness);
    if (this.started) {
      // The first counted wait ends a tick that did not count.
      record.period.record(this.times, PACER.period);
      record.step.record(this.times, PACER.step);
    }
    if (overrun) {
      record.counters[0] = record.counters[0]! + 1;
      record.counters[1] = record.counters[1]! + this.times[PACER.slip]!;
    }
  }

  /** Ends the last tick without waiting, so that its length counts as well. */
  finish(): void {
    this.clock.now(this.times, PACER.now);
    this.times[PACER.step] = this.times[PACER.now]! - this.times[PACER.start]!;
    if (this.counting && this.started) this.record.step.record(this.times, PACER.step);
    this.counting = false;
  }

  /**
   * Runs the pacer's own code on short periods until the engine has compiled it (about a third of a second): code that
   * is still interpreted boxes every double, and the first collection in the loop thread would be the pacer's own.
   */
  static warmUp(rounds = 5000): void {
    const pacer = new Pacer({ period: 20_000, spin: 10_000 });
    pacer.begin();
    pacer.count();
    for (let i = 0; i < rounds; i += 1) pacer.wait();
    pacer.finish();
    // Durations of every size, so that a late tick finds compiled code as well.
    for (let i = 0; i < rounds; i += 1) {
      for (const duration of [0, 50, 300, 1e5, 1e7, 1e10, 1e14]) {
        pacer.times[PACER.wake] = duration + i;
        pacer.record.step.record(pacer.times, PACER.wake);
      }
    }
  }
}
