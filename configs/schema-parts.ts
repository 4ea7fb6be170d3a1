import type { Expected } from './quantity.js';
import { unitTable } from './unit-table.js';
import { fits, parseUnit, quantityExample, quantityName, sameDimension } from './units.js';

/** A JSON schema as plain data. */
export type Schema = { readonly [key: string]: unknown };

export const text: Schema = { type: 'string' };
export const texts: Schema = { anyOf: [text, { type: 'array', items: text }] };
export const flag: Schema = { enum: ['on', 'off', 'yes', 'no', true, false] };

export function mapping(
  properties: Readonly<Record<string, Schema>>,
  required: readonly string[] = [],
  description?: string,
): Schema {
  return {
    type: 'object',
    properties,
    ...(required.length === 0 ? {} : { required: [...required] }),
    additionalProperties: false,
    ...(description === undefined ? {} : { description }),
  };
}

/** A mapping whose keys are names. */
export function named(value: Schema, description: string): Schema {
  return {
    type: 'object',
    propertyNames: { pattern: '^[a-z][A-Za-z0-9]*$' },
    additionalProperties: value,
    description,
  };
}

const number = '[-+]?([0-9]+(\\.[0-9]*)?|\\.[0-9]+)([eE][-+]?[0-9]+)?';

/** A quantity as text; a plain number where the unit is 1. Pressures say absolute or gauge unless they are differences. */
export function quantitySchema(expected: Expected): Schema {
  if (expected.unit === 'input') return { type: ['string', 'number'] };
  const unit = parseUnit(expected.unit);
  const condition = '(\\s+at\\s+.+)?';
  const neither = expected.difference ? '(?!.*\\((a|g)\\))' : '';
  const schema: Schema = {
    type: 'string',
    pattern: `^\\s*${number}\\s*${neither}${unitPattern(expected)}${condition}\\s*$`,
    description: quantityName(unit),
    examples: [quantityExample(unit, expected.difference).split(' or ')[0]],
  };
  return fits(parseUnit('1'), unit) ? { anyOf: [{ type: 'number' }, schema] } : schema;
}

export function rangeSchema(expected: Expected): Schema {
  if (expected.unit === 'input') return text;
  const unit = unitPattern(expected);
  return { type: 'string', pattern: `^\\s*${number}\\s*(${unit})?\\s*\\.\\.\\s*${number}\\s*${unit}\\s*$` };
}

/** The named units of the dimension where these are all that can be said, else anything that looks like a unit. */
function unitPattern(expected: Expected): string {
  const wanted = parseUnit(expected.unit);
  const difference = expected.difference ?? false;
  const names = [...unitTable]
    .filter(([, unit]) => sameDimension(unit.dimension, wanted.dimension) && !(difference && unit.offset !== 0))
    .map(([name]) => name.replace(/[.*+?^${}()|[\]\\]/g, '\\$&'));
  if (expected.unit === 'Pa' && !difference) return `(${names.join('|')})\\((a|g)\\)`;
  if (expected.unit === '1') return `(${names.join('|')})?`;
  const compound = '[A-Za-z0-9µμ°%⁰¹²³⁴⁵⁶⁷⁸⁹⁻·×*/()^. -]*[A-Za-z0-9µμ°%⁰¹²³⁴⁵⁶⁷⁸⁹)]';
  // 1 m2/m is a length too: a compound is always possible, and what it is only reading finds out.
  return names.length > 0 ? `((${names.join('|')})|[A-Za-z1µμ°]${compound})` : `[A-Za-z1µμ°]${compound}`;
}
