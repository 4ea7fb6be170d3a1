import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parseQuantity, parseRange, QuantityError, splitConditions } from '../../configs/quantity.js';
import { quantityNames, tradeUnits, unitTable } from '../../configs/unit-table.js';
import {
  conversion,
  fits,
  formatQuantity,
  fromSI,
  parseUnit,
  toSI,
  tradeUnit,
  UnitError,
} from '../../configs/units.js';

const si = (text: string, unit: string, more = {}) => parseQuantity(text, { unit, ...more }).value;
function complaint(text: string, unit: string, more = {}): string {
  try {
    parseQuantity(text, { unit, ...more });
  } catch (error) {
    if (error instanceof QuantityError) return error.message;
    throw error;
  }
  return `accepted ${text}`;
}

describe('unit expressions', () => {
  it.each([
    ['kg m2', 1, [2, 1, 0, 0, 0, 0, 0]],
    ['kg·m²', 1, [2, 1, 0, 0, 0, 0, 0]],
    ['kg*m^2', 1, [2, 1, 0, 0, 0, 0, 0]],
    ['N m', 1, [2, 1, -2, 0, 0, 0, 0]],
    ['N m/rad', 1, [2, 1, -2, 0, 0, 0, -1]],
    ['W/K', 1, [2, 1, -3, 0, -1, 0, 0]],
    ['J/(kg K)', 1, [2, 0, -2, 0, -1, 0, 0]],
    ['kJ/kg/K', 1000, [2, 0, -2, 0, -1, 0, 0]],
    ['mm2/s', 1e-6, [2, 0, -1, 0, 0, 0, 0]],
    ['m/s2', 1, [1, 0, -2, 0, 0, 0, 0]],
    ['m s⁻²', 1, [1, 0, -2, 0, 0, 0, 0]],
    ['1/s', 1, [0, 0, -1, 0, 0, 0, 0]],
    ['m3/(s Pa^0.5)', 1, [3.5, -0.5, 0, 0, 0, 0, 0]],
    ['L/(min bar)', 1e-3 / 60 / 1e5, [4, -1, 1, 0, 0, 0, 0]],
  ] as const)('%s', (text, factor, dimension) => {
    const unit = parseUnit(text);
    expect(unit.factor).toBeCloseTo(factor, 15);
    expect(unit.dimension).toEqual(dimension);
  });

  it.each([
    [
      'J/kg K',
      'the unit J/kg K can be read in two ways: put what stands under the stroke into parentheses, as in J/(kg K)',
    ],
    ['Nm', 'unknown unit Nm: did you mean N m?'],
    ['barg', 'unknown unit barg: did you mean bar(g)?'],
    ['litre', 'unknown unit litre: use an SI unit'],
    ['kg(g)', '(g) behind kg, which is no unit of pressure: write kg'],
    ['bar(g)/s', '(a) or (g) inside the unit bar(g)/s: leave it away: only a pressure of its own is absolute or gauge'],
    ['W/degC', 'temperature scale inside the unit W/degC: write K'],
    ['kg m2)', "the unit kg m2) cannot be read at ')': write a unit such as kg m2, J/(kg K) or mm2/s"],
    ['m99', 'exponent 99 in the unit m99: use one between -9 and 9'],
    ['', 'no unit: write a unit such as bar(g), L or N m'],
  ])('%s is refused', (text, message) => {
    expect(() => parseUnit(text)).toThrow(
      new UnitError(message.slice(0, message.indexOf(': ')), message.slice(message.indexOf(': ') + 2)),
    );
  });

  it('reads whatever it is given or throws UnitError', () => {
    const piece = fc.oneof(
      fc.constantFrom(...unitTable.keys(), ' ', '/', '(', ')', '^', '2', '-1', '(g)', '·', '°'),
      fc.string({ maxLength: 3 }),
    );
    fc.assert(
      fc.property(fc.array(piece, { maxLength: 8 }), (pieces) => {
        try {
          const unit = parseUnit(pieces.join(''));
          expect(Number.isFinite(unit.factor)).toBe(true);
        } catch (error) {
          expect(error).toBeInstanceOf(UnitError);
        }
      }),
      { numRuns: 2000 },
    );
  });
});

