import type { Position } from '../runtime/contract.js';
import { nearest } from '../runtime/signals.js';
import type { Problems } from './problems.js';
import {
  type Expected,
  type ParsedQuantity,
  type ParsedRange,
  parseQuantity,
  parseRange,
  QuantityError,
  shown,
} from './quantity.js';
import type { Entry, List, Mapping, Scalar, Tree } from './source.js';
import { parseUnit, quantityExample } from './units.js';

/** `required`: absence is a problem. Otherwise absence gives undefined and the caller has a default. */
export interface Asked {
  readonly required?: boolean;
}

/** An item of a list of texts, with its place. */
export interface Placed {
  readonly text: string;
  readonly where: Position;
}

/**
 * One mapping of a file while it is read: each method takes one key, checks it, and marks it as known; `finish` reports
 * the keys that nobody asked for. Methods add to the problems and return undefined, they do not throw.
 */
export class Section {
  private readonly asked = new Set<string>();

  constructor(
    readonly tree: Mapping,
    readonly path: string,
    readonly problems: Problems,
  ) {}

  get where(): Position {
    return this.tree.where;
  }

  inner(key: string): string {
    if (key === '') return this.path;
    return this.path === '' ? key : `${this.path}.${key}`;
  }

  has(key: string): boolean {
    return this.tree.entries.has(key);
  }

  keys(): string[] {
    return [...this.tree.entries.keys()];
  }

  /** Position of a key, or of the mapping when the key is absent. */
  whereIs(key: string): Position {
    return this.tree.entries.get(key)?.where ?? this.where;
  }

  entry(key: string): Entry | undefined {
    this.asked.add(key);
    return this.tree.entries.get(key);
  }

  fail(
    key: string,
    what: string,
    remedy: string,
    more: { value?: string; bound?: string } = {},
    where = this.whereOfValue(key),
  ): undefined {
    this.problems.add(where, this.inner(key), what, remedy, more);
    return undefined;
  }

  private whereOfValue(key: string): Position {
    return this.tree.entries.get(key)?.value.where ?? this.where;
  }

  private scalar(key: string, asked: Asked, example: string): Scalar | undefined {
    const entry = this.entry(key);
    if (!entry || (entry.value.kind === 'scalar' && entry.value.value === null)) {
      if (entry) return this.fail(key, 'no value', `write ${key}: ${example}`);
      if (asked.required) this.fail(key, 'missing', `add ${key}: ${example}`);
      return undefined;
    }
    if (entry.value.kind !== 'scalar')
      return this.fail(key, `a ${entry.value.kind} where one value belongs`, `write ${key}: ${example}`);
    return entry.value;
  }

  text(key: string, asked: Asked = {}, example = 'some text'): string | undefined {
    return this.scalar(key, asked, example)?.text;
  }

  /** The text of a key if it has one; neither marks the key nor complains. */
  peek(key: string): string | undefined {
    const value = this.tree.entries.get(key)?.value;
    return value?.kind === 'scalar' && value.value !== null ? value.text : undefined;
  }

  /** A value with its place, whatever its type. */
  placed(key: string, asked: Asked = {}, example = 'some text'): Placed | undefined {
    const value = this.scalar(key, asked, example);
    return value && { text: value.text, where: value.where };
  }

  /** `on`, `off`, `yes`, `no`, `true`, `false`. */
  flag(key: string, asked: Asked = {}): boolean | undefined {
    const value = this.scalar(key, asked, 'on');
    if (!value) return undefined;
    const word = value.text.toLowerCase();
    if (['on', 'yes', 'true'].includes(word)) return true;
    if (['off', 'no', 'false'].includes(word)) return false;
    return this.fail(key, 'neither on nor off', 'write on or off', { value: shown(value.text) });
  }

  choice<T extends string>(key: string, choices: readonly T[], asked: Asked = {}): T | undefined {
    const value = this.scalar(key, asked, choices[0] ?? '');
    if (!value) return undefined;
    if ((choices as readonly string[]).includes(value.text)) return value.text as T;
    return this.fail(key, 'unknown choice', suggestion(value.text, choices), { value: shown(value.text) });
  }

  quantity(key: string, expected: Expected, asked: Asked = {}): number | undefined {
    return this.parsed(key, expected, asked)?.value;
  }

  parsed(key: string, expected: Expected, asked: Asked = {}): ParsedQuantity | undefined {
    const value = this.scalar(key, asked, quantityExample(parseUnit(expected.unit), expected.difference));
    return value && this.quantityIn(value, expected, key);
  }

  range(key: string, expected: Expected, asked: Asked = {}): ParsedRange | undefined {
    const value = this.scalar(key, asked, `0 .. ${quantityExample(parseUnit(expected.unit), expected.difference)}`);
    return value && this.attempt(value, this.inner(key), () => parseRange(value.text, expected));
  }

