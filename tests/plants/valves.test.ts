import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';
import { checkOilCircuits } from './oil-circuit-suite.js';

const fluid = oil();
const line = (name: string, volume: number, pressure: number, temperature = 323.15) =>
  element(name, library.oilVolume, {
    fluid,
    parameters: { volume: volume * litre },
    start: { pressure: pressure * bar, temperature },
  });
const accumulator = (name: string, pressure: number) =>
  element(name, library.gasAccumulator, {
    fluid,
    parameters: { ambientTemperature: 293.15, volume: 10 * litre, precharge: 100 * bar },
    start: { pressure: pressure * bar },
  });
const tank = () =>
  element('tank', library.tank, {
    fluid,
    parameters: { volume: 30 * litre, ambientPressure: 101325, ambientTemperature: 293.15 },
    start: { level: 0.6, temperature: 318 },
  });
const source = (name: string, pressure: number, temperature = 323.15) =>
  element(name, library.pressureSource, { fluid, parameters: { pressure: pressure * bar, temperature } });

const safetyBlock = (given: Record<string, number> = {}, start: Record<string, number> = {}) =>
  element('block', library.accumulatorSafetyBlock, {
    parameters: {
      area: 1.5e-4,
      cracking: 250 * bar,
      fullFlow: 265 * bar,
      fullFlowRate: 100 * litresPerMinute,
      ...given,
    },
    start,
    to: { accumulator: 'accumulator.oil', system: 'line.oil', tank: 'tank.oil' },
  });
const filterOf = (given: Record<string, number> = {}, start: Record<string, number> = {}) =>
  element('filter', library.filter, {
    parameters: { ratedFlow: 100 * litresPerMinute, ...given },
    start,
    to: { from: 'line.oil', to: 'clean.oil' },
  });