describe('quantities', () => {
  it.each([
    ['50 L', 'm3', 0.05],
    ['50L', 'm3', 0.05],
    ['150 bar(g)', 'Pa', 15101325],
    ['345 bar(a)', 'Pa', 34.5e6],
    ['16 MPa(a)', 'Pa', 16e6],
    ['110 cm3', 'm3', 110e-6],
    ['20 degC', 'K', 293.15],
    ['7.5 t', 'kg', 7500],
    ['60 km/h', 'm/s', 60 / 3.6],
    ['1450 rpm', 'rad/s', (1450 * Math.PI) / 30],
    ['5 ms', 's', 0.005],
    ['0.5 %', '1', 0.005],
    ['1.4', '1', 1.4],
    ['200 L/min', 'm3/s', 0.2 / 60],
    ['-1.5e2 N m', 'N m', -150],
    ['46 mm2/s', 'm2/s', 46e-6],
    ['8000 N m/rad', 'N m/rad', 8000],
    ['0.02 N m s/rad', 'N m s', 0.02],
    ['20 Hz', '1/s', 20],
  ])('%s in %s', (text, unit, value) => {
    expect(si(text, unit)).toBeCloseTo(value, 12);
  });

  it('takes plain units for differences', () => {
    expect(si('0.3 bar', 'Pa', { difference: true })).toBeCloseTo(3e4, 9);
    expect(si('5 K', 'K', { difference: true })).toBe(5);
  });

  it.each([
    [
      '350 bar',
      'Pa',
      {},
      'pressure without (a) or (g), 350 bar, write 350 bar(a) for absolute or 350 bar(g) for gauge pressure',
    ],
    [
      '0.3 bar(g)',
      'Pa',
      { difference: true },
      'a pressure difference is neither absolute nor gauge, 0.3 bar(g), write 0.3 bar',
    ],
    [
      '5 degC',
      'K',
      { difference: true },
      'a temperature difference is not a temperature on a scale, 5 degC, write it in K',
    ],
    ['50', 'm3', {}, 'no unit, 50, write a volume with its unit, for example 50 L or 110 cm3'],
    ['much', 'm3', {}, 'not a quantity, much, write a volume, for example 50 L or 110 cm3'],
    ['50 bar(g)', 'm3', {}, 'a pressure where a volume belongs, 50 bar(g), write it as in 50 L or 110 cm3'],
    ['50 Hz', 'rad/s', {}, 'a frequency or rate where an angular speed belongs, 50 Hz, write it as in 1450 rpm'],
    [
      '1450 rpm',
      '1/s',
      {},
      'an angular speed where a frequency or rate belongs, 1450 rpm, write it as in 20 Hz or 3 1/s',
    ],
    ['-300 degC', 'K', {}, 'below absolute zero, -300 degC, at least -273.15 degC, check the number'],
    [
      '-2 bar(g)',
      'Pa',
      {},
      'below vacuum, -2 bar(g), at least -1.01325 bar(g), check the number and whether it is gauge or absolute',
    ],
    ['500 L', 'm3', { least: 0.001, most: 0.1 }, 'too large, 500 L, at most 100 L, use a smaller value'],
    ['5 mL', 'm3', { least: 0.001, most: 0.1 }, 'too small, 5 mL, at least 1000 mL, use a larger value'],
    ['1e999 L', 'm3', {}, 'not a finite number, 1e999 L, at most 1.8e308, write a smaller number'],
    ['5 Nm', 'N m', {}, 'unknown unit Nm, 5 Nm, did you mean N m?'],
  ])('%s in %s is refused', (text, unit, more, message) => {
    expect(complaint(text, unit, more)).toBe(message);
  });

  it('a bound given in the bound’s own number is met', () => {
    fc.assert(
      fc.property(
        fc.constantFrom('L', 'cm3', 'gal', 'mL'),
        fc.double({ min: 1e-3, max: 1e3, noNaN: true }),
        (unit, number) => {
          const bound = toSI(number, parseUnit(unit));
          si(`${number} ${unit}`, 'm3', { least: bound, most: bound });
        },
      ),
    );
  });

  it('ranges and conditions', () => {
    expect(parseRange('0 .. 400 bar(g)', { unit: 'Pa' })).toMatchObject({ least: 101325, most: 40101325 });
    const mixed = parseRange('-40 degC .. 423.15 K', { unit: 'K' });
    expect(mixed.least).toBeCloseTo(233.15, 10);
    expect(mixed.most).toBe(423.15);
    expect(() => parseRange('5 .. 1 bar', { unit: 'Pa', difference: true })).toThrow('the range ends before it begins');
    expect(() => parseRange('5 bar', { unit: 'Pa', difference: true })).toThrow('not a range');
    expect(splitConditions('345 bar(g) at 200 L/min')).toEqual({ main: '345 bar(g)', conditions: ['200 L/min'] });
    expect(splitConditions('1 atm(a)')).toEqual({ main: '1 atm(a)', conditions: [] });
  });
});

