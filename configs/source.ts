import { dirname, join, normalize, relative } from 'node:path';
import {
  isAlias,
  isMap,
  isScalar,
  isSeq,
  LineCounter,
  type Pair,
  parseDocument,
  type YAMLMap,
  type Node as YamlNode,
} from 'yaml';
import type { Position } from '../runtime/contract.js';
import { diskFiles, type Files, inside, largestFile } from './files.js';
import type { Problems } from './problems.js';

/**
 * A YAML file as a tree with positions. Plain YAML 1.2: no anchors, aliases, merge keys, tags or second documents, so
 * that what a line says is all that it says and a small file cannot grow into a large one.
 */
export type Tree = Scalar | List | Mapping;
export interface Scalar {
  readonly kind: 'scalar';
  readonly value: string | number | boolean | null;
  /** As written, without quotes. */
  readonly text: string;
  /** As it stands in the file, with quotes and folds, from `where` on; absent where the file says nothing. */
  readonly raw?: string;
  readonly where: Position;
}
export interface List {
  readonly kind: 'list';
  readonly items: readonly Tree[];
  readonly where: Position;
}
export interface Mapping {
  readonly kind: 'mapping';
  readonly entries: Map<string, Entry>;
  readonly where: Position;
}
export interface Entry {
  readonly where: Position;
  readonly value: Tree;
}

/** A file that was read, for the record: the name is relative to the folder of the first file. */
export interface SourceText {
  readonly name: string;
  readonly text: string;
}

export interface Source {
  /** The top mapping with all includes merged in and what a base says besides; undefined when the file could not be read at all. */
  readonly root: Mapping | undefined;
  readonly texts: readonly SourceText[];
}

const deepest = 24;
const mostFiles = 64;

/** Reads a file and what it includes. Adds to `problems`, throws nothing. */
export function readSource(path: string, problems: Problems, files: Files = diskFiles): Source {
  const texts: SourceText[] = [];
  const first = normalize(path);
  const root = dirname(first);
  const seen = new Set<string>();

  const load = (file: string, from: Position | undefined): Mapping | undefined => {
    const fail = (what: string, remedy: string, value?: string) =>
      problems.add(
        from ?? { file, line: 1, column: 1 },
        from ? 'include' : 'file',
        what,
        remedy,
        value === undefined ? {} : { value },
      );
    if (seen.has(file)) {
      fail('file included twice', 'include each file once', relative(root, file));
      return undefined;
    }
    if (seen.size >= mostFiles) {
      fail('too many files', `use at most ${mostFiles}`);
      return undefined;
    }
    seen.add(file);
    problems.files.push(file);
    let text: string | undefined;
    try {
      text = files.read(file);
    } catch (error) {
      fail(`cannot be read (${(error as Error).message})`, 'check the file and its permissions', file);
      return undefined;
    }
    if (text === undefined) {
      fail('no such file', 'check the name', file);
      return undefined;
    }
    texts.push({ name: relative(root, file), text });
    const tree = parseText(text, file, problems);
    if (!tree) return undefined;
    const includes = tree.entries.get('include');
    const base = tree.entries.get('base');
    if (!includes && !base) return tree;
    const merged = new Map(tree.entries);
    merged.delete('include');
    merged.delete('base');
    for (const name of includes ? includedFiles(includes.value, file, 'include') : []) {
      const part = load(name.file, name.where);
      if (part) mergeInto(merged, part);
    }
    // A variant: all of the base but the top keys that this file says itself.
    for (const name of base ? includedFiles(base.value, file, 'base') : []) {
      const part = load(name.file, name.where);
      for (const [key, entry] of part?.entries ?? []) if (!merged.has(key)) merged.set(key, entry);
    }
    return { kind: 'mapping', entries: merged, where: tree.where };
  };

  const includedFiles = (value: Tree, file: string, key: 'include' | 'base'): { file: string; where: Position }[] => {
    const named = value.kind === 'list' ? value.items : [value];
    const found: { file: string; where: Position }[] = [];
    for (const item of named) {
      if (item.kind !== 'scalar' || typeof item.value !== 'string') {
        problems.add(item.where, key, 'not a file name', 'write the name of a file or a folder beside this one');
        continue;
      }
      const target = inside(root, file, item.value);
      if (target === undefined) {
        problems.add(item.where, key, 'outside the folder of the bench', 'move the file into the folder', {
          value: item.value,
        });
        continue;
      }
      const names = files.list(target);
      if (names === undefined) {
        found.push({ file: target, where: item.where });
        continue;
      }
      for (const name of names) {
        const inFolder = normalize(join(target, name));
        if (/\.ya?ml$/.test(name) && inFolder !== first) found.push({ file: inFolder, where: item.where });
      }
    }
    return found;
  };

  const mergeInto = (all: Map<string, Entry>, part: Mapping) => {
    for (const [key, entry] of part.entries) {
      const known = all.get(key);
      if (!known) {
        all.set(key, entry);
      } else if (known.value.kind === 'mapping' && entry.value.kind === 'mapping') {
        const both = new Map(known.value.entries);
        for (const [name, inner] of entry.value.entries) {
          const twin = both.get(name);
          if (twin) addTwice(problems, `${key}.${name}`, inner.where, twin.where);
          else both.set(name, inner);
        }
        all.set(key, { where: known.where, value: { kind: 'mapping', entries: both, where: known.value.where } });
      } else if (known.value.kind === 'list' && entry.value.kind === 'list') {
        all.set(key, {
          where: known.where,
          value: { ...known.value, items: [...known.value.items, ...entry.value.items] },
        });
      } else {
        addTwice(problems, key, entry.where, known.where);
      }
    }
  };

  return { root: load(first, undefined), texts };
}

