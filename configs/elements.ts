import type { Connection, ElementInstance, ElementKind, Position } from '../runtime/contract.js';
import type { Ambient, Catalogue } from './bench-spec.js';
import { type Circuitry, readConnection } from './connections.js';
import { readParameters } from './parameters.js';
import type { Problems } from './problems.js';
import { shown } from './quantity.js';
import { type Section, suggestion } from './section.js';

/** An element while the bench is read: with the places of what the file says about it. */
export interface ReadElement extends ElementInstance {
  readonly where: Position;
  readonly path: string;
  readonly places: ReadonlyMap<string, Position>;
  /** False when something about it is wrong: checks that need it then stay away. */
  readonly complete: boolean;
}

/** Names that would clash with the runtime's own groups of signals. */
const reserved = new Set([
  'run',
  'timing',
  'ledger',
  'link',
  'links',
  'watch',
  'judge',
  'scenario',
  'life',
  'exchange',
  'controller',
]);

/** Checks names of stores, branches, instruments, links and messages, which share one space of paths. */
export class Names {
  private readonly taken = new Map<string, Position>();

  constructor(private readonly problems: Problems) {}

  take(name: string, where: Position, path: string): boolean {
    if (!/^[a-z][A-Za-z0-9]{0,63}$/.test(name)) {
      const better = camel(name);
      this.problems.add(
        where,
        path,
        'not a name',
        better === undefined
          ? 'use letters and digits, a small letter first'
          : `use letters and digits, such as ${better}`,
        {
          value: shown(name),
        },
      );
      return false;
    }
    if (reserved.has(name)) {
      this.problems.add(where, path, 'name is reserved for the runtime', 'choose another name');
      return false;
    }
    const other = this.taken.get(name);
    if (other) {
      this.problems.add(
        where,
        path,
        'name is taken',
        `rename one of the two (the other is at ${other.file}:${other.line})`,
      );
      return false;
    }
    this.taken.set(name, where);
    return true;
  }
}

function camel(name: string): string | undefined {
  const words = name.split(/[^A-Za-z0-9]+/).filter(Boolean);
  const joined = words
    .map((word, index) => (index === 0 ? word.charAt(0).toLowerCase() : word.charAt(0).toUpperCase()) + word.slice(1))
    .join('');
  return /^[a-z]/.test(joined) ? joined : undefined;
}

/** Fluids by name, as the numbers that elements see. */
export function readFluids(
  top: Section,
  catalogue: Catalogue,
  ambient: Ambient,
): Map<string, Readonly<Record<string, number>> | undefined> {
  const fluids = new Map<string, Readonly<Record<string, number>> | undefined>();
  for (const [name, section] of top.sections('fluids')) {
    fluids.set(name, undefined);
    const kind = kindOf(section, catalogue.fluids, 'fluid');
    if (!kind) continue;
    section.skip('about');
    const read = readParameters(section, kind.parameters, ambient);
    section.finish(read.keys);
    if (!read.complete) continue;
    const remarks = kind.examine(read.values);
    for (const { path, what, remedy } of remarks)
      section.problems.add(read.places.get(path) ?? section.where, section.inner(path), what, remedy);
    if (remarks.length === 0) fluids.set(name, kind.values(read.values));
  }
  return fluids;
}

/** The kind that `is:` names; a problem and undefined when there is none. */
export function kindOf<K extends { readonly kind: string }>(
  section: Section,
  kinds: readonly K[],
  what: string,
): K | undefined {
  if (!section.has('is')) {
    section.skip('is');
    const some = kinds.slice(0, 6).map((candidate) => candidate.kind);
    return section.fail('is', 'missing', `add is: and a kind of ${what}, such as ${some.join(', ')}`);
  }
  const said = section.placed('is', {}, kinds[0]?.kind ?? what);
  if (!said) return undefined;
  const kind = kinds.find((candidate) => candidate.kind === said.text);
  if (kind) return kind;
  return section.fail(
    'is',
    `unknown kind of ${what}`,
    suggestion(
      said.text,
      kinds.map((candidate) => candidate.kind),
    ),
    { value: shown(said.text) },
  );
}

