import { expect, it } from 'vitest';
import { canBench } from '../support/can-bench.js';

const text = `life: { preRoll: 0 ms }
messages:
  changed:
    direction: sent
    id: 0x100
    trigger: on-change
    fastEvery: 10 ms
    bytes: 1
    signals: { v: { from: life.key, unit: "1", range: 0 .. 1, can: { start: 0, length: 1 } } }
  both:
    direction: sent
    id: 0x101
    trigger: cyclic-and-change
    every: 100 ms
    phase: 0 ms
    fastEvery: 20 ms
    startDelay: 50 ms
    bytes: 1
    signals: { v: { from: life.relay, unit: "1", range: 0 .. 1, can: { start: 0, length: 1 } } }
  nested:
    direction: sent
    id: 0x102
    every: 10 ms
    phase: 0 ms
    bytes: 4
    signals:
      page: { from: life.supply * 3, unit: "1", range: 0 .. 15, can: { start: 0, length: 8, selector: on } }
      inner: { from: life.key * 7, unit: "1", range: 0 .. 15, can: { start: 8, length: 8, selector: on, when: { page: ["3 .. 5"] } } }
      deep: { from: 99, unit: "1", range: 0 .. 255, can: { start: 16, length: 8, when: { inner: [2, "6 .. 8"] } } }
      other: { from: 55, unit: "1", range: 0 .. 255, can: { start: 16, length: 8, when: { page: [0] } } }
      plain: { from: 7, unit: "1", range: 0 .. 255, can: { start: 24, length: 8 } }
`;

type Bench = ReturnType<typeof canBench>;
const ticksOf = (bench: Bench, identifier: number, ticks: number): number[] => {
  const found: number[] = [];
  for (let tick = 0; tick < ticks; tick += 1) {
    bench.run(1);
    if (bench.heard().some((one) => one.identifier === identifier)) found.push(tick);
  }
  return found;
};

it('on change: once at the start, then when the value moves, with the least distance between', () => {
  const bench = canBench(text);
  expect(ticksOf(bench, 0x100, 30)).toEqual([0]);
  bench.command('life.key', 0);
  expect(ticksOf(bench, 0x100, 20)).toEqual([0]);
  bench.command('life.key', 1);
  bench.run(1);
  bench.heard();
  bench.command('life.key', 0);
  // 10 ms after the one before
  expect(ticksOf(bench, 0x100, 30)).toEqual([9]);
});

it('cyclic and on change: by its cycle after the start delay, in between when the value moves', () => {
  const bench = canBench(text);
  // the first one at the start delay, as nothing was said before
  expect(ticksOf(bench, 0x101, 250)).toEqual([50, 100, 200]);
  bench.command('life.relay', 1);
  expect(ticksOf(bench, 0x101, 100)).toEqual([0, 50]);
});

it('extended multiplexing: selectors under selectors, by ranges', () => {
  const bench = canBench(text);
  const payload = (): string => {
    bench.run(10);
    return bench
      .heard()
      .filter((one) => one.identifier === 0x102)
      .at(-1)!.data;
  };
  expect(payload()).toBe('03076307');
  bench.command('life.key', 0);
  expect(payload()).toBe('03000007');
  bench.command('life.supply', 0);
  expect(payload()).toBe('00003707');
});
