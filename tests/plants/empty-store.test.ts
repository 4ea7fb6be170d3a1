import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';

/**
 * A store that is drawn empty by a flow that does not yield, through its knee, and filled again at once: what is left in
 * it is of the order of rounding, and so is its heat. The temperature is still one between those around it, and the
 * ledger closes.
 */
const fluid = oil();
const ambient = { ambientTemperature: 293.15 };

function drained(kind: 'accumulator' | 'volume', temperature: number) {
  const store =
    kind === 'accumulator'
      ? element('store', library.gasAccumulator, {
          fluid,
          parameters: { volume: 2 * litre, precharge: 60 * bar, oilConductance: 0, ...ambient },
          start: { pressure: 90 * bar, oilTemperature: temperature },
        })
      : element('store', library.oilVolume, {
          fluid,
          parameters: { volume: 0.3 * litre },
          start: { pressure: 90 * bar, temperature },
        });
  return new Bench([
    store,
    element('tank', library.tank, {
      fluid,
      parameters: { volume: 60 * litre, ambientPressure: 101325, ...ambient },
      start: { level: 0.5, temperature: 313 },
    }),
    element('pump', library.flowSource, { parameters: { lag: 0.002 }, to: { from: 'store.oil', to: 'tank.oil' } }),
    element('pipe', library.pipe, {
      parameters: { length: 5, diameter: 0.008 },
      to: { from: 'tank.oil', to: 'store.oil' },
    }),
    element('valve', library.proportionalValve, {
      parameters: { area: 2e-4 },
      to: { from: 'store.oil', to: 'tank.oil' },
    }),
  ]);
}

describe.each(['accumulator', 'volume'] as const)('an empty %s', (kind) => {
  it.each([290, 345])('of %s K keeps a temperature between those around it, and the ledger', (temperature) => {
    const bench = drained(kind, temperature);
    const name = kind === 'accumulator' ? 'store.oilTemperature' : 'store.temperature';
    let least = 1e9;
    let most = 0;
    let leastMass = 1e9;
    bench.run(0.8, (time) => {
      const turn = Math.floor(time / 0.1);
      bench.set('pump.flowRequest', [0, 400, 400, 0, 90, 400, -60, 400][turn]! * litresPerMinute);
      bench.set('valve.request', turn % 3 === 1 ? 1 : 0);
      least = Math.min(least, bench.get(name));
      leastMass = Math.min(leastMass, bench.get('store.mass'));
      most = Math.max(most, bench.get(name));
    });
    expect(leastMass).toBeGreaterThan(0);
    expect(leastMass).toBeLessThan(kind === 'accumulator' ? 1e-3 : 0.05);
    expect(least).toBeGreaterThan(Math.min(temperature, 313) - 1);
    expect(most).toBeLessThan(Math.max(temperature, 313) + 1);
    // a megawatt of heat flowed with the oil
    expect(Math.abs(bench.energyResidual())).toBeLessThan(2);
    expect(bench.plant.solver.replaced).toBeLessThan(10);
  });
});

describe('an inertial pipe', () => {
  it('whose column draws a volume empty passes no oil that is not there, fills it again, and keeps the ledger', () => {
    const bench = new Bench([
      element('store', library.oilVolume, {
        fluid,
        parameters: { volume: 1 * litre },
        start: { pressure: 20 * bar, temperature: 320 },
      }),
      element('tank', library.tank, {
        fluid,
        parameters: { volume: 60 * litre, ambientPressure: 101325, ...ambient },
        start: { level: 0.5, temperature: 313 },
      }),
      element('column', library.inertialPipe, {
        fluid,
        parameters: { length: 8, diameter: 0.05 },
        start: { massFlow: 12 },
        to: { from: 'store.oil', to: 'tank.oil' },
      }),
    ]);
    let least = 1e9;
    let mass = 0;
    bench.run(3, () => {
      least = Math.min(least, bench.get('store.mass'));
      mass = bench.get('store.mass');
    });
    expect(least).toBeGreaterThan(0);
    expect(least).toBeLessThan(0.03);
    expect(mass).toBeGreaterThan(0.5);
    expect(bench.get('store.temperature')).toBeGreaterThan(312);
    expect(bench.get('store.temperature')).toBeLessThan(321);
    expect(Math.abs(bench.energyResidual())).toBeLessThan(2);
  });
});
