import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Histogram } from '../../../runtime/realtime/histogram.js';
import { TimingRecord } from '../../../runtime/realtime/timing-record.js';

function of(values: readonly number[]): Histogram {
  const histogram = new Histogram();
  const slot = new Float64Array(1);
  for (const value of values) {
    slot[0] = value;
    histogram.record(slot, 0);
  }
  return histogram;
}

describe('histogram', () => {
  it('gives quantiles within 1.6 % above the exact ones, and the exact largest', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.oneof(fc.integer({ min: 0, max: 300 }), fc.double({ min: 0, max: 2e13, noNaN: true }).map(Math.round)),
          { minLength: 1, maxLength: 200 },
        ),
        fc.double({ min: 0, max: 1, noNaN: true }),
        (values, share) => {
          const histogram = of(values);
          const sorted = [...values].sort((a, b) => a - b);
          const exact = sorted[Math.max(1, Math.ceil(share * values.length)) - 1]!;
          const found = histogram.quantile(share) * 1e3;
          expect(found).toBeGreaterThanOrEqual(exact * (1 - 1e-12));
          expect(found).toBeLessThanOrEqual(exact * 1.016 + 1);
          expect(histogram.max * 1e3).toBeCloseTo(sorted.at(-1)!, 3);
          expect(histogram.count).toBe(values.length);
        },
      ),
      { numRuns: 500, seed: 3 },
    );
  });

  it('puts a value at each edge of its buckets into the right one', () => {
    for (let power = 5; power < 44; power += 1) {
      for (const value of [2 ** power - 1, 2 ** power, 2 ** power + 1]) {
        const found = of([value, 1e15]).quantile(0.5) * 1e3;
        expect(found, `${value} ns`).toBeGreaterThanOrEqual(value * (1 - 1e-12));
        expect(found, `${value} ns`).toBeLessThanOrEqual(value * 1.016 + 1);
      }
    }
  });

  it('keeps what no clock should give: negative as 0, beyond hours in the last bucket, NaN not at all', () => {
    const histogram = of([-5, Number.NaN, 1e18]);
    expect(histogram.count).toBe(2);
    expect(histogram.quantile(0.5)).toBeLessThanOrEqual(0.001);
    expect(histogram.quantile(1)).toBe(1e15);
  });

  it('says 0 of everything when nothing was recorded', () => {
    expect(new Histogram().summary()).toEqual({ p50: 0, p99: 0, p999: 0, max: 0 });
    expect(new Histogram().mean).toBe(0);
  });

  it('is read through shared memory by another record', () => {
    const writer = new TimingRecord();
    const slot = Float64Array.of(1000, 2000, 3000);
    writer.period.record(slot, 0);
    writer.lateness.record(slot, 1);
    writer.step.record(slot, 2);
    writer.counters[0] = 4;
    writer.counters[1] = 5e9;
    const reader = new TimingRecord(writer.memory);
    const { period, lateness, step, overruns, drift } = reader.summary();
    expect([period.max, lateness.max, step.max, overruns, drift]).toEqual([1, 2, 3, 4, 5]);
    reader.reset();
    expect(writer.summary().overruns).toBe(0);
    expect(writer.step.count).toBe(0);
  });
});