checkOilCircuits({
  'proportional-valve, seal-friction': {
    elements: () => [
      accumulator('accumulator', 180),
      line('port', 0.2, 180),
      line('line', 0.5, 100, 310),
      tank(),
      element('seals', library.sealFriction, {
        parameters: { area: 3e-4, sealFriction: 1.5e5 },
        to: { from: 'accumulator.oil', to: 'port.oil' },
      }),
      element('valve', library.proportionalValve, {
        parameters: { area: 8e-5 },
        to: { from: 'port.oil', to: 'line.oil' },
      }),
      element('outlet', library.orifice, { parameters: { area: 1e-5 }, to: { from: 'line.oil', to: 'tank.oil' } }),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('valve.request', 0.55 + 0.5 * Math.sin(13 * time));
      bench.set('valve.power', time > 0.8 && time < 0.85 ? 0 : 1);
      bench.set('pump.flowRequest', 80 * litresPerMinute * Math.max(0, Math.sin(5 * time)));
    },
  },
  'pilot-check-valve': {
    elements: () => [
      line('line', 0.5, 20),
      accumulator('accumulator', 150),
      line('pilot', 0.2, 10),
      tank(),
      element('check', library.pilotCheckValve, {
        parameters: { area: 5e-5 },
        to: { from: 'line.oil', to: 'accumulator.oil', pilot: 'pilot.oil' },
      }),
      element('pilotPump', library.flowSource, { to: { from: 'tank.oil', to: 'pilot.oil' } }),
      element('pilotDrain', library.orifice, { parameters: { area: 2e-7 }, to: { from: 'pilot.oil', to: 'tank.oil' } }),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
      element('outlet', library.orifice, { parameters: { area: 4e-6 }, to: { from: 'line.oil', to: 'tank.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('pump.flowRequest', time < 0.3 ? 80 * litresPerMinute : 0);
      bench.set('pilotPump.flowRequest', time > 0.5 && time < 0.8 ? 2 * litresPerMinute : 0);
      bench.set('check.leakArea', time > 0.9 ? 1e-8 : 0);
    },
  },
  'accumulator-safety-block': {
    elements: () => [
      accumulator('accumulator', 200),
      line('line', 0.5, 3),
      tank(),
      safetyBlock({ equalisedWithin: 40e5 }),
      // keeps the two pressures apart, where the side that the oil comes from changes
      element('bleed', library.orifice, { parameters: { area: 1e-6 }, to: { from: 'line.oil', to: 'tank.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('block.open', time > 0.05 && time < 0.5 ? 1 : 0);
      bench.set('block.power', time > 0.8 ? 0 : 1);
      bench.set('block.dump', time > 0.6 && time < 0.7 ? 1 : 0);
    },
  },
  'filter, hot-oil-shuttle': {
    elements: () => [
      line('line', 0.5, 20),
      line('clean', 0.5, 15, 318),
      line('other', 0.4, 60, 340),
      tank(),
      filterOf({ loadingRate: 20, bypassCracking: 2e5 }),
      element('shuttle', library.hotOilShuttle, {
        parameters: { area: 1e-5, flushingPressure: 8 * bar },
        to: { a: 'clean.oil', b: 'other.oil', drain: 'tank.oil' },
      }),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
      element('cross', library.flowSource, { to: { from: 'clean.oil', to: 'other.oil' } }),
      element('back', library.orifice, { parameters: { area: 1e-5 }, to: { from: 'other.oil', to: 'clean.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('pump.flowRequest', 90 * litresPerMinute * Math.sin(8 * time));
      bench.set('cross.flowRequest', 40 * litresPerMinute * Math.sin(5 * time + 1));
      bench.set('filter.clogging', time > 0.5 ? 20 : 1);
    },
  },
});

describe('proportional valve', () => {
  it('passes q = Cd A x sqrt(2 dp / rho) in proportion to what is beyond the overlap (Merritt 1967)', () => {
    const bench = new Bench([
      source('supply', 110),
      source('sink', 10),
      element('valve', library.proportionalValve, {
        parameters: { area: 5e-5, dischargeCoefficient: 0.61, overlap: 0.1 },
        to: { from: 'supply.oil', to: 'sink.oil' },
      }),
    ]);
    const flowAt = (request: number) => {
      bench.set('valve.request', request);
      bench.run(0.3);
      return bench.get('valve.flow');
    };
    const whole = flowAt(1);
    const density = bench.get('valve.massFlow') / whole;
    expect(whole / (0.61 * 5e-5 * Math.sqrt((2 * 100 * bar) / density))).toBeCloseTo(1, 4);
    expect(flowAt(0.55) / whole).toBeCloseTo(0.5, 4);
    expect(flowAt(0.08)).toBe(0);
    bench.set('valve.power', 0);
    bench.run(0.3);
    expect(bench.get('valve.position')).toBeCloseTo(0, 6);
  });

  it('steps like a second-order system within its speed', () => {
    const bench = new Bench([
      source('supply', 20),
      source('sink', 10),
      element('valve', library.proportionalValve, {
        parameters: { area: 5e-5, naturalFrequency: 100, damping: 0.7, rateLimit: 1000 },
        to: { from: 'supply.oil', to: 'sink.oil' },
      }),
    ]);
    bench.set('valve.request', 1);
    let peak = 0;
    bench.run(0.2, () => {
      peak = Math.max(peak, bench.get('valve.position'));
    });
    // overshoot exp(-pi zeta / sqrt(1 - zeta^2)) of a linear second-order system
    expect(peak - 1).toBeCloseTo(Math.exp((-Math.PI * 0.7) / Math.sqrt(1 - 0.49)), 3);
  });
});

describe('pilot-operated check valve', () => {
  const bench = (pilot: number) => {
    const made = new Bench([
      source('low', 10),
      source('load', 100),
      source('pilot', pilot),
      element('check', library.pilotCheckValve, {
        parameters: { area: 5e-5, pilotRatio: 4, cracking: 1e5, opensOver: 1e5 },
        to: { from: 'low.oil', to: 'load.oil', pilot: 'pilot.oil' },
      }),
    ]);
    made.run(0.2);
    return made;
  };
  it('holds the load, and opens for flow back where pilotRatio (p_pilot - p_from) exceeds p_to - p_from + cracking', () => {
    // balance: 4 (p - 10) = 90 + 1 bar, so p = 32.75 bar
    expect(Math.abs(bench(32.7).get('check.flow'))).toBe(0);
    expect(bench(33.1).get('check.flow')).toBeLessThan(-1e-4);
  });
});

describe('filter', () => {
  const bench = (flow: number, given: Record<string, number> = {}, start: Record<string, number> = {}) => {
    const made = new Bench([
      line('line', 0.5, 5),
      source('clean', 4),
      source('supply', 5),
      element('filter', library.filter, {
        parameters: { ratedFlow: 100 * litresPerMinute, ratedViscosity: 0.026, ratedDensity: 856, ...given },
        start,
        to: { from: 'line.oil', to: 'clean.oil' },
      }),
      element('pump', library.flowSource, { parameters: { lag: 1e-3 }, to: { from: 'supply.oil', to: 'line.oil' } }),
    ]);
    made.set('pump.flowRequest', flow * litresPerMinute);
    made.run(1);
    return made;
  };
  it('loses its clean difference at the rated flow, and a mix of linear and square below', () => {
    const viscosity = bench(1).get('filter.difference');
    expect(viscosity).toBeGreaterThan(0);
    const whole = bench(100).get('filter.difference');
    expect(Math.abs(whole / 0.5e5 - 1)).toBeLessThan(0.1);
    const half = bench(50).get('filter.difference');
    expect(half / whole).toBeGreaterThan(0.25);
    expect(half / whole).toBeLessThan(0.5);
  });
  it('clogs by what it filters, exponentially, and opens its bypass', () => {
    const made = bench(100, { loadingRate: 100, bypassArea: 0 });
    const filtered = 100 * litresPerMinute;
    expect(made.get('filter.loading')).toBeCloseTo(Math.exp(100 * filtered), 2);
    const clogged = bench(100, { bypassCracking: 2e5 }, { loading: 30 });
    expect(clogged.get('filter.bypassFlow') / litresPerMinute).toBeGreaterThan(50);
    expect(clogged.get('filter.difference')).toBeLessThan(3.1e5);
  });
});

describe('safety block', () => {
  const made = () => new Bench([accumulator('accumulator', 200), line('line', 0.5, 3), tank(), safetyBlock()]);
  it('equalises before it opens: the line rises without a jump', () => {
    const bench = made();
    bench.set('block.open', 1);
    let fastest = 0;
    let before = bench.get('line.pressure');
    bench.run(0.6, () => {
      const now = bench.get('line.pressure');
      if (bench.get('block.main') > 0.01) expect(bench.get('block.difference')).toBeLessThan(6e5);
      fastest = Math.max(fastest, now - before);
      before = now;
    });
    expect(bench.get('block.main')).toBeGreaterThan(0.99);
    expect(fastest).toBeLessThan(20 * bar);
    expect(Math.abs(bench.get('block.difference'))).toBeLessThan(1e4);
  });
  it('stays shut over a line that never comes to pressure', () => {
    const bench = new Bench([
      accumulator('accumulator', 200),
      line('line', 0.5, 3),
      tank(),
      safetyBlock(),
      element('burst', library.orifice, { parameters: { area: 1e-4 }, to: { from: 'line.oil', to: 'tank.oil' } }),
    ]);
    bench.set('block.open', 1);
    bench.run(0.5);
    expect(bench.get('block.main')).toBeCloseTo(0, 6);
  });
  it('discharges without supply, and after its rest', () => {
    const unpowered = made();
    unpowered.set('block.power', 0);
    unpowered.run(20);
    expect(unpowered.get('accumulator.pressure')).toBeLessThan(5 * bar);
    const rested = new Bench([
      accumulator('accumulator', 200),
      line('line', 0.5, 3),
      tank(),
      safetyBlock({ dischargeAfter: 0.5 }),
    ]);
    rested.run(0.5);
    expect(rested.get('block.discharge')).toBeCloseTo(0, 6);
    rested.run(0.2);
    expect(rested.get('block.discharge')).toBeGreaterThan(0.99);
  });
  it('relieves the accumulator at its rated point', () => {
    const bench = new Bench([source('accumulator', 265), line('line', 0.5, 3), tank(), safetyBlock({})]);
    bench.run(0.3);
    expect(bench.get('block.reliefFlow') / litresPerMinute).toBeCloseTo(100, 0);
  });
});

describe('hot-oil shuttle', () => {
  it('flushes the low side only, and neither at equal pressures', () => {
    const flows = (a: number, b: number) => {
      const bench = new Bench([
        source('a', a),
        source('b', b),
        tank(),
        element('shuttle', library.hotOilShuttle, {
          parameters: { area: 1e-5, flushingPressure: 10 * bar },
          to: { a: 'a.oil', b: 'b.oil', drain: 'tank.oil' },
        }),
      ]);
      bench.run(0.3);
      return [bench.get('shuttle.aMassFlow'), bench.get('shuttle.bMassFlow')] as const;
    };
    expect(flows(200, 15)[0]).toBe(0);
    expect(flows(200, 15)[1]).toBeGreaterThan(0.05);
    expect(flows(15, 200)[0]).toBeGreaterThan(0.05);
    expect(flows(15, 15)).toEqual([0, 0]);
    expect(flows(200, 9)).toEqual([0, 0]);
  });
});

describe('seal friction', () => {
  it('gives the loop of a piston accumulator: the line is above the gas while filling and below while emptying', () => {
    const bench = new Bench([
      accumulator('accumulator', 180),
      line('line', 0.3, 180),
      source('supply', 180),
      element('seals', library.sealFriction, {
        parameters: { area: 2e-3, sealFriction: 1.5e5 },
        to: { from: 'accumulator.oil', to: 'line.oil' },
      }),
      element('pump', library.flowSource, { to: { from: 'supply.oil', to: 'line.oil' } }),
    ]);
    bench.set('pump.flowRequest', 10 * litresPerMinute);
    bench.run(0.5);
    expect(bench.get('seals.difference')).toBeCloseTo(-1.55e5, -4);
    bench.set('pump.flowRequest', -10 * litresPerMinute);
    bench.run(0.5);
    expect(bench.get('seals.difference')).toBeCloseTo(1.55e5, -4);
  });
});
