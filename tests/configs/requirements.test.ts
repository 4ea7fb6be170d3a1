import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Problems } from '../../configs/problems.js';
import { parseFormula } from '../../configs/requirement-parser.js';
import { formulaText } from '../../configs/requirement-text.js';
import { lookup, parseRequirement, parseRequirements } from '../../configs/requirements.js';
import { BuildError, type SignalInfo } from '../../runtime/contract.js';
import { formulas } from '../runtime/judge/random.js';

const signals: SignalInfo[] = [
  { path: 'highLine.pressure', unit: 'Pa', about: '', group: 'reading' },
  { path: 'lowLine.pressure', unit: 'Pa', about: '', group: 'reading' },
  { path: 'filter.drop', unit: 'Pa', about: '', group: 'reading', difference: true },
  { path: 'highLine.pressureRate', unit: 'Pa/s', about: '', group: 'reading' },
  { path: 'oil.temperature', unit: 'K', about: '', group: 'reading' },
  { path: 'vehicle.speed', unit: 'm/s', about: '', group: 'state' },
  { path: 'driver.brakePedal', unit: '1', about: '', group: 'instrument' },
  { path: 'engine.speed', unit: 'rad/s', about: '', group: 'state' },
  { path: 'engine.torque', unit: 'N m', about: '', group: 'reading' },
  { path: 'engine.fuelFlow', unit: 'kg/s', about: '', group: 'reading' },
  { path: 'relief.power', unit: 'W', about: '', group: 'reading' },
  { path: 'relief.passing', unit: '1', about: '', group: 'reading' },
];
const step = 0.001;

function read(text: string) {
  return parseRequirement('R', text, signals, step).formula;
}
function wrong(text: string): string {
  try {
    read(text);
  } catch (error) {
    if (error instanceof BuildError) return error.message;
    throw error;
  }
  throw new Error(`nothing wrong with: ${text}`);
}

