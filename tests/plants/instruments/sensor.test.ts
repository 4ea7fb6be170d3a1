import { describe, expect, it } from 'vitest';
import * as instruments from '../../../plants/instruments.js';
import { InstrumentBench } from '../../support/instrument.js';

const bar = 1e5;
const range = { least: 1 * bar, most: 401 * bar };
const pressure = (parameters: Record<string, number> = {}, settings: { seed?: number; identity?: number } = {}) =>
  new InstrumentBench(instruments.pressureSensor, { ...range, ...parameters }, settings);

describe('sensor', () => {
  it('says the truth when it has no faults of its own', () => {
    const bench = pressure();
    for (const p of [10 * bar, 333.3 * bar, 2 * bar]) expect(bench.run({ of: p })).toBe(p);
    expect(bench.get('valid')).toBe(1);
  });

  it('starts at the truth and follows with its lag: 63.2 % after one time constant, exactly', () => {
    const bench = pressure({ lag: 0.01 });
    expect(bench.run({ of: 100 * bar })).toBe(100 * bar);
    for (let i = 0; i < 10; i += 1) bench.run({ of: 200 * bar });
    expect(bench.get('value') / bar).toBeCloseTo(100 + 100 * (1 - Math.exp(-1)), 9);
  });

  it('delays by whole ticks and says the first value until then', () => {
    const bench = pressure({ delay: 0.003 });
    const said = [1, 2, 3, 4, 5, 6, 7].map((k) => bench.run({ of: k * 10 * bar }) / bar);
    expect(said).toEqual([10, 10, 10, 10, 20, 30, 40]);
  });

  it('quantises from the lower end of its range and clips at both', () => {
    const bench = pressure({ resolution: 0.5 * bar });
    expect(bench.run({ of: 100.3 * bar }) / bar).toBeCloseTo(100.5, 9);
    expect(bench.run({ of: 500 * bar }) / bar).toBeCloseTo(401, 9);
    expect(bench.get('valid')).toBe(0);
    expect(bench.run({ of: 0 })).toBe(bar);
    expect(bench.get('valid')).toBe(0);
    bench.run({ of: 50 * bar });
    expect(bench.get('valid')).toBe(1);
  });

  it('has errors of zero and span', () => {
    const bench = pressure({ zeroError: 2 * bar, spanError: 0.01 });
    expect(bench.run({ of: 100 * bar }) / bar).toBeCloseTo(103, 9);
  });

  it('adds noise of the stated standard deviation, its own for each seed and each sensor', () => {
    const n = 20_000;
    const series = (settings: { seed?: number; identity?: number }) => {
      const bench = pressure({ noise: 0.3 * bar }, settings);
      return Float64Array.from({ length: n }, () => bench.run({ of: 200 * bar }) / bar - 200);
    };
    const a = series({ seed: 1, identity: 4 });
    const mean = a.reduce((s, v) => s + v, 0) / n;
    const deviation = Math.sqrt(a.reduce((s, v) => s + (v - mean) ** 2, 0) / n);
    expect(Math.abs(mean)).toBeLessThan((4 * 0.3) / Math.sqrt(n));
    expect(Math.abs(deviation / 0.3 - 1)).toBeLessThan(4 / Math.sqrt(2 * n));
    expect(series({ seed: 1, identity: 4 })).toEqual(a);
    for (const other of [series({ seed: 2, identity: 4 }), series({ seed: 1, identity: 5 })]) {
      const shared = other.reduce((s, v, i) => s + v * a[i]!, 0) / n / 0.09;
      expect(Math.abs(shared)).toBeLessThan(4 / Math.sqrt(n));
    }
  });

  it('drifts, sticks and is lost on command, and comes back', () => {
    const bench = pressure();
    bench.run({ of: 100 * bar });
    bench.set('drift', 5 * bar);
    expect(bench.run({ of: 100 * bar }) / bar).toBeCloseTo(105, 9);
    bench.set('stuck', 1);
    expect(bench.run({ of: 300 * bar }) / bar).toBeCloseTo(105, 9);
    expect(bench.get('valid')).toBe(1);
    bench.set('lost', 1);
    expect(bench.run({ of: 300 * bar })).toBe(bar);
    expect(bench.get('valid')).toBe(0);
    bench.set('lost', 0);
    bench.set('stuck', 0);
    bench.set('drift', 0);
    expect(bench.run({ of: 300 * bar })).toBe(300 * bar);
    expect(bench.get('valid')).toBe(1);
  });

  it('goes on from a copy of its block as if nothing had happened', () => {
    const make = () => pressure({ lag: 0.005, delay: 0.004, noise: 0.5 * bar, resolution: 0.1 * bar });
    const first = make();
    for (let i = 0; i < 50; i += 1) first.run({ of: (100 + i) * bar });
    const second = make();
    second.block.set(first.block);
    second.tick = first.tick;
    for (let i = 0; i < 50; i += 1)
      expect(second.run({ of: (150 - i) * bar })).toBe(first.run({ of: (150 - i) * bar }));
  });

  it('comes for each quantity with its unit', () => {
    const units = Object.fromEntries(
      Object.values(instruments)
        .filter((kind) => kind.stage === 'after')
        .map((kind) => [kind.kind, kind.parameters['least']!.unit]),
    );
    expect(units).toEqual({
      'pressure-sensor': 'Pa',
      'speed-sensor': 'rad/s',
      'velocity-sensor': 'm/s',
      'temperature-sensor': 'K',
      'torque-sensor': 'N m',
      'position-sensor': 'input',
      sensor: 'input',
      // terminals of an I/O box carry whatever their sensor measures
      'voltage-output': 'input',
      'current-output': 'input',
      'frequency-output': 'input',
      'duty-output': 'input',
    });
  });
});

