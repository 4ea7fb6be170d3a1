import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { PACER, Pacer, type PacerClock } from '../../../runtime/realtime/pacer.js';

/** A clock that moves by 50 ns a reading, and wakes as late as it is told. */
class FakeClock implements PacerClock {
  time = 1_000_000;
  sleeps = 0;
  readings = 0;
  oversleep = 0;
  fails = 0;
  now(out: Float64Array, index: number): void {
    this.readings += 1;
    this.time += 50;
    out[index] = this.time;
  }
  sleepUntil(times: Float64Array, index: number): number {
    this.sleeps += 1;
    this.time = Math.max(this.time, times[index]!) + this.oversleep;
    return this.fails;
  }
}

const PERIOD = 1_000_000;

function started(clock: FakeClock, spin = 90_000): Pacer {
  const pacer = new Pacer({ period: PERIOD, spin, clock });
  pacer.begin();
  pacer.wait();
  pacer.count();
  return pacer;
}

describe('pacer', () => {
  it('starts each tick at its deadline, within a reading of the clock', () => {
    const clock = new FakeClock();
    const pacer = started(clock);
    const first = pacer.times[PACER.deadline]!;
    for (let tick = 0; tick < 1000; tick += 1) {
      pacer.wait();
      expect(pacer.times[PACER.start]! - (first + tick * PERIOD)).toBeGreaterThanOrEqual(0);
      expect(pacer.times[PACER.start]! - (first + tick * PERIOD)).toBeLessThanOrEqual(50);
      clock.time += 200_000;
    }
    pacer.finish();
    const summary = pacer.record.summary();
    expect(summary.overruns).toBe(0);
    expect(summary.drift).toBe(0);
    expect(pacer.record.lateness.count).toBe(1000);
    expect(pacer.record.period.count).toBe(999);
    expect(pacer.record.step.count).toBe(1000);
    expect(summary.step.max).toBeCloseTo(200.05, 3);
    expect(summary.period.p50).toBeGreaterThan(999.9);
  });

  it('sleeps up to the spin and then spins, no more than that', () => {
    const clock = new FakeClock();
    const pacer = started(clock, 90_000);
    clock.readings = 0;
    clock.sleeps = 0;
    pacer.wait();
    expect(clock.sleeps).toBe(1);
    expect(clock.readings).toBeGreaterThan(90_000 / 50 - 5);
    expect(clock.readings).toBeLessThan(90_000 / 50 + 5);
  });

  it('measures a late wake-up that is no overrun, and keeps its schedule', () => {
    const clock = new FakeClock();
    const pacer = started(clock);
    const deadline = pacer.times[PACER.deadline]!;
    clock.oversleep = 400_000;
    pacer.wait();
    expect(pacer.times[PACER.lateness]).toBeCloseTo(310_050, -2);
    clock.oversleep = 0;
    pacer.wait();
    expect(pacer.times[PACER.start]! - (deadline + PERIOD)).toBeLessThanOrEqual(50);
    expect(pacer.record.summary().overruns).toBe(0);
  });

  it('counts a step that overstays and moves the schedule by what was lost', () => {
    const clock = new FakeClock();
    const pacer = started(clock);
    const deadline = pacer.times[PACER.deadline]!;
    pacer.wait();
    clock.time += 2_500_000;
    pacer.wait();
    const lost = pacer.times[PACER.lateness]!;
    expect(lost).toBeCloseTo(1_500_000, -3);
    expect(pacer.times[PACER.start]).toBeCloseTo(deadline + PERIOD + lost, 0);
    pacer.wait();
    expect(pacer.times[PACER.period]).toBeGreaterThanOrEqual(PERIOD);
    expect(pacer.times[PACER.start]! - (deadline + 2 * PERIOD + lost)).toBeLessThanOrEqual(50);
    expect(pacer.record.summary().overruns).toBe(1);
    expect(pacer.record.summary().drift).toBe(lost / 1e9);
  });

  it('counts a wake-up that is a whole period late, as after a stop of the process', () => {
    const clock = new FakeClock();
    const pacer = started(clock);
    clock.oversleep = 3_000_000_000;
    pacer.wait();
    clock.oversleep = 0;
    pacer.wait();
    pacer.wait();
    const summary = pacer.record.summary();
    expect(summary.overruns).toBe(1);
    expect(summary.drift).toBeCloseTo(3, 3);
  });

  it('never runs two ticks closer together than a period less the lateness of the first, whatever happens', () => {
    const disturbance = fc.record({
      step: fc.oneof(fc.nat(900_000), fc.nat(5_000_000)),
      oversleep: fc.oneof(fc.constant(0), fc.nat(3_000_000)),
    });
    fc.assert(
      fc.property(fc.array(disturbance, { minLength: 2, maxLength: 50 }), (disturbances) => {
        const clock = new FakeClock();
        const pacer = started(clock, 1000);
        let drift = 0;
        let overruns = 0;
        const base = pacer.times[PACER.deadline]!;
        for (let tick = 0; tick < disturbances.length; tick += 1) {
          const slip = pacer.times[PACER.slip]!;
          const lateness = tick === 0 ? 0 : pacer.times[PACER.lateness]! - slip;
          clock.oversleep = disturbances[tick]!.oversleep;
          pacer.wait();
          if (tick > 0) expect(pacer.times[PACER.period]).toBeGreaterThanOrEqual(PERIOD - lateness - 1);
          drift += pacer.times[PACER.slip]!;
          if (pacer.times[PACER.slip]! > 0) overruns += 1;
          // The schedule is where it was, moved by exactly the sum of the re-phasings.
          expect(pacer.times[PACER.deadline]).toBe(base + (tick + 1) * PERIOD + drift);
          clock.time += disturbances[tick]!.step;
        }
        expect(pacer.record.summary().drift * 1e9).toBeCloseTo(drift, 0);
        expect(pacer.record.summary().overruns).toBe(overruns);
      }),
      { numRuns: 300, seed: 11 },
    );
  });

  it('gives up with a clear error when the clock fails or stands still', () => {
    const clock = new FakeClock();
    const pacer = started(clock);
    clock.fails = 22;
    expect(() => pacer.wait()).toThrow(/clock_nanosleep failed: EINVAL/);
    const still: PacerClock = { now: (out, index) => (out[index] = 5), sleepUntil: () => 0 };
    const other = new Pacer({ period: PERIOD, clock: still });
    other.begin();
    expect(() => other.wait()).toThrow(/stands still/);
  });

  it('refuses a period that no machine keeps', () => {
    expect(() => new Pacer({ period: 5000, clock: new FakeClock() })).toThrow(/5000 ns: at least/);
    expect(() => new Pacer({ period: Number.NaN, clock: new FakeClock() })).toThrow(/NaN/);
  });
});
