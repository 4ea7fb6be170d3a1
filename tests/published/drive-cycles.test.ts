import { describe, expect, it } from 'vitest';
import { accelerations, distance, duration, speedAt } from '../../configs/cycles/cycle.js';
import { ece15, eudc, eudcLowPower, nedc } from '../../configs/cycles/europe.js';
import {
  driveTraceMetrics,
  energyEconomyRating,
  excursions,
  regressionFaults,
  smoothTrace,
  speedRegression,
  traceSums,
} from '../../runtime/drive-trace.js';

describe('European cycles: UN Regulation No. 83, Annex 4a, Appendix 1', () => {
  it.each([
    // duration and theoretical distance from the regulation; integral of the table of breakpoints
    [ece15, 195, 1014.583, 1013, 50, 1.042, -0.926],
    [eudc, 400, 6954.861, 6955, 120, 0.833, -1.389],
    [nedc, 1180, 11013.194, 11007, 120, 1.042, -1.389],
  ] as const)('$name', (cycle, seconds, integral, theoretical, top, most, least) => {
    expect(duration(cycle)).toBe(seconds);
    expect(Math.abs(distance(cycle) - integral)).toBeLessThan(1e-3);
    expect(Math.abs(distance(cycle) / theoretical - 1)).toBeLessThan(2e-3);
    expect(Math.max(...cycle.speeds) * 3.6).toBeCloseTo(top, 9);
    expect(accelerations(cycle).most).toBeCloseTo(most, 3);
    expect(accelerations(cycle).least).toBeCloseTo(least, 3);
  });

  it('EUDC for low power covers 6609 m (from memory: a band)', () => {
    expect(Math.abs(distance(eudcLowPower) - 6609)).toBeLessThan(2);
  });

  it('mean speeds follow from the table', () => {
    expect((distance(ece15) / duration(ece15)) * 3.6).toBeCloseTo(18.7308, 4);
    expect((distance(eudc) / duration(eudc)) * 3.6).toBeCloseTo(62.59375, 9);
    expect((distance(nedc) / duration(nedc)) * 3.6).toBeCloseTo(33.5996, 4);
  });

  it('interpolates between breakpoints and holds the ends', () => {
    expect(speedAt(ece15, 13) * 3.6).toBeCloseTo(7.5, 12);
    expect(speedAt(ece15, 24) * 3.6).toBeCloseTo(12.5, 12);
    expect(speedAt(ece15, -5)).toBe(0);
    expect(speedAt(ece15, 1e6)).toBe(0);
    expect(speedAt(nedc, 4 * 195 + 341) * 3.6).toBeCloseTo(120, 12);
    for (let t = 0; t <= 195; t += 0.5) expect(speedAt(nedc, 390 + t)).toBeCloseTo(speedAt(ece15, t), 12);
  });
});

const load = { constant: 400, linear: 5, quadratic: 2.7, effectiveMass: 1.015 * 7500 };
const sampled = (scale = 1, shift = 0) =>
  Float64Array.from({ length: 11801 }, (_, i) => scale * speedAt(nedc, 0.1 * i + shift));

describe('SAE J2951 drive-trace metrics', () => {
  it('CE 1030 against 1000 and D 10.1 against 10.0: ER 3.000, DR 1.000, EER 1.9417', () => {
    expect(energyEconomyRating(3, 1)).toBeCloseTo(1.9417, 4);
  });

  it('a perfect trace has zero everywhere', () => {
    const metrics = driveTraceMetrics(sampled(), sampled(), 0.1, load);
    expect(Object.values(metrics).every((value) => value === 0)).toBe(true);
  });

  it('a ramp 0 - 10 - 0 m/s has an absolute speed change of 20 m/s', () => {
    const ramp = Float64Array.from({ length: 2001 }, (_, i) => 10 - Math.abs(i - 1000) / 100);
    expect(traceSums(ramp, 0.01, load).absoluteSpeedChange).toBeCloseTo(20, 1);
    expect(traceSums(smoothTrace(ramp), 0.01, load).absoluteSpeedChange).toBeCloseTo(20, 1);
  });

  it('cycle energy of constant speed is force times way', () => {
    const steady = new Float64Array(601).fill(60 / 3.6);
    const v = 60 / 3.6;
    expect(traceSums(steady, 0.1, load).cycleEnergy).toBeCloseTo((400 + 5 * v + 2.7 * v * v) * v * 60, 3);
    expect(traceSums(steady, 0.1, load).inertialWork).toBe(0);
  });

  it('distance rating is the percentage of distance more', () => {
    const metrics = driveTraceMetrics(sampled(1.02), sampled(), 0.1, load);
    expect(metrics.distanceRating).toBeCloseTo(2, 9);
    expect(metrics.inertialWorkRating).toBeCloseTo(100 * (1.02 * 1.02 - 1), 9);
    expect(metrics.absoluteSpeedChangeRating).toBeCloseTo(2, 9);
  });
});

describe('40 CFR 1037.555 speed regression and 40 CFR 600.109-08 band', () => {
  it('accepts a trace driven right and says what is wrong with others', () => {
    const top = 120 / 3.6;
    expect(regressionFaults(speedRegression(sampled(), sampled()), top)).toEqual([]);
    expect(regressionFaults(speedRegression(sampled(0.94), sampled()), top)).toHaveLength(1);
    expect(regressionFaults(speedRegression(sampled(1, -20), sampled()), top).join()).toMatch(
      /r squared|standard error/,
    );
  });

  it('finds slope, intercept and error of a known line', () => {
    const x = [0, 1, 2, 3, 4, 5];
    const y = x.map((value, i) => 0.5 + 0.98 * value + (i % 2 === 0 ? 0.1 : -0.1));
    const line = speedRegression(y, x);
    // by hand: the pattern +-0.1 on x = 0..5 has the slope -0.3 / 17.5 and leaves 0.06 - 0.3^2 / 17.5
    expect(line.slope).toBeCloseTo(0.98 - 0.3 / 17.5, 12);
    expect(line.standardError).toBeCloseTo(Math.sqrt((0.06 - 0.09 / 17.5) / 4), 12);
  });

  it('an excursion is counted outside 2 mph of the target within a second', () => {
    const target = sampled();
    const driven = sampled();
    for (let i = 3000; i < 3025; i += 1) driven[i] = driven[i]! + 3;
    expect(excursions(target, target, 0.1)).toEqual([]);
    expect(excursions(sampled(1, -0.9), target, 0.1)).toEqual([]);
    const found = excursions(driven, target, 0.1);
    expect(found).toHaveLength(1);
    expect(found[0]!.until - found[0]!.from).toBeCloseTo(2.5, 9);
  });
});
