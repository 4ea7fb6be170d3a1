import { longestMessage } from '../bridge/j1939/transport.js';
import type { CanLayout, MapSignal, WireType } from '../bridge/message-map.js';
import { isPresentValue } from '../bridge/value-program.js';
import type { Expression } from '../runtime/judge/formula.js';
import type { Drivers } from './instruments.js';
import { parseQuantity, parseRange, QuantityError, shown } from './quantity.js';
import { parseValue } from './requirement-parser.js';
import { lookup, positionIn } from './requirements.js';
import { type Placed, type Section, suggestion } from './section.js';
import type { SignalList } from './signal-list.js';
import type { Scalar } from './source.js';
import { conversion, fromSI, parseUnit, siUnit, UnitError } from './units.js';

const wireTypes: readonly WireType[] = ['u8', 'i8', 'u16', 'i16', 'u32', 'i32', 'f32', 'f64'];

/** Reads one signal of a message: what it carries or drives, unit, range, wire type, substitute and layout on CAN. */
export function readSignal(
  name: string,
  section: Section,
  message: Section,
  messageName: string,
  direction: 'sent' | 'received',
  can: boolean,
  step: number,
  signals: SignalList,
  drivers: Drivers,
): MapSignal | undefined {
  const problemsBefore = section.problems.count;
  const sent = direction === 'sent';
  const said = section.placed(sent ? 'from' : 'to', { required: sent }, 'element.signal');
  const isPath = said !== undefined && /^[A-Za-z][A-Za-z0-9]*(\.[A-Za-z][A-Za-z0-9]*)*$/.test(said.text);
  const names = readNames(section);
  const made = sent && said && (!isPath || (names && Object.hasOwn(names, said.text))) ? said : undefined;
  const info = made
    ? undefined
    : said && signals.resolve(section, sent ? 'from' : 'to', said, sent ? {} : { groups: ['command'] });
  if (said && info && !sent) drivers.take(section, 'to', info.path, message.path, said.where);
  const value = made && readExpression(section, made.text, names, step, signals);
  if (made && !value) return undefined;
  const unit =
    section.text(
      'unit',
      { required: names === undefined && (info ?? value) !== undefined && (info?.unit ?? value?.unit) !== '1' },
      'bar(a)',
    ) ?? '1';
  // Received and only shown: kept in the SI unit of the dimension that it is sent in.
  const declared = info
    ? { unit: info.unit, difference: info.difference }
    : value?.unit === undefined
      ? undefined
      : { unit: value.unit, difference: value.difference };
  const scaling = readScaling(section, unit, declared);
  const type = section.choice('type', wireTypes) ?? (names ? 'u8' : 'f32');
  const scale = section.quantity('scale', { unit: '1' }) ?? 1;
  const offset = section.quantity('offset', { unit: '1' }) ?? 0;
  section.skip('range');
  const range = scaling && readRange(section, unit, names);
  const substitute = sent ? 0 : scaling && readSubstitute(section, unit, names);
  const trouble = can ? readTrouble(section) : undefined;
  const layout = can && trouble === undefined ? readCanLayout(section, scale, offset) : undefined;
  if (!can) section.skip('can');
  const about = section.text('about') ?? info?.about ?? name;
  const expression =
    value && scaling && (value.unit === undefined ? inOwnUnit(value.expression, scaling) : value.expression);
  section.finish([sent ? 'from' : 'to', 'substitute']);
  if (sent && info) signals.add({ path: `${messageName}.${name}`, group: 'sent', unit: info.unit, about });
  if (made && scaling && expression)
    signals.add({ path: `${messageName}.${name}`, group: 'sent', unit: siUnit(parseUnit(unit)), about });
  if (section.problems.count > problemsBefore || !scaling || !range || substitute === undefined) return undefined;
  if (made && !expression) return undefined;
  return {
    name,
    path: info?.path ?? '',
    ...(made && expression ? { expression, said: made.text, siUnit: siUnit(parseUnit(unit)) } : {}),
    about,
    unit,
    unitScale: scaling.unitScale,
    unitOffset: scaling.unitOffset,
    type,
    scale,
    offset,
    least: range.least,
    most: range.most,
    substitute,
    ...(names === undefined ? {} : { names }),
    ...(layout === undefined ? {} : { can: layout }),
    ...trouble,
  };
}

