import fc from 'fast-check';
import { expect, test } from 'vitest';
import { Decimator } from '../../../bridge/live/decimate.js';

function feed(
  decimator: Decimator,
  from: number,
  to: number,
  value: (tick: number, signal: number) => number,
  signals = 2,
): void {
  const count = to - from + 1;
  const ticks = Float64Array.from({ length: count }, (_, i) => from + i);
  const values = Float32Array.from({ length: count * signals }, (_, i) =>
    value(from + Math.floor(i / signals), i % signals),
  );
  decimator.rows(ticks, values, count);
}

test('a spike of one tick is in the picture, at every width of bins', () => {
  const decimator = new Decimator({ signals: 2, interval: 40 });
  feed(decimator, 0, 120_000, (tick, signal) => (signal === 1 && tick === 77_777 ? 900 : signal));
  for (const bins of [1, 7, 100, 1000, 4000]) {
    const history = decimator.history([1, 0], 0, 120_000, bins);
    expect(history.ticks.length).toBeLessThanOrEqual(bins + 1);
    const most = history.most.subarray(0, history.ticks.length);
    const at = most.indexOf(900);
    expect(at).toBeGreaterThanOrEqual(0);
    expect(most.filter((value) => value === 900).length).toBe(1);
    expect(history.ticks[at]).toBeLessThanOrEqual(77_777);
    expect(history.ticks[at + 1] ?? 120_001).toBeGreaterThan(77_777);
    expect(history.least[at]).toBe(1);
  }
});

test('least and most of any stretch are those of the rows, whatever the batches', () => {
  fc.assert(
    fc.property(
      fc.array(fc.float({ noNaN: true, min: -1e6, max: 1e6 }), { minLength: 1, maxLength: 400 }),
      fc.integer({ min: 1, max: 9 }),
      fc.integer({ min: 1, max: 50 }),
      (values, interval, batch) => {
        const decimator = new Decimator({ signals: 1, interval, tiers: [{ factor: 1, slots: 1000 }] });
        for (let from = 0; from < values.length; from += batch) {
          const to = Math.min(values.length, from + batch) - 1;
          feed(decimator, from, to, (tick) => values[tick], 1);
        }
        const history = decimator.history([0], 0, values.length, 4096);
        history.ticks.forEach((tick, i) => {
          const slice = values.slice(tick, tick + interval);
          expect(history.least[i]).toBe(Math.fround(Math.min(...slice)));
          expect(history.most[i]).toBe(Math.fround(Math.max(...slice)));
        });
        expect(history.ticks.length).toBe(Math.ceil(values.length / interval));
      },
    ),
    { numRuns: 60 },
  );
});

test('looking back further than the fine ring reaches takes the coarse one, and memory stays as it was', () => {
  const tiers = [
    { factor: 1, slots: 50 },
    { factor: 10, slots: 100 },
  ];
  const decimator = new Decimator({ signals: 2, interval: 10, tiers });
  const before = decimator.bytes;
  feed(decimator, 0, 9_999, (tick, signal) => (tick === 1_234 ? 500 : tick + signal));
  expect(decimator.bytes).toBe(before);
  const old = decimator.history([0], 0, 9_999, 4096);
  expect(old.ticks[1] - old.ticks[0]).toBe(100);
  expect(decimator.oldestTick).toBe(0);
  expect(old.least[12]).toBe(500);
  const fresh = decimator.history([0], 9_700, 9_999, 4096);
  expect(fresh.ticks[1] - fresh.ticks[0]).toBe(10);
  feed(decimator, 10_000, 30_000, (tick) => tick);
  expect(decimator.bytes).toBe(before);
  expect(decimator.history([0], 0, 5_000, 100).ticks.length).toBe(0);
});

test('the usual rings look back ten minutes and more at 1 kHz', () => {
  const decimator = new Decimator({ signals: 1, interval: 40 });
  const one = new Float32Array(1);
  for (let tick = 0; tick < 1_200_000; tick += 40) decimator.rows(Float64Array.of(tick), one, 1);
  const history = decimator.history([0], 1_200_000 - 600_000, 1_200_000, 4096);
  expect(history.ticks[1] - history.ticks[0]).toBeLessThanOrEqual(400);
  expect(history.ticks[0]).toBeLessThanOrEqual(600_000);
});

test('dropped rows are counted, rows that come twice are not, and a gap stays a gap', () => {
  const decimator = new Decimator({ signals: 2, interval: 10 });
  feed(decimator, 0, 99, () => 1);
  feed(decimator, 90, 99, () => 7);
  feed(decimator, 200, 299, () => 2);
  expect(decimator.missing).toBe(100);
  expect(decimator.rowCount).toBe(200);
  const history = decimator.history([0], 0, 299, 100);
  expect([...history.ticks]).toEqual([
    0, 10, 20, 30, 40, 50, 60, 70, 80, 90, 200, 210, 220, 230, 240, 250, 260, 270, 280, 290,
  ]);
  expect(Math.max(...history.most)).toBe(2);
});

test('a value that is no number hides no number', () => {
  const decimator = new Decimator({ signals: 1, interval: 4 });
  feed(
    decimator,
    0,
    7,
    (tick) => [Number.NaN, 3, 5, Number.NaN, Number.NaN, Number.NaN, Number.NaN, Number.NaN][tick],
    1,
  );
  const history = decimator.history([0], 0, 7, 10);
  expect([...history.least]).toEqual([3, Number.NaN]);
  expect([...history.most]).toEqual([5, Number.NaN]);
});