describe('conversions both ways', () => {
  const names = [...unitTable.keys()];
  const finite = fc.double({ min: -1e9, max: 1e9, noNaN: true });

  it('SI -> unit -> SI', () => {
    fc.assert(
      fc.property(fc.constantFrom(...names), finite, (name, value) => {
        const unit = parseUnit(name);
        expect(Math.abs(toSI(fromSI(value, unit), unit) - value)).toBeLessThanOrEqual(
          4e-16 * (Math.abs(value) + Math.abs(unit.offset)) + 1e-300,
        );
      }),
    );
  });

  it('a formatted quantity reads as the same SI value', () => {
    const units: [string, string][] = [
      ['Pa', 'bar(g)'],
      ['Pa', 'psi(a)'],
      ['K', 'degC'],
      ['K', 'degF'],
      ['m3', 'L'],
      ['m3/s', 'L/min'],
      ['rad/s', 'rpm'],
      ['m/s', 'km/h'],
      ['J/(kg K)', 'kJ/(kg K)'],
      ['1', '%'],
    ];
    fc.assert(
      fc.property(fc.constantFrom(...units), fc.double({ min: 0, max: 1e8, noNaN: true }), ([unit, written], value) => {
        const again = si(formatQuantity(value, written, 17), unit);
        expect(Math.abs(again - value)).toBeLessThanOrEqual(1e-14 * (value + 2e5));
      }),
    );
  });

  it('a compound of powers multiplies out', () => {
    const atom = fc.tuple(
      fc.constantFrom('m', 'kg', 's', 'bar', 'L', 'rpm', 'kW', 'K'),
      fc.integer({ min: -3, max: 3 }).filter((n) => n !== 0),
    );
    fc.assert(
      fc.property(fc.array(atom, { minLength: 2, maxLength: 5 }), (atoms) => {
        const unit = parseUnit(atoms.map(([name, exponent]) => `${name}${exponent}`).join(' '));
        let factor = 1;
        for (const [name, exponent] of atoms) factor *= unitTable.get(name)!.factor ** exponent;
        expect(Math.abs(unit.factor / factor - 1)).toBeLessThan(1e-12);
      }),
    );
  });

  it('scale and offset for the message map', () => {
    expect(conversion('bar(g)', { unit: 'Pa' })).toEqual({ unitScale: 1e5, unitOffset: 101325 });
    expect(conversion('bar', { unit: 'Pa', difference: true })).toEqual({ unitScale: 1e5, unitOffset: 0 });
    expect(conversion('degC', { unit: 'K' })).toEqual({ unitScale: 1, unitOffset: 273.15 });
    expect(() => conversion('bar', { unit: 'Pa' })).toThrow('write bar(a) for absolute or bar(g) for gauge pressure');
    expect(() => conversion('rpm', { unit: 'm/s' })).toThrow(
      'rpm is an angular speed, wanted is a speed: use a unit as in 60 km/h',
    );
  });

  it('every trade unit and every example fits its SI unit', () => {
    for (const [unit, trade] of Object.entries(tradeUnits))
      expect(fits(parseUnit(trade), parseUnit(unit)), `${trade} for ${unit}`).toBe(true);
    for (const { unit, example } of quantityNames) for (const one of example.split(' or ')) si(one, unit);
    expect(tradeUnit('Pa', true)).toBe('bar');
  });
});