/** What an absent control unit says. `unit`: SI unit; undefined for a bare number, which is in the unit of the signal. */
interface Made {
  readonly expression: Expression;
  readonly unit: string | undefined;
  readonly difference: boolean;
}

/** A number, a name of the enumeration, or an expression over signals, such as `0.5 * highLine.pressure + 2 bar`. */
function readExpression(
  section: Section,
  text: string,
  names: Readonly<Record<string, number>> | undefined,
  step: number,
  signals: SignalList,
): Made | undefined {
  const named = names !== undefined && Object.hasOwn(names, text) ? names[text] : undefined;
  const bare = named ?? (/^[-+]?[\d.]+(?:[eE][-+]?\d+)?$/.test(text) ? Number(text) : undefined);
  if (bare !== undefined && Number.isFinite(bare))
    return { expression: { is: 'number', value: bare }, unit: undefined, difference: false };
  if (signals.unread.size > 0) return undefined;
  const tree = section.tree.entries.get('from')!.value as Scalar;
  const value = parseValue(
    text,
    { signals: lookup(signals.all), step },
    section.problems,
    section.inner('from'),
    (at) => positionIn(tree, at),
  );
  if (!value) return undefined;
  if (!isPresentValue(value.expression))
    return section.fail('from', 'more than what is true now', 'use + - * /, abs, min and max', { value: shown(text) });
  return { expression: value.expression, unit: siUnit(value.unit), difference: value.scale === 'difference' };
}

/** A number in the unit of its signal as SI. */
function inOwnUnit(expression: Expression, scaling: { unitScale: number; unitOffset: number }): Expression {
  return expression.is === 'number'
    ? { is: 'number', value: expression.value * scaling.unitScale + scaling.unitOffset }
    : expression;
}

function readScaling(
  section: Section,
  unit: string,
  declared: { unit: string; difference?: boolean | undefined } | undefined,
) {
  try {
    const parsed = parseUnit(unit);
    return conversion(unit, declared ?? { unit: siUnit(parsed), difference: false });
  } catch (error) {
    if (!(error instanceof UnitError)) throw error;
    section.fail('unit', error.what, error.remedy, { value: shown(unit) });
    return undefined;
  }
}

/** `0 .. 450` in the unit of the signal, or with a unit of its own that is converted to it. */
function readRange(
  section: Section,
  unit: string,
  names: Readonly<Record<string, number>> | undefined,
): { least: number; most: number } | undefined {
  const said = section.placed('range', { required: names === undefined }, '0 .. 100');
  if (!said) {
    if (!names || section.has('range')) return undefined;
    const values = Object.values(names);
    return { least: Math.min(...values), most: Math.max(...values) };
  }
  const entry = section.entry('range')!;
  return section.attempt(entry.value, section.inner('range'), () => {
    const bare = /^\s*[-+.\deE]+\s*\.\.\s*[-+.\deE]+\s*$/.test(said.text);
    if (bare) return parseRange(said.text, { unit: '1' });
    const range = parseRange(said.text, expectedFor(unit));
    return { least: inWireUnit(range.least, unit), most: inWireUnit(range.most, unit) };
  });
}

function readSubstitute(
  section: Section,
  unit: string,
  names: Readonly<Record<string, number>> | undefined,
): number | undefined {
  const said = section.placed('substitute', { required: true }, '0');
  if (!said) return undefined;
  if (names && Object.hasOwn(names, said.text)) return names[said.text];
  const entry = section.entry('substitute')!;
  return section.attempt(entry.value, section.inner('substitute'), () => {
    if (/^[-+]?[\d.]+(?:[eE][-+]?\d+)?$/.test(said.text)) return parseQuantity(said.text, { unit: '1' }).value;
    if (names)
      throw new QuantityError(
        'neither a number nor one of the names',
        shown(said.text),
        undefined,
        suggestion(said.text, Object.keys(names)),
      );
    return inWireUnit(parseQuantity(said.text, expectedFor(unit)).value, unit);
  });
}

function expectedFor(unit: string): { unit: string; difference: boolean } {
  const parsed = parseUnit(unit);
  const si = siUnit(parsed);
  return { unit: si, difference: si === 'Pa' && parsed.reference === undefined };
}

