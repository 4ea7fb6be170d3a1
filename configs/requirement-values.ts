import type { SignalInfo } from '../runtime/contract.js';
import type { Arithmetic, Expression } from '../runtime/judge/formula.js';
import { TextError } from './requirement-tokens.js';
import type { Dimension } from './unit-table.js';
import { quantityNames } from './unit-table.js';
import {
  isPressure,
  isTemperature,
  parseUnit,
  quantityExample,
  quantityName,
  sameDimension,
  toSI,
  type Unit,
} from './units.js';

/**
 * An expression with its unit. Pressures and temperatures come as points of a scale (`345 bar(g)`, `20 degC`) and as
 * differences (`5 bar`, `3 K`), which do not compare; `either` is a number in kelvin, which may be both.
 */
export interface Value {
  readonly expression: Expression;
  readonly unit: Unit;
  readonly scale: 'point' | 'difference' | 'either';
  /** A bare 0 compares with anything that has no scale. */
  readonly zero: boolean;
  readonly at: number;
}

export const one = parseUnit('1');

export function signalValue(info: SignalInfo, at: number): Value {
  const unit = parseUnit(info.unit);
  const scaled = isPressure(unit) || isTemperature(unit);
  return {
    expression: { is: 'signal', path: info.path },
    unit,
    scale: scaled && info.difference !== true ? 'point' : 'difference',
    zero: false,
    at,
  };
}

/** A number as written, with its sign. */
export function numberValue(number: number, unit: Unit | undefined, written: string, at: number): Value {
  if (!unit)
    return { expression: { is: 'number', value: number }, unit: one, scale: 'difference', zero: number === 0, at };
  const scale =
    unit.reference !== undefined || unit.scaleOfTemperature ? 'point' : isTemperature(unit) ? 'either' : 'difference';
  return {
    expression: { is: 'number', value: toSI(number, unit), written },
    unit: siUnit(unit, at),
    scale,
    zero: false,
    at,
  };
}

/** A unit's SI unit, by the name that people know. */
function siUnit(unit: Unit, at: number): Unit {
  return unitOf(unit.dimension, at);
}

/** Throws TextError for a dimension that no unit can be written for. */
function unitOf(dimension: Dimension, at: number): Unit {
  if (dimension.some((exponent) => Math.abs(exponent) > highestExponent))
    throw new TextError(
      at,
      `a quantity in ${unitName(dimension)}`,
      `exponents of units go to ${highestExponent}: write it with fewer products or integrals`,
    );
  return parseUnit(unitName(dimension));
}

/** Of a base unit; parseUnit takes no more. */
const highestExponent = 9;
const bases = ['kg', 'm', 's', 'A', 'K', 'mol', 'rad'] as const;
const basePlaces = [1, 0, 2, 3, 4, 5, 6] as const;

/** An SI unit of a dimension: `Pa/s`, `N m`, `kg m2/s3`. */
export function unitName(dimension: Dimension): string {
  const known = quantityNames.find((entry) => sameDimension(parseUnit(entry.unit).dimension, dimension));
  if (known) return known.unit;
  const above: string[] = [];
  const below: string[] = [];
  bases.forEach((base, i) => {
    const exponent = dimension[basePlaces[i]!]!;
    if (exponent !== 0)
      (exponent > 0 ? above : below).push(Math.abs(exponent) === 1 ? base : `${base}^${Math.abs(exponent)}`);
  });
  const top = above.length === 0 ? '1' : above.join(' ');
  if (below.length === 0) return top;
  return below.length === 1 ? `${top}/${below[0]}` : `${top}/(${below.join(' ')})`;
}

function combined(a: Unit, b: Unit, sign: 1 | -1, at: number): Unit {
  const dimension = a.dimension.map((exponent, i) => exponent + sign * b.dimension[i]!) as unknown as Dimension;
  return unitOf(dimension, at);
}

/** Units that may stand side by side; radians count as 1. */
export function alike(a: Unit, b: Unit): boolean {
  for (let i = 0; i < 6; i += 1) if (Math.abs(a.dimension[i]! - b.dimension[i]!) > 1e-9) return false;
  return true;
}

/** Throws TextError unless the two may be compared, added or subtracted as the same kind of quantity. */
export function checkAlike(left: Value, right: Value): void {
  if ((left.zero && right.scale !== 'point') || (right.zero && left.scale !== 'point')) return;
  const [given, wanted] =
    right.expression.is === 'number' ? [right, left] : left.expression.is === 'number' ? [left, right] : [right, left];
  const difference = wanted.scale === 'difference';
  if (!alike(left.unit, right.unit)) {
    throw new TextError(
      given.at,
      `${quantityName(given.unit)} where ${quantityName(wanted.unit)} belongs`,
      `write it as in ${quantityExample(wanted.unit, difference)}`,
    );
  }
  if (left.scale === right.scale || left.scale === 'either' || right.scale === 'either') return;
  if (isPressure(given.unit)) {
    if (wanted.scale === 'point')
      throw new TextError(
        given.at,
        'pressure without (a) or (g)',
        'write bar(a) for absolute or bar(g) for gauge pressure',
      );
    throw new TextError(given.at, 'a pressure difference is neither absolute nor gauge', 'leave (a) or (g) away');
  }
  throw new TextError(given.at, 'a temperature where a temperature difference belongs', 'write a difference in K');
}

/** Throws TextError where points of a scale are added, or subtracted from differences. */
export function arithmetic(is: Arithmetic, left: Value, right: Value, at: number): Value {
  const expression: Expression = { is, left: left.expression, right: right.expression };
  if (is === 'product' || is === 'quotient') {
    return {
      expression,
      unit: combined(left.unit, right.unit, is === 'product' ? 1 : -1, right.at),
      scale: 'difference',
      zero: false,
      at,
    };
  }
  const unit = left.zero ? right.unit : left.unit;
  if (is === 'lesser' || is === 'greater') {
    checkAlike(left, right);
    return { expression, unit, scale: left.scale === 'either' ? right.scale : left.scale, zero: false, at };
  }
  const loose = (value: Value): Value => ({ ...value, scale: 'either' });
  checkAlike(loose(left), loose(right));
  if (left.scale === 'point' && right.scale === 'point') {
    if (is === 'sum')
      throw new TextError(
        at,
        `two ${isPressure(unit) ? 'pressures' : 'temperatures'} cannot be added`,
        'add a difference, such as 5 bar',
      );
    return { expression, unit, scale: 'difference', zero: false, at };
  }
  if (right.scale === 'point' && is === 'difference') {
    throw new TextError(at, 'a point of a scale taken from a difference', 'turn the two round');
  }
  const scale =
    left.scale === 'point' || right.scale === 'point'
      ? 'point'
      : left.scale === 'either' && right.scale === 'either'
        ? 'either'
        : 'difference';
  return { expression, unit, scale, zero: false, at };
}

/** The same unit times (1) or by (-1) seconds. */
export function timed(unit: Unit, sign: 1 | -1, at: number): Unit {
  // What people read: an integral of power is energy, not torque.
  if (sign === 1 && unit.text === 'W') return parseUnit('J');
  return combined(unit, parseUnit('s'), sign, at);
}