/** Reads stores and branches, in the order of the file, stores first. */
export function readElements(
  top: Section,
  catalogue: Catalogue,
  names: Names,
  fluids: ReadonlyMap<string, Readonly<Record<string, number>> | undefined>,
  ambient: Ambient,
): ReadElement[] {
  const elements: ReadElement[] = [];
  const storeSections = top.sections('stores', { required: true });
  for (const [name, section] of storeSections) {
    const element = readElement(name, section, 'store', catalogue, names, fluids, ambient);
    if (element) elements.push(element);
  }
  const stores = new Map(elements.map((element) => [element.name, element]));
  const allStores = new Set(storeSections.map(([name]) => name));
  for (const [name, section] of top.sections('branches')) {
    const element = readElement(name, section, 'branch', catalogue, names, fluids, ambient, { stores, allStores });
    if (element) elements.push(element);
  }
  return elements;
}

function readElement(
  name: string,
  section: Section,
  role: 'store' | 'branch',
  catalogue: Catalogue,
  names: Names,
  fluids: ReadonlyMap<string, Readonly<Record<string, number>> | undefined>,
  ambient: Ambient,
  circuitry?: Circuitry,
): ReadElement | undefined {
  names.take(name, section.where, section.path);
  const before = section.problems.count;
  const other = catalogue.elements.find(
    (candidate) => candidate.role !== role && candidate.kind === section.peek('is'),
  );
  if (other) {
    return section.fail(
      'is',
      `${other.kind} is a ${other.role}`,
      `move it to ${other.role === 'store' ? 'stores' : 'branches'}:`,
    );
  }
  const kind = kindOf(
    section,
    catalogue.elements.filter((candidate) => candidate.role === role),
    role,
  );
  if (!kind) return undefined;
  section.skip('about');

  const fluid = kind.fluid ? readFluidName(section, fluids) : undefined;
  const parameters = readParameters(section, kind.parameters, ambient);
  const start = readStart(section, kind, ambient);
  const connections: Record<string, Connection> = {};
  const ports = role === 'branch' ? Object.entries(kind.ports) : [];
  for (const [port, portKind] of ports) {
    const connection = readConnection(section, port, portKind, kind, catalogue, circuitry!);
    if (connection) connections[port] = connection;
  }
  section.finish([
    ...parameters.keys,
    ...ports.map(([port]) => port),
    ...(Object.keys(kind.starts).length > 0 ? ['start'] : []),
  ]);

  let complete = section.problems.count === before && (!kind.fluid || fluid !== undefined);
  if (complete) {
    const remarks = kind.examine?.({ parameter: parameters.values, fluid: fluid ?? {} }) ?? [];
    for (const remark of remarks) {
      const where = parameters.places.get(remark.parameter) ?? section.where;
      section.problems.add(where, section.inner(remark.parameter), remark.what, remark.remedy);
    }
    complete = remarks.length === 0;
  }
  return {
    name,
    kind,
    parameters: parameters.values,
    ...(fluid === undefined ? {} : { fluid }),
    connections,
    start,
    where: section.where,
    path: section.path,
    places: parameters.places,
    complete,
  };
}

function readFluidName(
  section: Section,
  fluids: ReadonlyMap<string, Readonly<Record<string, number>> | undefined>,
): Readonly<Record<string, number>> | undefined {
  const said = section.text('fluid');
  if (said === undefined) {
    if (section.has('fluid')) return undefined;
    if (fluids.size === 1) return [...fluids.values()][0];
    const known = [...fluids.keys()];
    return section.fail(
      'fluid',
      'missing',
      known.length === 0
        ? 'declare a fluid under fluids: and name it here'
        : `add fluid: with one of ${known.join(', ')}`,
    );
  }
  if (!fluids.has(said))
    return section.fail('fluid', 'unknown fluid', suggestion(said, fluids.keys()), { value: shown(said) });
  return fluids.get(said);
}

function readStart(section: Section, kind: ElementKind, ambient: Ambient): Record<string, number> {
  if (Object.keys(kind.starts).length === 0) return {};
  const inner = section.section('start');
  const start = inner ?? section.sectionIn({ kind: 'scalar', value: null, text: '', where: section.where }, 'start')!;
  const read = readParameters(start, kind.starts, ambient);
  inner?.finish(read.keys);
  return read.values;
}