function addTwice(problems: Problems, path: string, where: Position, firstAt: Position): void {
  const place = firstAt.file === where.file ? `line ${firstAt.line}` : `${firstAt.file}:${firstAt.line}`;
  problems.add(where, path, 'said twice', `keep one of them (the other is at ${place})`);
}

/** Parses one YAML text whose top is a mapping. Adds to `problems`, throws nothing. */
export function parseText(text: string, file: string, problems: Problems): Mapping | undefined {
  const start = { file, line: 1, column: 1 };
  if (text.length > largestFile) {
    problems.add(start, 'file', 'file too large', `keep it below ${largestFile} characters`);
    return undefined;
  }
  const lines = new LineCounter();
  const at = (offset: number | undefined): Position => {
    const place = lines.linePos(offset ?? 0);
    return { file, line: Math.max(1, place.line), column: Math.max(1, place.col) };
  };
  let document: ReturnType<typeof parseDocument>;
  try {
    document = parseDocument(text, {
      version: '1.2',
      uniqueKeys: false,
      lineCounter: lines,
      prettyErrors: false,
      stringKeys: false,
      merge: false,
    });
  } catch (error) {
    // The parser recurses: a text nested thousands deep exhausts its stack.
    const deep = error instanceof RangeError;
    problems.add(
      start,
      'file',
      deep ? 'nested too deep' : `cannot be read as YAML (${(error as Error).message})`,
      `nest at most ${deepest} levels`,
    );
    return undefined;
  }
  // What follows the first syntax error is mostly its echo.
  for (const error of document.errors.length > 0 ? document.errors.slice(0, 1) : document.warnings) {
    problems.add(
      at(error.pos[0]),
      'yaml',
      yamlMessage(error.code, error.message),
      yamlRemedy(error.code, error.message),
    );
  }
  if (document.errors.length > 0) return undefined;
  const contents = document.contents;
  if (contents === null || (isScalar(contents) && contents.value === null)) {
    problems.add(start, 'file', 'nothing in it', 'write a mapping of keys and values');
    return undefined;
  }
  if (!isMap(contents)) {
    problems.add(start, 'file', 'not a mapping', 'write `key: value` lines');
    return undefined;
  }
  return new Converter(file, at, problems, text).mapping(contents, '', 0);
}

function yamlMessage(code: string, message: string): string {
  if (/call stack/i.test(message)) return 'nested too deep';
  if (code === 'MULTIPLE_DOCS') return 'more than one document in the file';
  if (code === 'MULTILINE_IMPLICIT_KEY') return 'a line that is no `key: value`';
  const line = message.split('\n')[0]!.replace(/\.$/, '');
  return line.charAt(0).toLowerCase() + line.slice(1);
}

