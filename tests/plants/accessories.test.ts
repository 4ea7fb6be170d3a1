import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';

const turning = (name: string, speed: number) =>
  element(name, library.speedSource, { parameters: { constantSpeed: speed } });

describe('torque converter', () => {
  const at = (pump: number, turbine: number) => {
    const bench = new Bench([
      turning('pump', pump),
      turning('turbine', turbine),
      element('converter', library.torqueConverter, {
        parameters: { capacity: 6e-3, stallRatio: 2, couplingPoint: 0.86 },
        to: { pump: 'pump.shaft', turbine: 'turbine.shaft' },
      }),
    ]);
    bench.run(0.01);
    return bench;
  };
  it('takes K w^2 and doubles it at stall', () => {
    const stall = at(200, 0);
    expect(stall.get('converter.pumpTorque') / (6e-3 * 200 ** 2)).toBeCloseTo(1, 4);
    expect(stall.get('converter.turbineTorque') / stall.get('converter.pumpTorque')).toBeCloseTo(2, 9);
    expect(stall.get('converter.heat') / (6e-3 * 200 ** 3)).toBeCloseTo(1, 4);
  });
  it('is a fluid coupling from the coupling point on, and when turned by the turbine', () => {
    for (const turbine of [180, 199, 240]) {
      const bench = at(200, turbine);
      expect(bench.get('converter.turbineTorque') / bench.get('converter.pumpTorque')).toBeCloseTo(1, 9);
    }
    expect(at(200, 240).get('converter.pumpTorque')).toBeLessThan(0);
  });
  it('never gives more power than it takes, in any quadrant', () => {
    for (const pump of [-150, -1, -0.005, 0, 0.005, 0.5, 20, 300])
      for (const turbine of [-200, -3, 0, 0.004, 0.45, 18, 90, 250, 400])
        expect(at(pump, turbine).get('converter.heat'), `${pump} ${turbine}`).toBeGreaterThanOrEqual(-1e-6);
  });
  it('refuses a characteristic that would make energy', () => {
    const kind = library.torqueConverter;
    const remarks = (stallRatio: number) =>
      kind.examine!({ parameter: { capacity: 6e-3, stallRatio, couplingPoint: 0.95 }, fluid: {} });
    expect(remarks(2)).toEqual([]);
    expect(remarks(4)).toHaveLength(1);
  });
});

describe('starter motor', () => {
  it('brings an engine against its drag to the balance on the straight line, then overruns', () => {
    const bench = new Bench([
      element('crank', library.inertia, { parameters: { inertia: 0.5 } }),
      element('drag', library.shaftDrag, { parameters: { constantDrag: 120 }, to: { shaft: 'crank.shaft' } }),
      element('starter', library.starterMotor, {
        parameters: { stallTorque: 300, freeSpeed: 40 },
        to: { shaft: 'crank.shaft' },
      }),
    ]);
    bench.set('starter.engage', 1);
    bench.run(2);
    expect(bench.get('crank.speed')).toBeCloseTo(40 * (1 - 120 / 300), 1);
    bench.set('starter.engage', 0);
    bench.run(1);
    expect(bench.get('starter.torque')).toBeCloseTo(0, 4);
  });
});

describe('accessory', () => {
  const at = (speed: number, power: number) => {
    const bench = new Bench([
      turning('shaft', speed),
      element('machine', library.accessory, {
        parameters: { constantPower: power, efficiency: 0.8, maximumTorque: 50, leastSpeed: 40, drag: 2 },
        to: { shaft: 'shaft.shaft' },
      }),
    ]);
    bench.run(0.01);
    return bench;
  };
  it('takes power over efficiency, and its drag', () => {
    const bench = at(200, 4000);
    expect(bench.get('machine.torque')).toBeCloseTo(4000 / 0.8 / 200 + 2, 3);
    expect(bench.get('machine.usefulPower')).toBeCloseTo(4000, 0);
  });
  it('is bounded by its torque at low speed and says what is missing; it never drives', () => {
    expect(at(50, 4000).get('machine.torque')).toBeLessThanOrEqual(52);
    expect(at(50, 4000).get('machine.missingPower')).toBeGreaterThan(1000);
    expect(at(-50, 4000).get('machine.torque')).toBeCloseTo(-2, 2);
  });
});

describe('retarder', () => {
  it('has no torque at standstill, its full one at speed, and no more power than its cooling bears', () => {
    const at = (speed: number) => {
      const bench = new Bench([
        turning('shaft', speed),
        element('retarder', library.retarder, {
          parameters: { maximumTorque: 1000, maximumPower: 1e5, applicationTime: 0.01, fullSpeed: 20 },
          to: { shaft: 'shaft.shaft' },
        }),
      ]);
      bench.set('retarder.demand', 1);
      bench.run(0.2);
      return bench.get('retarder.torque');
    };
    expect(at(0)).toBe(0);
    expect(at(40)).toBeGreaterThan(880);
    expect(at(-40)).toBeCloseTo(-at(40), 9);
    for (const speed of [100, 300, 1000]) expect(at(speed) * speed).toBeLessThanOrEqual(1e5);
  });
});

describe('park brake', () => {
  const held = (release: number, power: number) => {
    const bench = new Bench([
      element('shaft', library.inertia, { parameters: { inertia: 5 } }),
      element('push', library.torqueSource, { parameters: { constantTorque: 400 }, to: { shaft: 'shaft.shaft' } }),
      element('park', library.parkBrake, { parameters: { maximumTorque: 900 }, to: { shaft: 'shaft.shaft' } }),
    ]);
    bench.set('park.release', release);
    bench.set('park.power', power);
    bench.run(2);
    return bench.get('shaft.speed');
  };
  it('holds by itself, lets go when released, and holds again without supply', () => {
    expect(Math.abs(held(0, 1))).toBeLessThan(2e-3);
    expect(held(1, 1)).toBeGreaterThan(50);
    expect(Math.abs(held(1, 0))).toBeLessThan(2e-3);
  });
});
