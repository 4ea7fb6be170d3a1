import { describe, expect, it } from 'vitest';
import * as flow from '../../plants/laws/flow.js';
import * as library from '../../plants/library.js';
import type { ElementInstance } from '../../runtime/contract.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';

/** 870 kg/m3 at every pressure, with a constant kinematic viscosity in mm2/s where it matters. */
const stiff = (viscosity = 46) =>
  oil({
    bulkModulus: 1e13,
    air: 1e-4,
    density: 870,
    thermalExpansion: 0,
    grade: 3,
    at: 313.15,
    viscosityAt40: viscosity * 1e-6,
    viscosityAt100: viscosity * 0.2e-6,
  });

/** A branch between two prescribed pressures, bar. */
function between(from: number, to: number, branch: ElementInstance, fluid = stiff()): Bench {
  return new Bench([
    element('a', library.pressureSource, { fluid, parameters: { pressure: from * bar } }),
    element('b', library.pressureSource, { fluid, parameters: { pressure: to * bar } }),
    branch,
  ]);
}
const ends = { from: 'a.oil', to: 'b.oil' };

describe('orifice, q = Cd A sqrt(2 dp / rho) (Merritt 1967)', () => {
  const orifice = (area: number, smoothing = 100) =>
    element('orifice', library.orifice, { parameters: { area, dischargeCoefficient: 0.61, smoothing }, to: ends });

  it('Cd 0.61, 50 mm2, 10 bar, 870 kg/m3: 87.74 L/min', () => {
    expect(between(110, 100, orifice(50e-6)).get('orifice.flow') / litresPerMinute).toBeCloseTo(87.74, 1);
  });
  it('10 L/min through a bore of 3 mm: 6.50 bar', () => {
    const area = 0.25 * Math.PI * 0.003 ** 2;
    expect(between(100 + 6.5, 100, orifice(area)).get('orifice.flow') / litresPerMinute).toBeCloseTo(10, 2);
  });
  it('is low by 0.25 % at 10 bar when it is made smooth over 1 bar', () => {
    const exact = between(110, 100, orifice(50e-6)).get('orifice.flow');
    const smooth = between(110, 100, orifice(50e-6, 1e5)).get('orifice.flow');
    expect(smooth / exact).toBeCloseTo(1.01 ** -0.25, 5);
  });
  it('empties 1 L from 200 bar through 1 mm2 with sqrt p falling in a straight line, to zero in 0.218440 s', () => {
    // the closed form has constant density; from 200 bar it changes by 1.4 %, so one checks the middle of the way
    const fluid = oil({ bulkModulus: 1.4e9, air: 1e-4, density: 870, thermalExpansion: 0 });
    const bench = new Bench([
      element('volume', library.oilVolume, {
        fluid,
        parameters: { volume: 1 * litre },
        start: { pressure: 200 * bar },
      }),
      element('outside', library.pressureSource, { fluid, parameters: { pressure: 1000 } }),
      element('orifice', library.orifice, {
        parameters: { area: 1e-6, dischargeCoefficient: 0.61, smoothing: 100 },
        to: { from: 'volume.oil', to: 'outside.oil' },
      }),
    ]);
    for (const share of [0.25, 0.5, 0.75]) {
      bench.run(0.21844 * 0.25);
      const expected = 200 * (1 - share) ** 2;
      expect(Math.abs(Math.sqrt(bench.get('volume.pressure') / bar) - Math.sqrt(expected))).toBeLessThan(
        0.01 * Math.sqrt(200),
      );
    }
  });
});

describe('volume, dp/dt = K/V q (Merritt 1967)', () => {
  it('1 L, 1.4 GPa, 1 L/min: 233.33 bar/s', () => {
    const fluid = oil({ bulkModulus: 1.4e9, air: 1e-4 });
    const bench = new Bench([
      element('volume', library.oilVolume, { fluid, parameters: { volume: 1 * litre }, start: { pressure: 60 * bar } }),
      element('supply', library.pressureSource, { fluid, parameters: { pressure: 60 * bar } }),
      element('pump', library.flowSource, {
        start: { flow: 1 * litresPerMinute },
        to: { from: 'supply.oil', to: 'volume.oil' },
      }),
    ]);
    bench.set('pump.flowRequest', 1 * litresPerMinute);
    bench.run(0.01);
    expect((bench.get('volume.pressure') / bar - 60) / 0.01 / 233.33).toBeCloseTo(1, 3);
  });
});

