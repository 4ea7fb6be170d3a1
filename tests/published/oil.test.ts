import { describe, expect, it } from 'vitest';
import { waltherLine } from '../../plants/fluids.js';
import * as gas from '../../plants/laws/gas.js';
import * as law from '../../plants/laws/oil.js';
import { bar, oil } from '../support/oil.js';

describe('mineral oil', () => {
  const modulus = 1.6e9;
  const u = law.liquidNumerator(modulus, 0);
  const v = law.liquidDenominator(modulus, 0);

  it.each([
    [1.01325, 10.07, 14.06],
    [5, 212.3, 191.5],
    [10, 607, 493.1],
    [20, 1135.4, 949.9],
    [50, 1501.7, 1400.7],
    [100, 1574.2, 1533.6],
    [200, 1593.5, 1579.2],
  ])(
    'effective bulk modulus with 1 %% air at %s bar: %s and %s MPa (form reviewed by Gholizadeh, Burton and Schoenau 2011)',
    (pressure, isothermal, adiabatic) => {
      expect(Math.abs(law.effectiveBulkModulus(pressure * bar, 1, 0.01, u, v) / 1e6 / isothermal - 1)).toBeLessThan(
        5e-4,
      );
      expect(Math.abs(law.effectiveBulkModulus(pressure * bar, 1.4, 0.01, u, v) / 1e6 / adiabatic - 1)).toBeLessThan(
        5e-4,
      );
      // and it is the slope of the pressure law that the plant runs on
      const p = pressure * bar;
      const slope = law.oilVolumeSlope(p, 0.01, u, v);
      expect(-law.oilVolumeRatio(p, 0.01, u, v) / slope / 1e6 / isothermal).toBeCloseTo(1, 3);
    },
  );

  it('density 875 kg/m3 at 15 degC, 7e-4 1/K: 853.56 at 50 degC, 869.7 at 300 bar (linear expansion, constant modulus)', () => {
    const fluid = oil({ density: 875, thermalExpansion: 7e-4, at: 323.15, bulkModulus: 1.6e9, air: 1e-4 });
    const density = (p: number) =>
      law.oilDensity(p, fluid.referenceDensity!, fluid.freeAir!, fluid.numerator!, fluid.denominator!);
    expect(density(law.STANDARD_PRESSURE) / (1 - 1e-4)).toBeCloseTo(853.56, 2);
    expect(density(300 * bar)).toBeCloseTo(869.7, 1);
  });

  it('inverts: pressure from volume, over ten decades of pressure and with all amounts of air', () => {
    for (const air of [1e-4, 0.005, 0.1]) {
      for (const rise of [0, 1, 10]) {
        const nu = law.liquidNumerator(1.5e9, rise);
        const de = law.liquidDenominator(1.5e9, rise);
        for (let p = 1; p < 1.2e8; p *= 3) {
          const back = law.oilPressure(law.oilVolumeRatio(p, air, nu, de), air, nu, de);
          // an absolute floor: the rounding of the ratio itself times the modulus
          expect(Math.abs(back - p)).toBeLessThan(1e-9 * p + 1e-5);
          expect(law.oilVolumeSlope(p, air, nu, de)).toBeLessThan(0);
        }
      }
    }
  });

  it('has the potential whose slope is 1/rho', () => {
    const fluid = oil({ bulkModulusSlope: 10 });
    const { referenceDensity, freeAir, numerator, denominator } = fluid as Record<string, number>;
    for (const p of [2e4, 1e5, 5e6, 3.5e7]) {
      const h = (at: number) => law.oilPotential(at, referenceDensity!, freeAir!, numerator!, denominator!);
      const slope = (h(p * 1.0001) - h(p * 0.9999)) / (2e-4 * p);
      expect(slope * law.oilDensity(p, referenceDensity!, freeAir!, numerator!, denominator!)).toBeCloseTo(1, 6);
    }
  });

  it('is the same law inside the accumulator', () => {
    for (const p of [1e3, 1e5, 3e7]) {
      expect(gas.storedOilRatio(p, 0.005, u, v)).toBe(law.oilVolumeRatio(p, 0.005, u, v));
      expect(gas.storedOilSlope(p, 0.005, u, v)).toBe(law.oilVolumeSlope(p, 0.005, u, v));
    }
  });

  it.each([
    [
      46,
      6.8,
      9.41799,
      3.68444,
      [
        [0, 577.3],
        [20, 133.8],
        [50, 29.97],
        [60, 20.62],
        [80, 11.1],
      ],
    ],
    [
      32,
      5.4,
      9.53082,
      3.74658,
      [
        [0, 336],
        [20, 86.28],
        [60, 15.19],
        [80, 8.53],
      ],
    ],
  ] as const)('Walther (ASTM D341) through %s and %s mm2/s: A %s, B %s', (at40, at100, a, b, points) => {
    const [intercept, slope] = waltherLine(at40, at100);
    expect(intercept).toBeCloseTo(a, 5);
    expect(slope).toBeCloseTo(b, 5);
    for (const [celsius, viscosity] of points) {
      expect(Math.abs((law.kinematicViscosity(celsius + 273.15, intercept, slope) * 1e6) / viscosity - 1)).toBeLessThan(
        6e-4,
      );
    }
  });

  it.each([
    [0, 28.8, 35.2],
    [1, 41.4, 50.6],
    [2, 61.2, 74.8],
  ])('grade %s at 40 degC lies within ISO 3448: %s to %s mm2/s', (grade, least, most) => {
    const fluid = oil({ grade });
    const viscosity = 1e6 * law.kinematicViscosity(313.15, fluid.viscosityIntercept!, fluid.viscositySlope!);
    expect(viscosity).toBeGreaterThan(least);
    expect(viscosity).toBeLessThan(most);
  });
});
