import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';
import { bar, oil } from '../support/oil.js';

const fluid = oil();

function unit(given: Readonly<Record<string, number>>, high = 200): Bench {
  return new Bench([
    element('highSide', library.pressureSource, { fluid, parameters: { pressure: high * bar } }),
    element('lowSide', library.pressureSource, { fluid, parameters: { pressure: 10 * bar } }),
    element('housing', library.pressureSource, { fluid, parameters: { pressure: 1.5 * bar } }),
    element('drive', library.speedSource, { parameters: { constantSpeed: 150 } }),
    element('unit', library.pumpMotor, {
      parameters: { displacement: 1e-4, request: 1, ...given },
      to: { high: 'highSide.oil', low: 'lowSide.oil', caseDrain: 'housing.oil', shaft: 'drive.shaft' },
    }),
  ]);
}

/** Seconds from a step of the request until the displacement has reached `share`. */
function reaches(bench: Bench, share: number): number {
  let time = 0;
  bench.run(0.1);
  bench.set('unit.displacementRequest', 1);
  while (bench.get('unit.displacement') < share && time < 2) {
    bench.plant.step();
    time += 1e-3;
  }
  return time;
}

describe('the displacement actuator', () => {
  it('is of second order: linear, critically near, 60 rad/s reaches 63 % after the time of its transfer function', () => {
    // x'' + 2 z w x' + w^2 x = w^2, z = 1: 1 - (1 + w t) e^{-w t} = 0.632 at w t = 2.146
    expect(reaches(unit({ naturalFrequency: 60, damping: 1, rateLimit: 200 }), 0.632)).toBeCloseTo(2.146 / 60, 2);
  });
  it('waits its dead time: 10 ms later by 10 ms to an eighth', () => {
    const without = reaches(unit({ rateLimit: 200 }), 0.5);
    for (const deadTime of [0.002, 0.01, 0.04]) {
      const late = reaches(unit({ rateLimit: 200, deadTime }), 0.5) - without;
      expect(late).toBeGreaterThan(0.87 * deadTime - 1.1e-3);
      expect(late).toBeLessThan(1.13 * deadTime + 1.1e-3);
    }
  });
  it('is slower with less control pressure: a quarter of the pressure, half the rate', () => {
    const rate = (high: number) => {
      const bench = unit({ rateLimit: 5, naturalFrequency: 300, ratedControlPressure: 100 * bar }, high);
      return reaches(bench, 0.8);
    };
    expect(rate(400)).toBeCloseTo(0.16, 1);
    expect(rate(25) / rate(100)).toBeCloseTo(2, 1);
    expect(rate(100) / rate(400)).toBeCloseTo(1, 1);
  });
  it('obeys a valve current between its dead band and its full current, with the sign', () => {
    const bench = unit({ request: 3, deadCurrent: 0.2, fullCurrent: 0.6 });
    for (const [current, displacement] of [
      [0.1, 0],
      [0.4, 0.5],
      [-0.5, -0.75],
      [2, 1],
    ] as const) {
      bench.set('unit.currentRequest', current);
      bench.run(1);
      expect(bench.get('unit.displacement')).toBeCloseTo(displacement, 3);
    }
  });
  it('says when it does not follow, and not during an ordinary stroke', () => {
    const bench = unit({});
    bench.set('unit.displacementRequest', 1);
    let most = 0;
    bench.run(0.6, () => {
      most = Math.max(most, bench.get('unit.lastingError'));
    });
    expect(most).toBe(0);
    bench.set('unit.stuck', 1);
    bench.set('unit.displacementRequest', -1);
    bench.run(0.28);
    expect(bench.get('unit.lastingError')).toBe(0);
    bench.run(0.05);
    expect(bench.get('unit.lastingError')).toBeGreaterThan(1.9);
  });
  it('wants more inlet pressure the faster it turns', () => {
    const bench = unit({ inletRise: 2000 });
    bench.run(0.1);
    expect(bench.get('unit.inletPressure') - bench.get('unit.inletForSpeed')).toBeCloseTo(2000 * 150, 0);
  });
});