describe('power-stage', () => {
  const stage = (parameters: Record<string, number> = {}, inputs: string[] = []) =>
    new InstrumentBench(instruments.powerStage, { least: 0, most: 1, ...parameters }, { inputs });

  it('passes a request on, within its range', () => {
    const bench = stage();
    expect(bench.run({ request: 0.4 })).toBe(0.4);
    expect(bench.run({ request: 3 })).toBe(1);
    expect(bench.run({ request: -3 })).toBe(0);
  });

  it('waits its dead time and limits its rate', () => {
    const bench = stage({ deadTime: 0.002, riseTime: 0.01, fallTime: 0.005 });
    const up = Array.from({ length: 14 }, () => bench.run({ request: 1 }));
    expect(up.slice(0, 4).map((v) => Math.round(v * 10) / 10)).toEqual([0, 0, 0.1, 0.2]);
    expect(up[13]).toBe(1);
    const down = Array.from({ length: 8 }, () => bench.run({ request: 0 }));
    expect(down.map((v) => Math.round(v * 10) / 10)).toEqual([1, 1, 0.8, 0.6, 0.4, 0.2, 0, 0]);
  });

  it('falls to rest or holds without supply', () => {
    for (const [choice, expected] of [
      [0, 0.2],
      [1, 0.8],
    ] as const) {
      const bench = stage({ atSupplyLoss: choice, restValue: 0.2 }, ['supply']);
      bench.run({ request: 0.8, supply: 1 });
      bench.run({ request: 0.8, supply: 1 });
      expect(bench.run({ request: 0.6, supply: 0 })).toBe(expected);
      expect(bench.run({ request: 0.6, supply: 1 })).toBe(0.6);
      bench.set('dead', 1);
      expect(bench.run({ request: 0.9, supply: 1 })).toBe(choice === 0 ? 0.2 : 0.6);
    }
  });

  it('sticks on command', () => {
    const bench = stage();
    bench.run({ request: 0.5 });
    bench.set('stuck', 1);
    expect(bench.run({ request: 1 })).toBe(0.5);
  });

  it('has the faults of a catalogue, each gone when it is cleared', () => {
    const bench = pressure();
    const says = () => bench.run({ of: 100 * bar }) / bar;
    says();
    const cases: [string, number, number, number][] = [
      ['drift', 5 * bar, 105, 1],
      ['gainFactor', 1.2, 120, 1],
      ['shortToSupply', 1, 401, 0],
      ['shortToGround', 1, 1, 0],
      ['lost', 1, 1, 0],
    ];
    for (const [fault, value, said, valid] of cases) {
      const rest = fault === 'gainFactor' ? 1 : 0;
      bench.set(fault, value);
      expect([fault, says(), bench.get('valid')]).toEqual([fault, expect.closeTo(said, 9), valid]);
      bench.set(fault, rest);
      expect([fault, says(), bench.get('valid')]).toEqual([fault, expect.closeTo(100, 9), 1]);
    }
  });

  it('becomes slow: 63.2 % after the further time constant', () => {
    const bench = pressure();
    bench.run({ of: 100 * bar });
    bench.set('addedLag', 0.02);
    for (let i = 0; i < 20; i += 1) bench.run({ of: 200 * bar });
    expect(bench.get('value') / bar).toBeCloseTo(100 + 100 * (1 - Math.exp(-1)), 9);
  });

  it('jumps and drops out by chance, in the stated share', () => {
    const bench = pressure();
    const n = 20_000;
    bench.set('spikes', 0.1);
    let count = 0;
    for (let i = 0; i < n; i += 1) count += bench.run({ of: 100 * bar }) > 400 * bar ? 1 : 0;
    expect(Math.abs(count / n - 0.1)).toBeLessThan(4 * Math.sqrt(0.09 / n));
    bench.set('spikes', 0);
    bench.set('dropouts', 0.2);
    count = 0;
    for (let i = 0; i < n; i += 1) {
      const said = bench.run({ of: (50 + (i % 100)) * bar });
      count += bench.get('valid') === 0 ? 1 : 0;
      expect(bench.get('valid') === 1 ? said / bar : 50 + (i % 100)).toBeCloseTo(50 + (i % 100), 9);
    }
    expect(Math.abs(count / n - 0.2)).toBeLessThan(4 * Math.sqrt(0.16 / n));
  });
});
