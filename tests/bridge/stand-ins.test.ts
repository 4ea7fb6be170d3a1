import { expect, it } from 'vitest';
import { makeFrame } from '../../bridge/can-frame.js';
import type { BuildError } from '../../runtime/contract.js';
import { canBench } from '../support/can-bench.js';

const messages = `
life: { preRoll: 0 ms }
messages:
  engineSpeeds:
    standsFor: engine
    direction: sent
    id: 0x100
    every: 10 ms
    phase: 0 ms
    bytes: 8
    signals:
      idle: { from: 800 rpm, unit: rpm, range: 0 .. 8000, can: { start: 0, length: 16, scale: 0.125 } }
      half: { from: 0.5 * highLine.pressure + 2 bar, unit: bar, range: 0 .. 600, can: { start: 16, length: 16, scale: 0.01 } }
      line: { from: highLine.pressure, unit: bar(g), range: 0 .. 600, can: { start: 32, length: 16, scale: 0.01 } }
      gear: { from: park, names: { park: 3, drive: 4 }, can: { start: 48, length: 4 } }
      state: { from: 1, unit: "1", range: 0 .. 15, can: { start: 52, length: 4 } }
  brakeState:
    standsFor: brakes
    direction: sent
    id: 0x110
    every: 10 ms
    phase: 1 ms
    bytes: 2
    signals:
      pressure: { from: "max(0 bar, highLine.pressure - 3000 bar(a))", unit: bar, range: 0 .. 600, can: { start: 0, length: 16, scale: 0.01 } }
  alive:
    about: network management of the bench, while the key is on or the controller is heard
    direction: sent
    id: 0x510
    every: 20 ms
    phase: 0 ms
    startDelay: 30 ms
    bytes: 2
    while: life.key is on or controllerAlive.age < 50 ms
    signals:
      node: { from: 0x10, unit: "1", range: 0 .. 255, can: { start: 0, length: 8 } }
      relay: { from: life.relay, unit: "1", range: 0 .. 1, can: { start: 8, length: 1 } }
  controllerAlive:
    direction: received
    id: 0x520
    every: 20 ms
    timeout: 100 ms
    bytes: 1
    signals:
      relay: { to: life.relay, range: 0 .. 1, substitute: 0, can: { start: 0, length: 1 } }
`;

const numbers = messages.replace('0x10, unit', '16, unit');
const ids = (bench: ReturnType<typeof canBench>): number[] => bench.heard().map(({ identifier }) => identifier);

it('says constants, names of enumerations and expressions, in the unit of each signal', () => {
  const bench = canBench(numbers);
  bench.run(1);
  const frame = bench.heard().find(({ identifier }) => identifier === 0x100)!;
  const bytes = Buffer.from(frame.data, 'hex');
  const pressure = bench.value('highLine.pressure');
  expect(bytes.readUInt16LE(0)).toBe(6400);
  expect(bytes.readUInt16LE(2) / 100).toBeCloseTo((0.5 * pressure) / 1e5 + 2, 1);
  expect(bytes.readUInt16LE(4) / 100).toBeCloseTo(pressure / 1e5 - 1.01325, 1);
  expect(bytes[6]).toBe(3 | (1 << 4));
  expect(bench.value('engineSpeeds.idle')).toBeCloseTo((800 * Math.PI) / 30, 6);
  bench.run(1);
  expect(bench.value('brakeState.pressure')).toBe(0);
});

it('takes a control unit out by the bench file, by the run, and by a command in the run', () => {
  const count = (bench: ReturnType<typeof canBench>): [number, number] => {
    bench.run(100);
    const heard = ids(bench);
    return [heard.filter((id) => id === 0x100).length, heard.filter((id) => id === 0x110).length];
  };
  expect(count(canBench(numbers))).toEqual([10, 10]);
  expect(count(canBench(`without: [engine]\n${numbers}`))).toEqual([0, 10]);
  const bench = canBench(numbers, { without: ['brakes'] });
  expect(count(bench)).toEqual([10, 0]);
  expect(bench.value('brakeState.muted')).toBe(1);
  bench.command('brakes.standIn', 1);
  bench.command('engine.standIn', 0);
  expect(count(bench)).toEqual([0, 10]);
});

it('sends network management while its condition holds, after its start delay, and hands the relay to the controller', () => {
  const bench = canBench(numbers);
  bench.command('life.key', 0);
  bench.run(100);
  // no key, and the controller was never heard: its age counts from the start, up to tick 50; from tick 30 on: tick 40
  expect(ids(bench).filter((id) => id === 0x510)).toHaveLength(1);
  bench.run(100);
  expect(ids(bench)).not.toContain(0x510);
  bench.put(makeFrame(0x520, [1]));
  bench.run(50);
  // heard at tick 200; on from the same tick, start delay 30 ms, phase 0 of 20 ms: tick 240
  const alive = bench.heard().filter(({ identifier }) => identifier === 0x510);
  expect(alive.map(({ data }) => data)).toEqual(['1001']);
  expect(bench.value('life.relay')).toBe(1);
  bench.run(60);
  expect(bench.value('life.relay')).toBe(0);
  bench.command('life.key', 1);
  bench.run(100);
  expect(ids(bench).filter((id) => id === 0x510)).toHaveLength(4);
});

it('is refused with a place where it cannot be', () => {
  const problems = (text: string): string[] => {
    try {
      canBench(text);
    } catch (error) {
      return (error as BuildError).problems.map(({ path, what }) => `${path}: ${what}`);
    }
    return [];
  };
  const change = (from: string, to: string): string[] => {
    expect(numbers).toContain(from);
    return problems(numbers.replace(from, to));
  };
  expect(change('from: 800 rpm', 'from: 8 bar')).toHaveLength(1);
  expect(change('0.5 * highLine.pressure + 2 bar', '0.5 * highLine.presure')).toEqual([
    expect.stringMatching(/half\.from: no such signal/),
  ]);
  expect(change('0.5 * highLine.pressure + 2 bar', '"mean(highLine.pressure, 5 ms)"')).toEqual([
    expect.stringMatching(/more than what is true now/),
  ]);
  expect(change('while: life.key is on or', 'while: life.key rises above 0.5 or')).toEqual([
    expect.stringMatching(/alive\.while: more than what is true now/),
  ]);
  expect(problems(`without: [gearbox]\n${numbers}`)).toEqual([
    expect.stringMatching(/^without.*does not stand in for this control unit/),
  ]);
  expect(change('direction: received', 'direction: received\n    standsFor: engine')).toEqual([
    expect.stringMatching(/standsFor: a message to the bench/),
  ]);
});
