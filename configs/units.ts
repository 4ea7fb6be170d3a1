import { nearest } from '../runtime/signals.js';
import { type Dimension, quantityNames, tradeUnits, unitTable } from './unit-table.js';

/**
 * Unit expressions: `kg m2`, `J/(kg K)`, `mm2/s`, `bar(g)`, `m3/(s Pa^0.5)`. Parsed to a factor, an offset and a
 * dimension, so that a quantity can be converted to SI and checked against the unit that a declaration names.
 */

/** The pressure that a gauge reads as zero, Pa: the standard atmosphere (NIST SP 811, appendix B.8). */
export const standardAtmosphere = 101325;

export interface Unit {
  readonly text: string;
  /** SI value = number * factor + offset. */
  readonly factor: number;
  readonly offset: number;
  readonly dimension: Dimension;
  readonly turns: boolean;
  /** What `(a)` or `(g)` behind a pressure unit says. */
  readonly reference: 'absolute' | 'gauge' | undefined;
  /** A temperature on a scale with its own zero: degC, degF. */
  readonly scaleOfTemperature: boolean;
}

/** A unit that cannot be read. `remedy` says what to write instead. */
export class UnitError extends Error {
  override readonly name = 'UnitError';
  constructor(
    readonly what: string,
    readonly remedy: string,
  ) {
    super(`${what}: ${remedy}`);
  }
}

const superscripts = '⁰¹²³⁴⁵⁶⁷⁸⁹';
const zero: Dimension = [0, 0, 0, 0, 0, 0, 0];
const atomPattern = /^([A-Za-zµμΩ°%‰]+|1(?![\d.]))(\([ag]\))?(?:\^?(-?\d+(?:\.\d+)?)|\^\((-?\d+(?:\.\d+)?)\))?/;

/** Parses a unit expression. A slash takes one factor; more than one goes into parentheses. Throws UnitError. */
export function parseUnit(text: string): Unit {
  const known = cache.get(text);
  if (known) return known;
  const unit = parse(text);
  if (cache.size < mostCached) cache.set(text, unit);
  return unit;
}

/** The units of declarations are asked for again and again. */
const cache = new Map<string, Unit>();
const mostCached = 1000;

function parse(text: string): Unit {
  const trimmed = text.trim();
  if (trimmed.length > 80) throw new UnitError('unit too long to be one', 'write a unit such as J/(kg K)');
  const plain = trimmed
    .replace(/⁻(?=[⁰¹²³⁴⁵⁶⁷⁸⁹])/g, '-')
    .replace(/[⁰¹²³⁴⁵⁶⁷⁸⁹]/g, (digit) => String(superscripts.indexOf(digit)))
    .replace(/[·×*]/g, ' ');
  const parser = new UnitParser(plain, trimmed);
  return parser.whole();
}

class UnitParser {
  private rest: string;
  private factor = 1;
  private dimension: number[] = [...zero];
  private turns = false;
  private atoms = 0;
  private offset = 0;
  private reference: Unit['reference'];
  private scale = false;
  private power = false;

  constructor(
    plain: string,
    private readonly text: string,
  ) {
    this.rest = plain.trim();
  }

  whole(): Unit {
    if (this.rest === '') throw new UnitError('no unit', 'write a unit such as bar(g), L or N m');
    this.product(1, false);
    while (this.rest.startsWith('/')) {
      this.rest = this.rest.slice(1).trimStart();
      if (this.rest.startsWith('(')) {
        this.rest = this.rest.slice(1).trimStart();
        this.product(-1, false);
        if (!this.rest.startsWith(')')) throw this.unreadable();
        this.rest = this.rest.slice(1).trimStart();
      } else {
        this.product(-1, true);
      }
    }
    if (this.rest !== '') throw this.unreadable();
    const alone = this.atoms === 1 && !this.power;
    if (this.reference !== undefined && !alone) {
      throw new UnitError(
        `(a) or (g) inside the unit ${this.text}`,
        'leave it away: only a pressure of its own is absolute or gauge',
      );
    }
    if (this.scale && !alone) throw new UnitError(`temperature scale inside the unit ${this.text}`, 'write K');
    return {
      text: this.text,
      factor: this.factor,
      offset: this.offset + (this.reference === 'gauge' ? standardAtmosphere : 0),
      dimension: this.dimension as unknown as Dimension,
      turns: this.turns,
      reference: this.reference,
      scaleOfTemperature: this.scale,
    };
  }

