import {
  checkReference,
  fits,
  formatNumber,
  fromSI,
  isPressure,
  isTemperature,
  parseUnit,
  quantityExample,
  quantityName,
  toSI,
  type Unit,
  UnitError,
} from './units.js';

/** What a place in a file takes: an SI unit and bounds in SI. */
export interface Expected {
  readonly unit: string;
  readonly difference?: boolean | undefined;
  readonly least?: number | undefined;
  readonly most?: number | undefined;
}

/** A quantity that cannot be used. The parts become a Problem where the place in the file is known. */
export class QuantityError extends Error {
  override readonly name = 'QuantityError';
  constructor(
    readonly what: string,
    readonly value: string,
    readonly bound: string | undefined,
    readonly remedy: string,
  ) {
    super([what, value, bound, remedy].filter(Boolean).join(', '));
  }
}

export interface ParsedQuantity {
  /** SI. */
  readonly value: number;
  /** The unit it was written in. */
  readonly unit: Unit;
}
export interface ParsedRange {
  readonly least: number;
  readonly most: number;
  readonly unit: Unit;
}

const numberPattern = /^[-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][-+]?\d+)?/;

/** Parses `150 bar(g)` to SI and checks unit, reference and bounds. Throws QuantityError. */
export function parseQuantity(text: string, expected: Expected): ParsedQuantity {
  const { number, unitText } = split(text, expected);
  const unit = checkedUnit(text, unitText, expected);
  return { value: checkedValue(text, number, unit, expected), unit };
}

/** Parses `0 .. 400 bar(g)`; the lower number may carry a unit of its own. Throws QuantityError. */
export function parseRange(text: string, expected: Expected): ParsedRange {
  const parts = text.split('..');
  if (parts.length !== 2) {
    throw new QuantityError(
      'not a range',
      shown(text),
      undefined,
      `write two numbers with two dots between, for example 0 .. ${exampleOf(expected)}`,
    );
  }
  const upper = parseQuantity(parts[1]!, expected);
  const lowerText = parts[0]!.trim();
  const bare = numberPattern.exec(lowerText)?.[0] === lowerText && lowerText !== '';
  const lower = bare
    ? checkedValue(text, Number(lowerText), upper.unit, expected)
    : parseQuantity(lowerText, expected).value;
  if (!(lower < upper.value)) {
    throw new QuantityError('the range ends before it begins', shown(text), undefined, 'write the lower end first');
  }
  return { least: lower, most: upper.value, unit: upper.unit };
}

/** Splits `150 bar(g) at 20 degC` into `150 bar(g)` and the conditions `['20 degC']`. */
export function splitConditions(text: string): { readonly main: string; readonly conditions: readonly string[] } {
  const [main = '', ...conditions] = text.split(/\s+at\s+/);
  return { main, conditions };
}

/** The unit part of a quantity, without checks; undefined when it is none. */
export function unitOf(text: string): Unit | undefined {
  const match = numberPattern.exec(text.trim());
  try {
    return match ? parseUnit(text.trim().slice(match[0].length).trim() || '1') : undefined;
  } catch {
    return undefined;
  }
}

function split(text: string, expected: Expected): { readonly number: number; readonly unitText: string } {
  const trimmed = text.trim();
  const match = numberPattern.exec(trimmed);
  if (!match) {
    const wanted = parseUnit(expected.unit);
    throw new QuantityError(
      'not a quantity',
      shown(text),
      undefined,
      `write ${quantityName(wanted)}, for example ${exampleOf(expected)}`,
    );
  }
  return { number: Number(match[0]), unitText: trimmed.slice(match[0].length).trim() };
}

function checkedUnit(text: string, unitText: string, expected: Expected): Unit {
  const wanted = parseUnit(expected.unit);
  if (unitText === '') {
    if (fits(parseUnit('1'), wanted)) return parseUnit('1');
    throw new QuantityError(
      'no unit',
      shown(text),
      undefined,
      `write ${quantityName(wanted)} with its unit, for example ${exampleOf(expected)}`,
    );
  }
  try {
    const unit = parseUnit(unitText);
    if (!fits(unit, wanted)) {
      throw new QuantityError(
        `${quantityName(unit)} where ${quantityName(wanted)} belongs`,
        shown(text),
        undefined,
        `write it as in ${exampleOf(expected)}`,
      );
    }
    checkReference(unit, wanted, shown(text), expected.difference ?? false);
    return unit;
  } catch (error) {
    if (error instanceof UnitError) throw new QuantityError(error.what, shown(text), undefined, error.remedy);
    throw error;
  }
}

function checkedValue(text: string, number: number, unit: Unit, expected: Expected): number {
  const value = toSI(number, unit);
  const fail = (what: string, bound: string, remedy: string) => new QuantityError(what, shown(text), bound, remedy);
  if (!Number.isFinite(value)) throw fail('not a finite number', 'at most 1.8e308', 'write a smaller number');
  if (!(expected.difference ?? false)) {
    // A rounding error below zero is not worth a message; -1.01325 bar(g) is vacuum.
    if (isPressure(parseUnit(expected.unit)) && value < -1e-6) {
      throw fail('below vacuum', `at least ${inUnit(0, unit)}`, 'check the number and whether it is gauge or absolute');
    }
    if (isTemperature(parseUnit(expected.unit)) && value < -1e-6)
      throw fail('below absolute zero', `at least ${inUnit(0, unit)}`, 'check the number');
  }
  if (expected.least !== undefined && value < expected.least - slack(expected.least)) {
    throw fail('too small', `at least ${inUnit(expected.least, unit)}`, 'use a larger value');
  }
  if (expected.most !== undefined && value > expected.most + slack(expected.most)) {
    throw fail('too large', `at most ${inUnit(expected.most, unit)}`, 'use a smaller value');
  }
  return value;
}

/** A bound that a converted number meets to rounding counts as met. */
function slack(bound: number): number {
  return 1e-12 * Math.abs(bound);
}

function inUnit(value: number, unit: Unit): string {
  // Tiny remainders of the conversion would print as -2e-17.
  const number = fromSI(value, unit);
  const clean = Math.abs(number) < 1e-12 * Math.abs(unit.offset / unit.factor) ? 0 : number;
  return unit.text === '1' ? formatNumber(clean) : `${formatNumber(clean)} ${unit.text}`;
}

function exampleOf(expected: Expected): string {
  return quantityExample(parseUnit(expected.unit), expected.difference);
}

/** As it stands in the file, cut short. */
export function shown(text: string): string {
  const line = text.trim().replace(/\s+/g, ' ');
  return line === '' ? '(nothing)' : line.length > 60 ? `${line.slice(0, 57)}...` : line;
}