describe('pipe, 25 mm, 5 m, 870 kg/m3 (Hagen and Poiseuille; Blasius)', () => {
  const given = { length: 5, diameter: 0.025 };

  it.each([
    [46, 100, 1845.3, 0.34785],
    [20, 200, 8488.3, 1.32242],
  ])('%s mm2/s, %s L/min: Re %s, %s bar', (viscosity, litres, reynolds, drop) => {
    const bench = between(
      100 + drop,
      100,
      element('pipe', library.pipe, { parameters: given, to: ends }),
      stiff(viscosity),
    );
    expect(bench.get('pipe.flow') / litresPerMinute / litres).toBeCloseTo(1, 3);
    expect(bench.get('pipe.reynolds') / reynolds).toBeCloseTo(1, 3);
  });

  it.each([
    [46, 100, 0.34785],
    [20, 200, 1.32242],
  ])('the same with inertia: settles at %s mm2/s, %s L/min, %s bar', (viscosity, litres, drop) => {
    const fluid = stiff(viscosity);
    const start = 870 * litres * litresPerMinute * 0.9;
    const bench = between(
      100 + drop,
      100,
      element('pipe', library.inertialPipe, { fluid, parameters: given, start: { massFlow: start }, to: ends }),
      fluid,
    );
    bench.run(8);
    expect(bench.get('pipe.flow') / litresPerMinute / litres).toBeCloseTo(1, 3);
    expect(bench.get('pipe.friction') / bar / drop).toBeCloseTo(1, 3);
  });

  it('has the inertance rho L / A = 8.862e6 kg/m4', () => {
    const fluid = stiff();
    const bench = between(
      110,
      100,
      element('pipe', library.inertialPipe, { fluid, parameters: given, to: ends }),
      fluid,
    );
    bench.run(0.001);
    expect((10 * bar * 0.001) / bench.get('pipe.flow') / 8.862e6).toBeCloseTo(1, 2);
  });

  it('its inverse is exact from creeping to turbulent flow', () => {
    for (let reynolds = 0.01; reynolds < 1e5; reynolds *= 1.31) {
      expect(flow.reynoldsOfFriction(flow.frictionNumber(reynolds)) / reynolds).toBeCloseTo(1, 6);
      expect(flow.reynoldsOfFriction(-flow.frictionNumber(reynolds)) / reynolds).toBeCloseTo(-1, 6);
    }
  });
});

describe('relief valve: cracking 330 bar, 10 % override at 200 L/min', () => {
  const valve = (reseat: number, bulkModulus = 1e12, volume = 50) => {
    const fluid = oil({ bulkModulus, air: 1e-4, density: 870, thermalExpansion: 0 });
    return new Bench([
      element('line', library.oilVolume, {
        fluid,
        parameters: { volume: volume * litre },
        start: { pressure: 300 * bar },
      }),
      element('tank', library.pressureSource, { fluid, parameters: { pressure: 1 * bar } }),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
      element('relief', library.reliefValve, {
        parameters: { cracking: 330 * bar, fullFlow: 363 * bar, fullFlowRate: 200 * litresPerMinute, reseat },
        to: { from: 'line.oil', to: 'tank.oil' },
      }),
    ]);
  };
  it.each([
    [200, 363],
    [100, 346.5],
  ])('%s L/min at %s bar', (litres, pressure) => {
    const bench = valve(1);
    bench.set('pump.flowRequest', litres * litresPerMinute);
    bench.run(0.5);
    expect(Math.abs(bench.get('line.pressure') / bar - pressure)).toBeLessThan(0.15);
  });
  it('passes nothing to speak of below cracking, and shuts at the reseat pressure after lifting', () => {
    const bench = valve(0.92, 1.5e9, 50);
    bench.set('pump.flowRequest', 1 * litresPerMinute);
    while (bench.get('line.pressure') < 320 * bar) bench.run(0.001);
    expect(bench.get('relief.flow')).toBeLessThan(0.002 * litresPerMinute);
    bench.set('pump.flowRequest', 60 * litresPerMinute);
    bench.run(0.5);
    expect(bench.get('relief.lifted')).toBe(1);
    bench.set('pump.flowRequest', 0);
    bench.run(2);
    expect(bench.get('relief.lifted')).toBe(0);
    expect(bench.get('line.pressure') / bar / (0.92 * 330)).toBeCloseTo(1, 2);
  });
});

describe('gas through a nozzle (de Saint-Venant and Wantzel)', () => {
  it('is choked below 0.52828 at kappa 1.4', () => {
    expect(flow.criticalRatio(1.4)).toBeCloseTo(0.52828, 5);
    const choked = (ratio: number) => flow.gasMassFlow(1e6, ratio * 1e6, 300, 287.05, 1.4, 1e-4, 0.01);
    expect(choked(0.1)).toBe(choked(0.5));
    expect(choked(0.6)).toBeLessThan(choked(0.5));
  });
  it('passes 0.23334 kg/s through 100 mm2 at 10 bar and 300 K', () => {
    expect(flow.gasMassFlow(1e6, 1e5, 300, 287.05, 1.4, 1e-4, 0.01)).toBeCloseTo(0.23334, 5);
  });
});