/** The number in the unit of the signal; 14 digits, so that 400 bar(g) is 400 and not 399.99999999999994. */
function inWireUnit(value: number, unit: string): number {
  return Number(fromSI(value, parseUnit(unit)).toPrecision(14));
}

function readNames(section: Section): Record<string, number> | undefined {
  const inner = section.section('names');
  if (!inner) return undefined;
  const names: Record<string, number> = {};
  for (const key of inner.keys()) {
    if (!/^[A-Za-z][A-Za-z0-9]*$/.test(key)) {
      inner.skip(key);
      inner.fail(
        key,
        'not a name',
        'use letters and digits, a letter first',
        { value: shown(key) },
        inner.whereIs(key),
      );
      continue;
    }
    const value = inner.quantity(key, { unit: '1' });
    if (value === undefined) continue;
    if (!Number.isInteger(value))
      inner.fail(key, 'not a whole number', 'give each name a whole number', { value: String(value) });
    names[key] = value;
  }
  if (inner.keys().length === 0) {
    section.fail('names', 'no names in it', 'write names: { off: 0, on: 1 }');
    return undefined;
  }
  return names;
}

const lamps = ['malfunction', 'stop', 'warning', 'protect'] as const;

/** `trouble: { spn: 110, fmi: 0 }` or `lamp: warning` in place of `can:`, in a message of trouble codes. */
function readTrouble(section: Section): Pick<MapSignal, 'trouble' | 'lamp'> | undefined {
  if (section.has('lamp')) {
    const lamp = section.choice('lamp', lamps);
    return lamp === undefined ? {} : { lamp };
  }
  const inner = section.section('trouble');
  if (!inner) return undefined;
  const spn = inner.whole('spn', { least: 1, most: 0x7ffff }, { required: true });
  const fmi = inner.whole('fmi', { least: 0, most: 31 }, { required: true });
  inner.finish();
  return spn === undefined || fmi === undefined ? {} : { trouble: { spn, fmi } };
}

function readCanLayout(section: Section, scale: number, offset: number): CanLayout | undefined {
  const inner = section.section('can', { required: true });
  if (!inner) return undefined;
  const startBit = inner.whole('start', { least: 0, most: 8 * longestMessage - 1 }, { required: true });
  const length = inner.whole('length', { least: 1, most: 64 }, { required: true });
  const byteOrder = inner.choice('order', ['little', 'big'] as const) ?? 'little';
  const signed = inner.flag('signed') ?? false;
  const float = inner.flag('float') ?? false;
  if (float && length !== undefined && length !== 32 && length !== 64)
    inner.fail('length', 'a float of this length', 'use 32 or 64', { value: String(length) });
  const ownScale = inner.quantity('scale', { unit: '1' }) ?? scale;
  const ownOffset = inner.quantity('offset', { unit: '1' }) ?? offset;
  const selector = inner.flag('selector');
  const selectedBy = readSelectedBy(inner);
  inner.finish();
  if (startBit === undefined || length === undefined) return undefined;
  return {
    startBit,
    length,
    byteOrder,
    signed,
    float,
    scale: ownScale,
    offset: ownOffset,
    ...(selector === undefined ? {} : { selector }),
    ...(selectedBy === undefined ? {} : { selectedBy }),
  };
}

/** `when: { mode: [0, 2 .. 4] }`: present when the selector `mode` is 0, 2, 3 or 4. */
function readSelectedBy(section: Section): CanLayout['selectedBy'] {
  const inner = section.section('when');
  if (!inner) return undefined;
  const [signal, ...others] = inner.keys();
  if (signal === undefined || others.length > 0)
    return section.fail('when', 'not one selector', 'write when: { selector: [0, 2 .. 4] }');
  const values: (readonly [number, number])[] = [];
  for (const { text, where } of inner.texts(signal) ?? ([] as Placed[])) {
    const match = /^(\d{1,10})(?:\s*\.\.\s*(\d{1,10}))?$/.exec(text.trim());
    if (match) values.push([Number(match[1]), Number(match[2] ?? match[1])]);
    else
      inner.fail(
        signal,
        'not a value of a selector',
        'write a whole number or a range such as 2 .. 4',
        { value: shown(text) },
        where,
      );
  }
  return { signal, values };
}