  whole(
    key: string,
    bounds: { readonly least?: number; readonly most?: number },
    asked: Asked = {},
  ): number | undefined {
    const value = this.scalar(key, asked, String(bounds.least ?? 1));
    if (!value) return undefined;
    const number = /^(?:\d+|0x[0-9a-fA-F]+)$/.test(value.text) ? Number(value.text) : Number.NaN;
    if (!Number.isSafeInteger(number))
      return this.fail(key, 'not a whole number', 'write a whole number, not negative', { value: shown(value.text) });
    if (bounds.least !== undefined && number < bounds.least)
      return this.fail(key, 'too small', 'use a larger number', {
        value: value.text,
        bound: `at least ${bounds.least}`,
      });
    if (bounds.most !== undefined && number > bounds.most)
      return this.fail(key, 'too large', 'use a smaller number', {
        value: value.text,
        bound: `at most ${bounds.most}`,
      });
    return number;
  }

  /** A quantity in a value that was fetched already; `key` names it in messages. */
  quantityIn(value: Tree, expected: Expected, key: string, text?: string): ParsedQuantity | undefined {
    if (value.kind !== 'scalar') {
      this.problems.add(
        value.where,
        this.inner(key),
        `a ${value.kind} where one value belongs`,
        `write it as in ${quantityExample(parseUnit(expected.unit), expected.difference)}`,
      );
      return undefined;
    }
    return this.attempt(value, this.inner(key), () => parseQuantity(text ?? value.text, expected));
  }

  attempt<T>(value: Tree, path: string, parse: () => T): T | undefined {
    try {
      return parse();
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      this.problems.add(value.where, path, error.what, error.remedy, {
        value: error.value,
        ...(error.bound === undefined ? {} : { bound: error.bound }),
      });
      return undefined;
    }
  }

  section(key: string, asked: Asked = {}): Section | undefined {
    const entry = this.entry(key);
    if (!entry) {
      if (asked.required) this.fail(key, 'missing', `add ${key}: and its keys below it`);
      return undefined;
    }
    return this.sectionIn(entry.value, key, entry.where);
  }

  /** Sections by name below a key, in the order of the file. */
  sections(key: string, asked: Asked = {}): [string, Section][] {
    const all = this.section(key, asked);
    if (!all) return [];
    const found: [string, Section][] = [];
    for (const name of all.keys()) {
      const section = all.section(name);
      if (section) found.push([name, section]);
    }
    return found;
  }

  sectionIn(value: Tree, key: string, where: Position = value.where): Section | undefined {
    if (value.kind === 'mapping') return new Section({ ...value, where }, this.inner(key), this.problems);
    if (value.kind === 'scalar' && value.value === null)
      return new Section({ kind: 'mapping', entries: new Map(), where }, this.inner(key), this.problems);
    this.problems.add(
      value.where,
      this.inner(key),
      `a ${value.kind === 'list' ? 'list' : 'single value'} where keys belong`,
      'write `key: value` pairs below it',
    );
    return undefined;
  }

  list(key: string, asked: Asked = {}): List | undefined {
    const entry = this.entry(key);
    if (!entry) {
      if (asked.required) this.fail(key, 'missing', `add ${key}: and a list below it`);
      return undefined;
    }
    if (entry.value.kind === 'list') return entry.value;
    if (entry.value.kind === 'scalar' && entry.value.value === null)
      return { kind: 'list', items: [], where: entry.where };
    return this.fail(key, 'not a list', 'write it as [a, b] or with - before each item');
  }

  /** One text or a list of texts. */
  texts(key: string): Placed[] | undefined {
    const entry = this.entry(key);
    if (!entry) return undefined;
    const items = entry.value.kind === 'list' ? entry.value.items : [entry.value];
    const found: Placed[] = [];
    for (const item of items) {
      if (item.kind === 'scalar' && item.value !== null) found.push({ text: item.text, where: item.where });
      else this.problems.add(item.where, this.inner(key), 'not a text', 'write one text per item');
    }
    return found;
  }

  /** Marks a key as known without reading it. */
  skip(key: string): void {
    this.asked.add(key);
  }

  /** Reports keys that nobody asked for, with the nearest of the known ones. */
  finish(known: Iterable<string> = []): void {
    const all = new Set([...this.asked, ...known]);
    for (const [key, entry] of this.tree.entries) {
      if (!this.asked.has(key)) this.problems.add(entry.where, this.inner(key), 'unknown key', suggestion(key, all));
    }
  }
}

/** `did you mean volume?`, or the list when nothing is near and the list is short. */
export function suggestion(word: string, known: Iterable<string>): string {
  const all = [...known];
  const near = nearest(word, all, 2);
  if (near.length > 0) return `did you mean ${near.join(' or ')}?`;
  if (all.length === 0) return 'remove it';
  if (all.length <= 14) return `use one of ${all.join(', ')}`;
  return `use one of the ${all.length} known ones, such as ${all.slice(0, 6).join(', ')}`;
}
