import { describe, expect, it } from 'vitest';
import { parseQuantity } from '../../configs/quantity.js';

// NIST Special Publication 811 (2008), appendix B.8: factors as printed, seven significant digits.
const printed: readonly [string, string, number][] = [
  ['1 psi(a)', 'Pa', 6.894757e3],
  ['1 atm(a)', 'Pa', 1.01325e5],
  ['1 mmHg(a)', 'Pa', 1.333224e2],
  ['1 inHg(a)', 'Pa', 3.386389e3],
  ['1 bar(a)', 'Pa', 1e5],
  ['1 lbf', 'N', 4.448222],
  ['1 kgf', 'N', 9.80665],
  ['1 in', 'm', 2.54e-2],
  ['1 ft', 'm', 3.048e-1],
  ['1 mi', 'm', 1.609344e3],
  ['1 mph', 'm/s', 4.4704e-1],
  ['1 km/h', 'm/s', 2.777778e-1],
  ['1 gal', 'm3', 3.785412e-3],
  ['1 gal/min', 'm3/s', 6.30902e-5],
  ['1 in3', 'm3', 1.638706e-5],
  ['1 ft3', 'm3', 2.831685e-2],
  ['1 ft3/min', 'm3/s', 4.719474e-4],
  ['1 L/min', 'm3/s', 1.666667e-5],
  ['1 lb', 'kg', 4.535924e-1],
  ['1 oz', 'kg', 2.834952e-2],
  ['1 lb/ft3', 'kg/m3', 1.601846e1],
  ['1 lb ft2', 'kg m2', 4.214011e-2],
  ['1 Btu', 'N m', 1.055056e3],
  ['1 Btu/h', 'W', 2.930711e-1],
  ['1 cal', 'N m', 4.1868],
  ['1 kWh', 'N m', 3.6e6],
  ['1 ft lbf', 'N m', 1.355818],
  ['1 lbf ft/s', 'W', 1.355818],
  ['1 hp', 'W', 7.456999e2],
  ['1 PS', 'W', 7.354988e2],
  ['1 rpm', 'rad/s', 1.047198e-1],
  ['1 rev', 'rad', 6.283185],
  ['1 deg', 'rad', 1.745329e-2],
  ['1 cSt', 'm2/s', 1e-6],
  ['1 cP', 'Pa s', 1e-3],
  ['1 Btu/(lb degR)', 'J/(kg K)', 4.1868e3],
  ['32 degF', 'K', 273.15],
  ['212 degF', 'K', 373.15],
  ['-40 degC', 'K', 233.15],
];

describe('conversion factors of NIST SP 811, appendix B', () => {
  it.each(printed)('%s is in %s %d', (text, unit, value) => {
    const got = parseQuantity(text, { unit }).value;
    expect(Math.abs(got - value)).toBeLessThanOrEqual(5.1e-7 * Math.abs(value));
  });
});

describe('gauge pressure', () => {
  // Gauge pressure is counted from the standard atmosphere, 101 325 Pa (NIST SP 811, appendix B.8: standard atmosphere).
  it('0 bar(g) is one atmosphere', () => {
    expect(parseQuantity('0 bar(g)', { unit: 'Pa' }).value).toBe(101325);
    expect(parseQuantity('-1.01325 bar(g)', { unit: 'Pa' }).value).toBeCloseTo(0, 6);
  });
});