  private product(sign: 1 | -1, single: boolean): void {
    this.atom(sign);
    while (this.rest !== '' && !this.rest.startsWith('/') && !this.rest.startsWith(')')) {
      if (single) {
        throw new UnitError(
          `the unit ${this.text} can be read in two ways`,
          'put what stands under the stroke into parentheses, as in J/(kg K)',
        );
      }
      this.atom(sign);
    }
  }

  private atom(sign: 1 | -1): void {
    const match = atomPattern.exec(this.rest);
    if (!match) throw this.unreadable();
    const [whole, name, reference, plainExponent, bracedExponent] = match;
    const unit = unitTable.get(name!);
    if (!unit) throw unknownUnit(name!, this.text);
    const exponent = sign * Number(plainExponent ?? bracedExponent ?? 1);
    if (Math.abs(exponent) > 9)
      throw new UnitError(`exponent ${exponent} in the unit ${this.text}`, 'use one between -9 and 9');
    if (reference !== undefined) {
      if (!sameDimension(unit.dimension, pressureDimension)) {
        throw new UnitError(`${reference} behind ${name}, which is no unit of pressure`, `write ${name}`);
      }
      this.reference = reference === '(a)' ? 'absolute' : 'gauge';
    }
    if (unit.offset !== 0) {
      this.scale = true;
      this.offset = unit.offset;
    }
    if (exponent !== 1) this.power = true;
    if (name !== '1') this.atoms += 1;
    this.factor =
      exponent === 1
        ? this.factor * unit.factor
        : exponent === -1
          ? this.factor / unit.factor
          : this.factor * unit.factor ** exponent;
    for (let i = 0; i < 7; i += 1) this.dimension[i]! += exponent * unit.dimension[i]!;
    this.turns ||= unit.turns;
    this.rest = this.rest.slice(whole.length).trimStart();
  }

  private unreadable(): UnitError {
    return new UnitError(
      `the unit ${this.text} cannot be read at '${this.rest.slice(0, 12)}'`,
      'write a unit such as kg m2, J/(kg K) or mm2/s',
    );
  }
}

const pressureDimension: Dimension = [-1, 1, -2, 0, 0, 0, 0];
const temperatureDimension: Dimension = [0, 0, 0, 0, 1, 0, 0];

const habits: Readonly<Record<string, string>> = {
  barg: 'bar(g)',
  bara: 'bar(a)',
  psig: 'psi(g)',
  psia: 'psi(a)',
  Nm: 'N m',
  kNm: 'kN m',
  Nms: 'N m s',
  cc: 'cm3',
  ccm: 'cm3',
  lpm: 'L/min',
  kph: 'km/h',
  kmh: 'km/h',
  sec: 's',
  hr: 'h',
  grad: 'deg',
  U: 'rev',
  rps: 'rev/s',
  Ohm: 'ohm',
  Ω: 'ohm',
  kgm: 'kg m2',
  percent: '%',
};

function unknownUnit(name: string, text: string): UnitError {
  const better = habits[name] ?? nearest(name, unitTable.keys())[0];
  return new UnitError(
    name === text ? `unknown unit ${name}` : `unknown unit ${name} in ${text}`,
    better === undefined ? 'use an SI unit' : `did you mean ${better}?`,
  );
}

export function sameDimension(a: Dimension, b: Dimension): boolean {
  for (let i = 0; i < 7; i += 1) if (Math.abs(a[i]! - b[i]!) > 1e-9) return false;
  return true;
}

export function isPressure(unit: Unit): boolean {
  return sameDimension(unit.dimension, pressureDimension);
}

export function isTemperature(unit: Unit): boolean {
  return sameDimension(unit.dimension, temperatureDimension);
}

/**
 * Whether numbers in `given` can stand where `wanted` (an SI unit of a declaration) is asked for. Radians count as 1 and
 * may be written where the declaration leaves them out. Revolutions and degrees may not, and an angle that the
 * declaration names may not be left out: 50 Hz is no angular speed, and cm3 is not cm3/rad.
 */
export function fits(given: Unit, wanted: Unit): boolean {
  for (let i = 0; i < 6; i += 1) if (Math.abs(given.dimension[i]! - wanted.dimension[i]!) > 1e-9) return false;
  const angle = given.dimension[6]! - wanted.dimension[6]!;
  if (Math.abs(angle) < 1e-9) return true;
  return wanted.dimension[6] === 0 && !given.turns;
}

