import type { Connection, ElementInstance, ElementKind } from '../runtime/contract.js';
import type { Catalogue } from './bench-spec.js';
import { shown } from './quantity.js';
import { type Section, suggestion } from './section.js';
import type { Tree } from './source.js';

/** The stores that branches can be tied to. */
export interface Circuitry {
  readonly stores: ReadonlyMap<string, Pick<ElementInstance, 'name' | 'kind'>>;
  /** Also those with problems of their own, so that their connections are not complained about. */
  readonly allStores: ReadonlySet<string>;
}

/** Reads one port of a branch: `store`, `store.port` or `{ to: store.port, ratio: 1.4 }`. */
export function readConnection(
  section: Section,
  port: string,
  portKind: string,
  kind: ElementKind,
  catalogue: Catalogue,
  circuitry: Circuitry,
): Connection | undefined {
  const entry = section.entry(port);
  const fitting = () =>
    [...circuitry.stores.values()]
      .filter((store) => Object.values(store.kind.ports).includes(portKind))
      .map((store) => store.name);
  if (!entry || (entry.value.kind === 'scalar' && entry.value.value === null)) {
    if (kind.optionalPorts?.includes(port)) return undefined;
    const candidates = fitting().slice(0, 6);
    const remedy =
      candidates.length > 0
        ? `add ${port}: and one of ${candidates.join(', ')}`
        : `add a store with ${article(portKind)} port and name it here`;
    return section.fail(port, `port not connected (${portKind})`, remedy, {}, section.where);
  }
  let target: Tree = entry.value;
  let ratio = 1;
  if (target.kind === 'mapping') {
    const inner = section.sectionIn(target, port)!;
    const to = inner.entry('to');
    const given = inner.quantity('ratio', { unit: '1' });
    if (inner.has('ratio') && given !== undefined) {
      ratio = given;
      if (!catalogue.portKinds[portKind]?.scaled)
        inner.fail('ratio', `a ratio on ${article(portKind)} port`, 'leave it away: only shafts turn at a ratio');
      else if (ratio === 0)
        inner.fail('ratio', 'ratio is zero', 'write how many turns the branch makes per turn of the store');
    }
    inner.finish(['to', 'ratio']);
    if (!to) return inner.fail('to', 'missing', 'add to: and the name of a store');
    target = to.value;
  }
  if (target.kind !== 'scalar')
    return section.fail(port, 'not the name of a store', `write ${port}: store or ${port}: store.port`);
  return resolve(section, port, portKind, target.text, ratio, circuitry, fitting);
}

function resolve(
  section: Section,
  port: string,
  portKind: string,
  text: string,
  ratio: number,
  circuitry: Circuitry,
  fitting: () => string[],
): Connection | undefined {
  const [storeName = '', storePort, ...more] = text.split('.');
  const fail = (what: string, remedy: string) => section.fail(port, what, remedy, { value: shown(text) });
  if (more.length > 0) return fail('not a port of a store', 'write store or store.port');
  const store = circuitry.stores.get(storeName);
  if (!store) {
    if (circuitry.allStores.has(storeName)) return undefined;
    return fail('unknown store', suggestion(storeName, circuitry.stores.keys()));
  }
  const ports = store.kind.ports;
  const matching = Object.keys(ports).filter((candidate) => ports[candidate] === portKind);
  if (storePort !== undefined) {
    if (!Object.hasOwn(ports, storePort))
      return fail(`${storeName} has no port ${storePort}`, suggestion(storePort, Object.keys(ports)));
    if (ports[storePort] !== portKind) {
      return fail(
        `${article(portKind)} port tied to ${article(ports[storePort]!)} port`,
        matching.length > 0
          ? `use ${storeName}.${matching[0]}`
          : `tie it to one of ${fitting().slice(0, 6).join(', ')}`,
      );
    }
    return { store: storeName, port: storePort, ratio };
  }
  if (matching.length === 0) {
    const others = fitting().slice(0, 6);
    return fail(
      `${article(portKind)} port tied to a store without one`,
      others.length > 0 ? `tie it to one of ${others.join(', ')}` : `add a store with ${article(portKind)} port`,
    );
  }
  if (matching.length === 1) return { store: storeName, port: matching[0]!, ratio };
  if (matching.includes(port)) return { store: storeName, port, ratio };
  return fail(
    `${storeName} has ${matching.length} ${portKind} ports`,
    `write one of ${matching.map((one) => `${storeName}.${one}`).join(', ')}`,
  );
}

function article(word: string): string {
  return `${/^[aeiou]/.test(word) ? 'an' : 'a'} ${word}`;
}