describe('requirements as text', () => {
  it('turns quantities into SI and times into ticks', () => {
    expect(read('always highLine.pressure < 345 bar(g)')).toEqual({
      is: 'always',
      from: 0,
      to: null,
      of: {
        is: 'compare',
        left: { is: 'signal', path: 'highLine.pressure' },
        relation: '<',
        right: { is: 'number', value: 345 * 1e5 + 101325, written: '345 bar(g)' },
        unit: 'Pa',
      },
    });
    const stop = read(
      'whenever driver.brakePedal > 50 % then vehicle.speed falls below 1 km/h within 8 s and stays for 2 s',
    );
    expect(stop).toMatchObject({
      is: 'always',
      of: {
        is: 'given',
        condition: { is: 'compare', relation: '>', right: { value: 0.5 }, unit: '1' },
        consequence: {
          is: 'eventually',
          from: 0,
          to: 8000,
          of: { is: 'always', from: 0, to: 2000, of: { is: 'compare', relation: '<', unit: 'm/s' } },
        },
      },
    });
  });

  it('reads each form', () => {
    const forms: [string, object][] = [
      ['never highLine.pressure > 380 bar(a)', { is: 'always', of: { is: 'not' } }],
      ['eventually vehicle.speed > 30 km/h', { is: 'eventually', from: 0, to: null }],
      ['always from 2 s to 5 s vehicle.speed >= 0', { is: 'always', from: 2000, to: 5000 }],
      ['always from 2 s vehicle.speed >= 0', { is: 'always', from: 2000, to: null }],
      ['eventually within 20 s vehicle.speed > 5 m/s', { is: 'eventually', from: 0, to: 20000 }],
      ['vehicle.speed < 1 km/h until driver.brakePedal < 0.1 happens', { is: 'until', from: 0, to: null }],
      ['vehicle.speed < 1 km/h until within 4 s (driver.brakePedal < 0.1 happens)', { is: 'until', to: 4000 }],
      [
        'at the end integral(engine.fuelFlow) < 50 g',
        { is: 'end', of: { left: { is: 'integral', over: null }, unit: 'kg' } },
      ],
      ['at the start oil.temperature < 60 degC', { is: 'start', of: { right: { value: expect.closeTo(333.15, 9) } } }],
      [
        'whenever driver.brakePedal rises above 0.5 then engine.torque < 20 N m within 300 ms',
        { of: { condition: { is: 'begins' } } },
      ],
      [
        'whenever driver.brakePedal > 0.1 ends then engine.torque > 0 N m within 1 s',
        { of: { condition: { is: 'ends' } } },
      ],
      [
        'always abs(rate(highLine.pressure, 10 ms)) < 4000 bar/s',
        { of: { left: { is: 'size', of: { is: 'rate', over: 10 } }, unit: 'Pa/s' } },
      ],
      ['at the end peak(highLine.pressure) > 300 bar(g)', { of: { left: { is: 'peak', over: null }, unit: 'Pa' } }],
      ['always mean(filter.drop, 1 s) < 3 bar', { of: { left: { is: 'mean', over: 1000 } } }],
      ['at the end count(relief.passing is on) <= 3', { of: { left: { is: 'count' }, unit: '1' } }],
      ['at the end duration(relief.passing is on) < 2 s', { of: { left: { is: 'duration' }, unit: 's' } }],
      ['at the end integral(relief.power) < 20 kJ', { of: { unit: 'J' } }],
      ['always engine.torque * engine.speed < 90 kW', { of: { left: { is: 'product' }, relation: '<' } }],
      ['always highLine.pressure - lowLine.pressure > 5 bar', { of: { left: { is: 'difference' } } }],
      ['always highLine.pressure is between 100 bar(g) and 345 bar(g)', { of: { is: 'and' } }],
      [
        'whenever engine.torque > 10 N m begins then engine.speed settles to 1200 rpm +- 20 rpm within 2 s and stays for 1 s',
        { of: { consequence: { to: 2000 } } },
      ],
      ['always (vehicle.speed < 5 km/h for 2 s) implies vehicle.speed < 8 km/h', { of: { is: 'implies' } }],
      [
        'always highLine.pressure < 345 bar(g) per 10 bar and vehicle.speed < 90 km/h per 5 km/h',
        { of: { is: 'and', left: { unit: '1', per: 1e6 } } },
      ],
      ['always oil.temperature - 20 degC < 60 K', { of: { left: { is: 'difference' } } }],
      ['always max(engine.torque, 3 N m) < 700 N m', { of: { left: { is: 'greater' } } }],
      ['always -20 degC < oil.temperature', { of: { left: { is: 'number', value: expect.closeTo(253.15, 9) } } }],
    ];
    for (const [text, shape] of forms) expect(read(text), text).toMatchObject(shape);
  });

  it('says what was expected, and where', () => {
    const cases: [string, RegExp][] = [
      ['always highLine.pressure < 345 bar', /pressure without \(a\) or \(g\)/],
      ['always filter.drop < 3 bar(g)', /neither absolute nor gauge/],
      ['always highLine.presure < 345 bar(g)', /no such signal, highLine.presure, did you mean highLine.pressure/],
      ['always highLine.pressure < 345 km/h', /a speed where a pressure belongs/],
      ['always highLine.pressure < 345 bars(g)', /unknown unit bars/],
      ['highLine.pressure < 345 bar(g)', /does not say when/],
      ['always eventually vehicle.speed > 1 m/s', /without an end inside another time operator/],
      ['always vehicle.speed', /a value where a condition belongs, compare it/],
      ['always vehicle.speed < ', /ends too early, expected a signal, a number, a function/],
      ['always (vehicle.speed < 1 m/s', /expected '\)' to close the bracket/],
      ['whenever vehicle.speed > 1 m/s vehicle.speed < 2 m/s', /expected 'then'/],
      ['always vehicle.speed = 3 m/s', /never exactly equal/],
      ['always vehicle.speed < 1 m/s < 2 m/s', /two comparisons in a row/],
      ['always vehicle.speed < 1 m/s within 0.5 ms', /not a multiple of the step/],
      ['always vehicle.speed < 1 m/s within 3 bar', /not a time/],
      ['always vehicle.speed > 1 m/s until', /ends too early/],
      ['always vehicle.speed > 1 m/s and highLine.pressure > 3 bar(g)', /margins in different units/],
      ['always highLine.pressure + lowLine.pressure > 3 bar(g)', /pressures cannot be added/],
      ['always foo(vehicle.speed) > 1', /no such function, foo/],
      ['always vehicle.speed rises 3 m/s', /expected 'above'/],
      ['always engine.speed settles to 1200 rpm within 2 s', /expected '\+-'/],
      ['always vehicle.speed # 3', /a character that has no meaning here, #/],
      ['', /nothing said/],
      ['always from 5 s to 2 s vehicle.speed > 1 m/s', /too short a time/],
      ['at the end (vehicle.speed > 1 m/s within 2 s)', /looks ahead/],
      ['always count(vehicle.speed > 1 m/s within 2 s) > 1', /looks ahead/],
      [`always ${'('.repeat(500)}`, /nested too deep/],
      [`always ${'-'.repeat(500)}1 < 2`, /nested too deep/],
      [`always ${'not '.repeat(500)}1 < 2`, /nested too deep/],
      ['always (vehicle.speed < 1 m/s) + 2 > 3', /a condition where a value belongs/],
      ['always vehicle.speed > 1 m/s; drop', /no meaning here, ;/],
    ];
    for (const [text, message] of cases) expect(wrong(text), text).toMatch(message);
  });

  it('prints what reads back to the same formula', () => {
    const plain: SignalInfo[] = ['a.x', 'b.y', 'c.z'].map((path) => ({
      path,
      unit: '1',
      about: '',
      group: 'state' as const,
    }));
    // Without scales: random ones have no text of their own. A -0 has none either.
    const arbitrary = formulas(6).filter((formula) => !JSON.stringify(formula).includes('"per"'));
    let printed = 0;
    fc.assert(
      fc.property(arbitrary, fc.constantFrom(0.001, 0.0005, 0.01), (formula, tick) => {
        // Units of rates and integrals are not those of the random formula.
        if (/"(rate|integral|duration)"/.test(JSON.stringify(formula))) return;
        printed += 1;
        const text = formulaText(formula, tick);
        expect(parseRequirement('R', text, plain, tick).formula, text).toEqual(formula);
      }),
      { numRuns: 2000, seed: 11 },
    );
    expect(printed).toBeGreaterThan(500);
  });

  it('prints units as they were written', () => {
    for (const text of [
      'whenever driver.brakePedal > 50 % then vehicle.speed < 1 km/h within 8 s and stays for 2 s',
      'never highLine.pressure > 380 bar(g)',
      'at the end integral(engine.fuelFlow) < 50 g',
      'always abs(rate(highLine.pressure, 10 ms)) < 4000 bar/s',
      'always highLine.pressure < 345 bar(g) per 10 bar and vehicle.speed < 90 km/h per 5 km/h',
      'always highLine.pressure - (lowLine.pressure - 2 bar) > -5 bar',
    ]) {
      const formula = read(text);
      expect(formulaText(formula, step)).toBe(text);
      expect(read(formulaText(formula, step))).toEqual(formula);
    }
  });
});

describe('requirement files', () => {
  const good = `requirements:
  HP-1: always highLine.pressure < 345 bar(g)
  BR-2:
    text: The truck stops when the brake is pressed.
    holds: >-
      whenever driver.brakePedal > 0.5
      then vehicle.speed falls below 1 km/h within 8 s
    severity: critical
    source: braking specification 3.1
    link: https://example.org/3.1
    openAtEnd: fail
`;
  it('reads ids, texts, severity, source', () => {
    const found = parseRequirements(good, 'bench.yaml', signals, step);
    expect(found.map((one) => [one.id, one.severity, one.openAtEnd])).toEqual([
      ['HP-1', 'major', undefined],
      ['BR-2', 'critical', 'fail'],
    ]);
    expect(found[0]!.text).toBe('always highLine.pressure < 345 bar(g)');
    expect(found[1]).toMatchObject({
      text: 'The truck stops when the brake is pressed.',
      source: 'braking specification 3.1',
      link: 'https://example.org/3.1',
    });
  });

  it('points at the place in the file, in plain, quoted and folded values', () => {
    const text = `requirements:
  A: always highLine.presure < 345 bar(g)
  B: 'always lowLine.presure < 345 bar(g)'
  C:
    holds: >-
      always vehicle.speed < 3 m/s
      and vehicle.spee < 3 m/s
    severity: huge
    colour: red
  D: "always vehicle.speed < 3 \\u0062ar"
`;
    let message = '';
    try {
      parseRequirements(text, 'f.yaml', signals, step);
    } catch (error) {
      message = (error as Error).message;
    }
    expect(message).toMatch(/f.yaml:2:13 requirements.A: no such signal/);
    expect(message).toMatch(/f.yaml:3:14 requirements.B: no such signal/);
    expect(message).toMatch(/f.yaml:7:11 requirements.C.holds: no such signal, vehicle.spee/);
    expect(message).toMatch(/f.yaml:8:\d+ requirements.C.severity: unknown choice/);
    expect(message).toMatch(/f.yaml:9:\d+ requirements.C.colour: unknown key/);
    expect(message).toMatch(/f.yaml:10:\d+ requirements.D: a pressure where a speed belongs/);
  });

  it('throws nothing but BuildError, whatever the text', () => {
    const words = fc.constantFrom(
      ...'always never eventually whenever then if and or not implies until within from to for at the start end is on off between rises above falls below settles begins ends stays per ( ) < <= > >= + - * / , +- = 1 2.5 3e400 8 s 5 bar(g) km/h % degC count( duration( rate( mean( peak( abs( min( vehicle.speed highLine.pressure driver.brakePedal relief.passing oil.temperature a.b ä 1/0 m^99 (g) "'.split(
        ' ',
      ),
    );
    const texts = fc.oneof(
      fc.array(words, { maxLength: 24 }).map((list) => list.join(' ')),
      fc.string({ maxLength: 60 }),
      fc.string({ unit: 'grapheme', maxLength: 40 }),
    );
    fc.assert(
      fc.property(texts, (text) => {
        try {
          read(text);
        } catch (error) {
          expect(error, text).toBeInstanceOf(BuildError);
        }
        const problems = new Problems();
        const formula = parseFormula(text, { signals: lookup(signals), step }, problems, 'R');
        expect(formula === undefined).toBe(problems.count > 0);
      }),
      { numRuns: 8000, seed: 3 },
    );
    fc.assert(
      fc.property(texts, fc.string({ maxLength: 40 }), (text, more) => {
        try {
          parseRequirements(`requirements:\n  A: ${text}\n${more}`, 'f.yaml', signals, step);
        } catch (error) {
          expect(error, text).toBeInstanceOf(BuildError);
        }
      }),
      { numRuns: 1500, seed: 5 },
    );
  });
});