function yamlRemedy(code: string, message: string): string {
  if (/call stack/i.test(message)) return `nest at most ${deepest} levels`;
  if (code === 'MULTIPLE_DOCS') return 'put it into a file of its own and include that';
  if (code === 'MULTILINE_IMPLICIT_KEY') return 'check the colon and the space behind it';
  if (code === 'TAB_AS_INDENT') return 'indent with spaces';
  if (code === 'TAG_RESOLVE_FAILED') return 'leave the tag away';
  return 'check indentation, colons, quotes and brackets near here';
}

class Converter {
  constructor(
    private readonly file: string,
    private readonly at: (offset: number | undefined) => Position,
    private readonly problems: Problems,
    private readonly source: string,
  ) {}

  mapping(node: YAMLMap, path: string, depth: number): Mapping {
    const entries = new Map<string, Entry>();
    this.refuseExtras(node, path);
    for (const pair of node.items as Pair<YamlNode, YamlNode | null>[]) {
      const where = this.where(pair.key);
      const key =
        isScalar(pair.key) && pair.key.value !== null && typeof pair.key.value !== 'object'
          ? String(pair.key.source ?? pair.key.value)
          : undefined;
      if (key === undefined || key === '') {
        this.problems.add(where, path === '' ? 'file' : path, 'a key that is not a word', 'write `key: value`');
        continue;
      }
      this.refuseExtras(pair.key, path);
      const inner = path === '' ? key : `${path}.${key}`;
      if (key === '<<') {
        this.problems.add(where, inner, 'merge keys are not used here', 'write the values out');
        continue;
      }
      const twin = entries.get(key);
      if (twin) {
        addTwice(this.problems, inner, where, twin.where);
        continue;
      }
      const value = this.tree(pair.value, inner, depth + 1, where);
      if (value) entries.set(key, { where, value });
    }
    return { kind: 'mapping', entries, where: this.where(node) };
  }

  private tree(node: YamlNode | null, path: string, depth: number, fallback: Position): Tree | undefined {
    if (node === null || node === undefined) return { kind: 'scalar', value: null, text: '', where: fallback };
    const where = node.range ? this.at(node.range[0]) : fallback;
    if (depth > deepest) {
      this.problems.add(where, path, 'nested too deep', `nest at most ${deepest} levels`);
      return undefined;
    }
    if (isAlias(node)) {
      this.problems.add(where, path, 'aliases are not used here', 'write the value out', { value: `*${node.source}` });
      return undefined;
    }
    this.refuseExtras(node, path);
    if (isMap(node)) return this.mapping(node as YAMLMap, path, depth);
    if (isSeq(node)) {
      const items: Tree[] = [];
      node.items.forEach((item, index) => {
        const value = this.tree(item as YamlNode | null, `${path}[${index}]`, depth + 1, where);
        if (value) items.push(value);
      });
      return { kind: 'list', items, where };
    }
    if (isScalar(node)) {
      const value = node.value;
      if (value === null) return { kind: 'scalar', value: null, text: '', where };
      if (typeof value === 'string' || typeof value === 'number' || typeof value === 'boolean') {
        const raw = node.range ? { raw: this.source.slice(node.range[0], node.range[1]) } : {};
        return { kind: 'scalar', value, text: node.source ?? String(value), ...raw, where };
      }
    }
    this.problems.add(
      where,
      path,
      'a value of a kind that is not used here',
      'write a text, a number, a list or a mapping',
    );
    return undefined;
  }

  private refuseExtras(node: unknown, path: string): void {
    const extras = node as { anchor?: string; tag?: string; range?: [number, number, number] | null };
    if (extras.anchor) {
      this.problems.add(this.where(node), path, 'anchors are not used here', 'leave it away', {
        value: `&${extras.anchor}`,
      });
    }
  }

  private where(node: unknown): Position {
    const range = (node as { range?: [number, number, number] | null } | null)?.range;
    return range ? this.at(range[0]) : { file: this.file, line: 1, column: 1 };
  }
}