/** What to call a quantity in this unit, for messages: `a pressure`, or `a quantity in N s/m`. */
export function quantityName(unit: Unit): string {
  return known(unit)?.name ?? `a quantity in ${unit.text}`;
}

/** How people write such a quantity: `150 bar(g)`. */
export function quantityExample(unit: Unit, difference = false): string {
  if (difference && isPressure(unit)) return '5 bar';
  if (difference && isTemperature(unit)) return '5 K';
  return known(unit)?.example ?? `1 ${unit.text}`;
}

const namedUnits = quantityNames.map((entry) => ({ ...entry, parsed: parseUnit(entry.unit) }));
function known(unit: Unit) {
  return namedUnits.find((entry) => sameDimension(entry.parsed.dimension, unit.dimension));
}

/** The unit in which people read numbers kept in SI unit `unit`. */
export function tradeUnit(unit: string, difference = false): string {
  if (difference && unit === 'Pa') return 'bar';
  if (difference && unit === 'K') return 'K';
  return tradeUnits[unit] ?? unit;
}

/** SI value of a number in a unit. */
export function toSI(value: number, unit: Unit): number {
  return value * unit.factor + unit.offset;
}

/** The number in a unit of an SI value. */
export function fromSI(value: number, unit: Unit): number {
  return (value - unit.offset) / unit.factor;
}

/** SI value -> `150 bar(g)`; `digits` significant digits, trailing zeros dropped. */
export function formatQuantity(value: number, unitText: string, digits = 6): string {
  const number = formatNumber(fromSI(value, parseUnit(unitText)), digits);
  return unitText === '1' ? number : `${number} ${unitText}`;
}

export function formatNumber(value: number, digits = 6): string {
  if (!Number.isFinite(value)) return String(value);
  return String(Number(value.toPrecision(digits)));
}

/**
 * Factor and offset of a unit for numbers of a declared SI unit: SI = number * unitScale + unitOffset. For a difference,
 * the offset is zero. Throws UnitError when the unit does not fit or leaves open what its pressures refer to.
 */
export function conversion(
  unitText: string,
  declared: { readonly unit: string; readonly difference?: boolean | undefined },
): {
  readonly unitScale: number;
  readonly unitOffset: number;
} {
  const unit = parseUnit(unitText);
  const wanted = parseUnit(declared.unit);
  if (!fits(unit, wanted)) {
    throw new UnitError(
      `${unitText} is ${quantityName(unit)}, wanted is ${quantityName(wanted)}`,
      `use a unit as in ${quantityExample(wanted, declared.difference)}`,
    );
  }
  checkReference(unit, wanted, unitText, declared.difference ?? false);
  return { unitScale: unit.factor, unitOffset: unit.offset };
}

/** Throws UnitError when a pressure does not say what it refers to, or a difference refers to something. */
export function checkReference(unit: Unit, wanted: Unit, shown: string, difference: boolean): void {
  const bare = (suffix: string) => `${shown.replace(/\([ag]\)/, '')}${suffix}`;
  if (isPressure(wanted)) {
    if (!difference && unit.reference === undefined) {
      throw new UnitError(
        `pressure without (a) or (g)`,
        `write ${bare('(a)')} for absolute or ${bare('(g)')} for gauge pressure`,
      );
    }
    if (difference && unit.reference !== undefined) {
      throw new UnitError('a pressure difference is neither absolute nor gauge', `write ${bare('')}`);
    }
  }
  if (difference && unit.scaleOfTemperature) {
    throw new UnitError(`a temperature difference is not a temperature on a scale`, 'write it in K');
  }
}

/** The SI unit that a declaration would name for quantities in this unit: `Pa` for `bar(g)`, `kg m2` for `kg cm2`. */
export function siUnit(unit: Unit): string {
  const entry = known(unit);
  if (entry) return entry.unit;
  const bases = ['m', 'kg', 's', 'A', 'K', 'mol', 'rad'];
  const power = (base: string, exponent: number) =>
    exponent === 1 ? base : Number.isInteger(exponent) ? `${base}${exponent}` : `${base}^${exponent}`;
  const over = bases.flatMap((base, i) => (unit.dimension[i]! > 0 ? [power(base, unit.dimension[i]!)] : []));
  const under = bases.flatMap((base, i) => (unit.dimension[i]! < 0 ? [power(base, -unit.dimension[i]!)] : []));
  if (under.length === 0) return over.join(' ') || '1';
  return `${over.join(' ') || '1'}/${under.length === 1 ? under[0] : `(${under.join(' ')})`}`;
}
