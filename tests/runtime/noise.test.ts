import { describe, expect, it } from 'vitest';
import { gaussian, inverseNormal, uniform } from '../../runtime/noise.js';

const cell = new Float64Array(1);
function normalOf(p: number): number {
  cell[0] = p;
  inverseNormal(cell, 0);
  return cell[0]!;
}
function uniformOf(seed: number, stream: number, tick: number): number {
  uniform(seed, stream, tick, cell, 0);
  return cell[0]!;
}

const count = 200_000;
function series(seed: number, stream: number): Float64Array {
  const out = new Float64Array(count);
  for (let tick = 0; tick < count; tick += 1) gaussian(seed, stream, tick, out, tick);
  return out;
}
const mean = (x: Float64Array) => x.reduce((sum, value) => sum + value, 0) / x.length;
function correlation(a: Float64Array, b: Float64Array, lag = 0): number {
  let sum = 0;
  for (let i = lag; i < a.length; i += 1) sum += a[i]! * b[i - lag]!;
  return sum / (a.length - lag);
}

describe('inverse normal distribution, Wichura AS 241', () => {
  it.each([
    // tables of the standard normal distribution
    [0.5, 0],
    [0.975, 1.959963984540054],
    [0.025, -1.959963984540054],
    [0.841344746068543, 1],
    [0.9986501019683699, 3],
    [0.25, -0.674489750196082],
    [1e-3, -3.090232306167813],
    [1e-10, -6.361340902404056],
    [1e-20, -9.262340089798409],
  ])('p = %s', (p, z) => {
    expect(normalOf(p)).toBeCloseTo(z, 12);
  });
});

describe('noise', () => {
  // four standard errors of the estimate each: fails by chance once in 16000, and the numbers are always the same
  it('has mean 0, variance 1, skewness 0 and kurtosis 3', () => {
    for (const [seed, stream] of [
      [1, 0],
      [1, 1],
      [2, 0],
      [-7, 1000],
    ] as const) {
      const x = series(seed, stream);
      expect(Math.abs(mean(x))).toBeLessThan(4 / Math.sqrt(count));
      expect(Math.abs(mean(x.map((v) => v * v)) - 1)).toBeLessThan(4 * Math.sqrt(2 / count));
      expect(Math.abs(mean(x.map((v) => v ** 3)))).toBeLessThan(4 * Math.sqrt(15 / count));
      expect(Math.abs(mean(x.map((v) => v ** 4)) - 3)).toBeLessThan(4 * Math.sqrt(96 / count));
    }
  });

  it('is independent between ticks, streams and seeds', () => {
    const x = series(1, 0);
    const limit = 4 / Math.sqrt(count);
    for (let lag = 1; lag <= 20; lag += 1) expect(Math.abs(correlation(x, x, lag))).toBeLessThan(limit);
    for (const [seed, stream] of [
      [1, 1],
      [1, 2],
      [2, 0],
      [3, 0],
      [0, 1],
      [2, 1],
    ] as const) {
      const y = series(seed, stream);
      for (const lag of [0, 1, 2]) {
        expect(Math.abs(correlation(x, y, lag))).toBeLessThan(limit);
        expect(Math.abs(correlation(y, x, lag))).toBeLessThan(limit);
      }
    }
  });

  it('fills the unit interval evenly (chi-square over 256 cells)', () => {
    const cells = new Float64Array(256);
    for (let tick = 0; tick < count; tick += 1) cells[Math.floor(uniformOf(42, 7, tick) * 256)]! += 1;
    const expected = count / 256;
    const chi = cells.reduce((sum, n) => sum + (n - expected) ** 2 / expected, 0);
    expect(chi).toBeGreaterThan(255 - 4 * Math.sqrt(510));
    expect(chi).toBeLessThan(255 + 4 * Math.sqrt(510));
  });

  it('is a pure function of seed, stream and tick, whatever the order', () => {
    const forward = [uniformOf(5, 3, 10), uniformOf(5, 3, 11), uniformOf(5, 4, 10)];
    const back = [uniformOf(5, 4, 10), uniformOf(5, 3, 11), uniformOf(5, 3, 10)].reverse();
    expect(back).toEqual(forward);
    expect(new Set(forward).size).toBe(3);
    // computed apart, in integer arithmetic of another language: a change breaks every recording
    expect(forward[0]).toBe(0.21974302319274025);
  });

  it('stays strictly inside the unit interval', () => {
    for (let tick = 0; tick < 10_000; tick += 1) {
      const u = uniformOf(tick, tick * 31, tick * 17);
      expect(u > 0 && u < 1).toBe(true);
    }
  });
});
