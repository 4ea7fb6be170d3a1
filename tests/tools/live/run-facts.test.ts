import path from 'node:path';
import { describe, expect, test } from 'vitest';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';
import { gasCurves } from '../../../tools/live/gas-curves.js';
import { judgedStatus } from '../../../tools/live/judged.js';
import { MessageRates } from '../../../tools/live/message-rates.js';

const root = new URL('../../..', import.meta.url).pathname;
const spec = readBench(path.join(root, 'configs/harbour-truck/bench.yaml'), catalogue);
const messages = spec.map.messages;

describe('message rates', () => {
  const received = messages.findIndex((message) => message.direction === 'received');
  const sent = messages.findIndex((message) => message.direction === 'sent');
  const { name } = messages[received]!;
  const other = messages[sent]!.name;

  test('are over the last second, ages from what the exchange says or from when a count last rose', () => {
    const rates = new MessageRates(spec);
    const counts = new Map<string, number>();
    const look = (tick: number) => rates.status(tick, (signal) => counts.get(signal));
    expect(look(0)[received]).toMatchObject({ age: -1, rate: 0, count: 0 });
    for (let tick = 100; tick <= 3000; tick += 100) {
      counts.set(`${name}.received`, tick / 5);
      counts.set(`${name}.age`, 0.004);
      if (tick <= 2000) counts.set(`${other}.sent`, tick / 10);
      look(tick);
    }
    const now = look(3000);
    expect(now[received]).toMatchObject({ age: 0.004, count: 600, timedOut: false });
    expect(now[received]!.rate).toBeCloseTo(200, 6);
    expect(now[sent]).toMatchObject({ age: 1, count: 200, rate: 0 });
  });

  test('begin anew when the counts do, at tick 0', () => {
    const rates = new MessageRates(spec);
    let count = 200;
    const look = (tick: number) => rates.status(tick, (signal) => (signal === `${name}.received` ? count : undefined));
    look(0);
    count = 4;
    expect(look(20)[received]!.rate).toBe(0);
    count = 104;
    expect(look(520)[received]!.rate).toBeCloseTo(200, 6);
  });

  test('count what could not be used with the first message of its link', () => {
    const rates = new MessageRates(spec);
    const { link } = messages[received]!;
    const status = rates.status(5, (signal) =>
      signal === `${link}.malformed` ? 3 : signal === `${name}.outOfRange` ? 2 : signal === `${name}.lost` ? 7 : 0,
    );
    expect(status[received]).toMatchObject({ malformed: 5, lost: 7 });
    expect(status.reduce((sum, one) => sum + one.malformed, 0)).toBe(5);
  });
});

describe('gas curves', () => {
  const parameters = spec.circuit.elements.find((element) => element.name === 'highAccumulator')!.parameters;
  const ideal = { ...parameters, gas: 1 };
  const volume = parameters['volume']!;
  const precharge = parameters['precharge']!;

  test('begin at the precharge', () => {
    for (const curve of [...gasCurves(parameters), ...gasCurves(ideal)]) {
      expect(curve.volume[0]).toBe(volume);
      expect(curve.pressure[0]! / precharge).toBeCloseTo(1, 9);
    }
  });

  test('of an ideal diatomic gas are p V and p V^1.4, constant', () => {
    const [isotherm, adiabat] = gasCurves(ideal);
    isotherm!.volume.forEach((at, i) => {
      expect((isotherm!.pressure[i]! * at) / (precharge * volume)).toBeCloseTo(1, 9);
      expect((adiabat!.pressure[i]! * at ** 1.4) / (precharge * volume ** 1.4)).toBeCloseTo(1, 6);
    });
  });

  test('of nitrogen lie above those of the ideal gas at a third of the volume, the adiabat steeper', () => {
    const [isotherm, adiabat] = gasCurves(parameters);
    const [idealIsotherm, idealAdiabat] = gasCurves(ideal);
    const at = isotherm!.volume.findIndex((one) => one < volume / 3);
    expect(isotherm!.pressure[at]).toBeGreaterThan(idealIsotherm!.pressure[at]!);
    expect(adiabat!.pressure[at]).toBeGreaterThan(idealAdiabat!.pressure[at]!);
    expect(adiabat!.pressure[at]).toBeGreaterThan(isotherm!.pressure[at]!);
  });
});

test('how a requirement stands, from its two signals', () => {
  expect(judgedStatus(0, undefined, 3)).toEqual({ verdict: 'not yet judged', margin: Number.NaN, atTick: 3 });
  expect(judgedStatus(0, 5, 3)).toEqual({ verdict: 'holds so far', margin: 5, atTick: 3 });
  expect(judgedStatus(1, 2, 3).verdict).toBe('holds so far');
  expect(judgedStatus(2, -1, 3)).toEqual({ verdict: 'violated', margin: -1, atTick: 3 });
  expect(judgedStatus(3, Number.POSITIVE_INFINITY, 3)).toEqual({
    verdict: 'not yet judged',
    margin: Number.NaN,
    atTick: 3,
  });
});
