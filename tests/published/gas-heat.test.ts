import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import * as gas from '../../plants/laws/gas.js';
import * as library from '../../plants/library.js';
import { shortFormFaults, singularFlow } from '../../tools/check/short-form.js';
import { Bench, element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';

const stiff = oil({ bulkModulus: 1e13, air: 1e-4 });

function charged(parameters: Readonly<Record<string, number>>, start: Readonly<Record<string, number>>): Bench {
  return new Bench([
    element('accumulator', library.gasAccumulator, {
      fluid: stiff,
      parameters: {
        wallHeatCapacity: 1e12,
        ambientConductance: 0,
        oilConductance: 0,
        ambientTemperature: 300,
        closingShare: 0.001,
        prechargeTemperature: 300,
        ...(parameters as { volume: number; precharge: number }),
      },
      start,
    }),
    element('supply', library.pressureSource, { fluid: stiff, parameters: { pressure: 200 * bar } }),
    element('pump', library.flowSource, {
      parameters: { lag: 0.002 },
      to: { from: 'supply.oil', to: 'accumulator.oil' },
    }),
  ]);
}

/** Slopes at a density and temperature by the reference equation's fit. */
const slopes = (density: number, temperature: number) =>
  [
    gas.gasHeatCapacity(density, temperature, 2),
    gas.gasPressureByTemperature(density, temperature, 2),
    gas.gasPressureByDensity(density, temperature, 2),
  ] as const;

describe('nitrogen at 300 K, computed with a general property library', () => {
  it.each([
    [111.725, 19.96e-6, 31.1e-3],
    [294.781, 26.8e-6, 44.3e-3],
  ])('%f kg/m3: viscosity %f Pa s, conductivity %f W/(m K)', (density, viscosity, conductivity) => {
    expect(gas.nitrogenViscosity(density, 300) / viscosity).toBeCloseTo(1, 2);
    expect(gas.nitrogenConductivity(density, 300) / conductivity).toBeCloseTo(1, 2);
  });
});

describe('natural convection, Nu = C Ra^(1/3) (McAdams 1954)', () => {
  it('grows with the cube root of the difference', () => {
    const at = (difference: number) => gas.naturalConvection(212.5, 300, 300 + difference, ...slopes(212.5, 300), 0.13);
    expect(at(80) / at(10)).toBeCloseTo(2, 4);
    expect(at(-10)).toBe(at(10));
  });
  it('is of the order of what is used for accumulators: 60 to 350 W/(m2 K) at 200 bar, 10 K to 80 K (from memory)', () => {
    for (const difference of [10, 80]) {
      const coefficient = gas.naturalConvection(212.5, 300, 300 + difference, ...slopes(212.5, 300), 0.13);
      expect(coefficient).toBeGreaterThan(60);
      expect(coefficient).toBeLessThan(350);
    }
  });
  it('in the element: a hot gas cools fast at first, slowly near the end; heat goes as the difference to 4/3', () => {
    const bench = charged(
      { volume: 50 * litre, precharge: 120 * bar, gas: 2, heatTransfer: 2, gasSurface: 0.9 },
      { pressure: 200 * bar, temperature: 300 },
    );
    // fill quickly, then hold
    bench.set('pump.flowRequest', 200 * litresPerMinute);
    bench.run(2);
    bench.set('pump.flowRequest', 0);
    bench.run(0.05);
    const rate = () => {
      const difference = bench.get('accumulator.gasTemperature') - 300;
      return [difference, -bench.get('accumulator.gasHeatFlow') / difference ** (4 / 3)] as const;
    };
    const early = rate();
    const first = bench.get('accumulator.heatTime');
    bench.run(60);
    const late = rate();
    expect(early[0]).toBeGreaterThan(2 * late[0]);
    // the properties move with temperature
    expect(Math.abs(late[1] / early[1] - 1)).toBeLessThan(0.1);
    expect(bench.get('accumulator.heatTime')).toBeGreaterThan(1.2 * first);
  });
});

describe('a constant conductance', () => {
  it('50 L at 200 bar and 300 K, 0.9 m2 with 150 W/(m2 K): a time constant of 61.5 s', () => {
    // the gas that fills 50 L at 200 bar: empty of oil, m c_v/(h A)
    const bench = charged(
      { volume: 50 * litre, precharge: 200 * bar, gas: 2, heatTransfer: 1, gasConductance: 0.9 * 150 },
      { charge: 0.0001, temperature: 300 },
    );
    bench.run(0.01);
    expect(bench.get('accumulator.heatTime')).toBeCloseTo(61.5, 0);
  });
});

describe('the short form of the gas temperature, for comparison', () => {
  const given = { volume: 50 * litre, precharge: 50 * bar, gas: 1, gasTemperatureForm: 1, timeConstant: 30 };
  it("is Tw/(1 + (kappa - 1) tau V'/V), charging and discharging", () => {
    for (const flow of [35, -35]) {
      const bench = charged(given, { pressure: 100 * bar, temperature: 300 });
      bench.set('pump.flowRequest', flow * litresPerMinute);
      bench.run(0.3);
      const volume = bench.get('accumulator.gasVolume');
      const expected = 300 / (1 - (0.4 * 30 * bench.get('accumulator.inflow')) / volume);
      // a lag of 20 ms behind a temperature that moves by a few kelvins a second
      expect(Math.abs(bench.get('accumulator.gasTemperature') - expected)).toBeLessThan(1.5);
      // a kilowatt of work and 600 kW of heat with the oil
      expect(Math.abs(bench.energyResidual())).toBeLessThan(10);
    }
  });
  it('has no solution from V/((kappa - 1) tau): 250 L/min at 50 L and 30 s, 50 at 20 L and 60 s, 150 at 20 L and 20 s', () => {
    for (const [volume, timeConstant, flow] of [
      [50, 30, 250],
      [20, 60, 50],
      [20, 20, 150],
    ] as const) {
      const parameter = {
        volume: volume * litre,
        precharge: 1e6,
        prechargeTemperature: 300,
        gas: 1,
        leastGasShare: 1,
        timeConstant,
        heatTransfer: 0,
        ambientTemperature: 300,
      };
      expect(singularFlow(parameter) / litresPerMinute).toBeCloseTo(flow, 6);
    }
    const bench = charged(given, { charge: 0.001, temperature: 300 });
    bench.set('pump.flowRequest', 125 * litresPerMinute);
    bench.run(0.05);
    expect(bench.get('accumulator.shortFormMargin')).toBeCloseTo(0.5, 1);
  });
  it('is refused by check where the units can deliver that, with the flow; the truck has it in no accumulator', () => {
    const truck = readBench(new URL('../../configs/harbour-truck/bench.yaml', import.meta.url).pathname, catalogue);
    expect(shortFormFaults(truck)).toEqual([]);
    const changed = (parameters: Record<string, number>) => ({
      circuit: {
        ...truck.circuit,
        elements: truck.circuit.elements.map((one) =>
          one.name === 'highAccumulator'
            ? { ...one, parameters: { ...one.parameters, gasTemperatureForm: 1, ...parameters } }
            : one.name === 'chargePump'
              ? { ...one, parameters: { ...one.parameters, maximumSpeed: 300 } }
              : one,
        ),
      },
    });
    expect(shortFormFaults(changed({}))[0]).toMatch(
      /highAccumulator: the short form .* from \d+\.?\d* L\/min .* can deliver 418\.9 L\/min/,
    );
    expect(shortFormFaults(changed({ timeConstant: 0.5 }))).toEqual([]);
    const said = library.gasAccumulator.examine!({
      parameter: { gasTemperatureForm: 1, heatTransfer: 2, separator: 0, maximumAllowable: 0, precharge: 1e6 },
      fluid: {},
    });
    expect(said[0]!.what).toMatch(/natural convection/);
  });
});
