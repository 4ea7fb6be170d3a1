import * as library from '../../plants/library.js';
import type { Connection, ElementInstance, ElementKind, ParameterDeclaration } from '../../runtime/contract.js';
import { oil } from '../support/oil.js';

/** Random circuits over all elements, with random parameters and start values. Everything follows from the seed. */
export const kinds: readonly ElementKind[] = Object.values(library);

/** Reproducible numbers in 0 .. 1 (mulberry32). */
export function generator(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
}

export const between = (random: () => number, low: number, high: number) => low + (high - low) * random();

/** Values for required parameters without a usual range. */
const typical: Readonly<Record<string, readonly [number, number]>> = {
  Pa: [120e5, 320e5],
  m3: [2e-4, 5e-3],
  'm3/s': [5e-4, 5e-3],
  m2: [1e-6, 2e-4],
  'kg m2': [0.05, 5],
  kg: [2000, 15000],
  K: [283, 313],
  '1': [1, 4],
  W: [1e3, 1e5],
  'N m': [50, 800],
  m: [0.3, 0.6],
  'm/s': [0, 20],
  'rad/s': [20, 200],
  N: [1000, 40000],
};

function parameterOf(random: () => number, name: string, declared: ParameterDeclaration): number {
  if (declared.choices) return Math.floor(random() * declared.choices.length);
  if (name === 'ambientPressure') return between(random, 8e4, 1.05e5);
  const keep = declared.default !== undefined && (random() < 0.5 || declared.default === 0);
  if (keep) return declared.default!;
  const [low, high] =
    declared.usual ??
    (declared.default === undefined
      ? (typical[declared.unit] ?? [1, 2])
      : [0.7 * declared.default, 1.4 * declared.default]);
  const value = between(random, low, high);
  return Math.min(Math.max(value, declared.least ?? -1e300), declared.most ?? 1e300);
}

/** Parameters that only make sense together. */
function tieTogether(random: () => number, kind: ElementKind, parameters: Record<string, number>): void {
  if ('cracking' in parameters && 'fullFlow' in parameters) {
    if (kind.kind.includes('charge')) parameters.cracking = between(random, 12e5, 25e5);
    parameters.fullFlow = parameters.cracking! * between(random, 1.06, 1.2);
    parameters.fullFlowRate = kind.kind.includes('charge') ? between(random, 5e-4, 2e-3) : between(random, 2e-3, 8e-3);
  }
  if (kind.kind === 'combustion-engine')
    for (const key of Object.keys(parameters))
      if (key.startsWith('fullLoad')) parameters[key] = kind.parameters[key]!.default!;
  if (kind.kind === 'gas-accumulator') {
    parameters.precharge = between(random, 5e5, 150e5);
    parameters.leastGasShare = between(random, 0.1, 0.3);
    parameters.volume = between(random, 2e-3, 0.06);
  }
  if (kind.kind === 'vehicle') parameters.rollingResistance = between(random, 0.005, 0.02);
  if (kind.kind.endsWith('-brake')) parameters.maximumTorque = between(random, 50, 800);
  if (kind.kind === 'oil-volume') parameters.volume = between(random, 2e-4, 4e-3);
  if (kind.kind === 'pressure-source') parameters.pressure = between(random, 2e5, 200e5);
  // a valve of a square decimetre on a store of a litre is no circuit
  for (const [name, declared] of Object.entries(kind.parameters))
    if (declared.unit === 'm2' && declared.most !== undefined && parameters[name]! > 3e-4)
      parameters[name] = between(random, 3e-5, 3e-4);
  if (kind.kind === 'pump-motor') {
    // forms without laminar leakage have none that could carry the heat of the case
    if ([1, 4, 5].includes(parameters.losses!)) parameters.caseHeatShare = 0;
    for (const name of Object.keys(parameters))
      if (name.startsWith('map')) parameters[name] = between(random, -0.01, 0.05);
  }
}

function startOf(
  random: () => number,
  kind: ElementKind,
  parameters: Readonly<Record<string, number>>,
): Record<string, number> {
  const start: Record<string, number> = {};
  for (const [name, declared] of Object.entries(kind.starts)) {
    let value = declared.default ?? 0;
    if (name === 'pressure' && parameters.precharge) value = parameters.precharge * between(random, 0.6, 3);
    else if (name === 'pressure') value = between(random, 2e5, 220e5);
    else if (declared.unit === 'rad/s') value = between(random, -30, 120);
    else if (declared.unit === 'm/s') value = between(random, 0, 15);
    else if (/emperature$/.test(name)) value = between(random, 285, 345);
    else if (name === 'level') value = between(random, 0.3, 0.9);
    start[name] = value;
  }
  return start;
}

export interface FuzzCircuit {
  readonly elements: readonly ElementInstance[];
  /** Why its own elements refuse it; empty when they do not. */
  readonly refused: readonly string[];
}

/**
 * Draws a circuit. Which kinds come first goes round with the seed, so that a few seeds in a row hold every kind; `must`
 * is in it whatever the seed. `change` replaces a kind.
 */
export function drawCircuit(
  seed: number,
  must?: string,
  change: (kind: ElementKind) => ElementKind = (kind) => kind,
): FuzzCircuit {
  const random = generator(seed);
  const elements: ElementInstance[] = [];
  const refused: string[] = [];
  const fluid = oil({
    air: between(random, 0.001, 0.02),
    bulkModulus: between(random, 1.1e9, 2e9),
    grade: Math.floor(random() * 3),
  });
  const make = (kind: ElementKind, connections: Record<string, Connection> = {}) => {
    const parameters: Record<string, number> = {};
    for (const [name, declared] of Object.entries(kind.parameters))
      parameters[name] = parameterOf(random, name, declared);
    tieTogether(random, kind, parameters);
    const problems = kind.examine?.({ parameter: parameters, fluid: kind.fluid ? fluid : {} }) ?? [];
    refused.push(...problems.map((problem) => `${kind.kind}: ${problem.what}`));
    const name = `e${elements.length}`;
    elements.push({
      name,
      kind: change(kind),
      parameters,
      start: startOf(random, kind, parameters),
      connections,
      ...(kind.fluid ? { fluid } : {}),
    });
    return name;
  };
  /** One of the kinds, those whose turn it is first. */
  const pick = (from: readonly ElementKind[]) => {
    const forced = from.find((kind) => kind.kind === must && !elements.some((one) => one.kind.kind === must));
    if (forced) return forced;
    const rank = (kind: ElementKind) =>
      4 * turn(from.indexOf(kind), from.length) +
      2 * elements.filter((one) => one.kind.kind === kind.kind).length +
      3 * random();
    return from.map((kind) => [rank(kind), kind] as const).reduce((a, b) => (b[0] < a[0] ? b : a))[1];
  };
  const turn = (index: number, count: number) => ((index + 7 * seed) % count) / count;
  const stores = (port: string) =>
    kinds.filter((kind) => kind.role === 'store' && Object.values(kind.ports).includes(port));
  const places = (port: string) =>
    elements
      .filter((one) => one.kind.role === 'store')
      .flatMap((one) =>
        Object.entries(one.kind.ports)
          .filter(([, kind]) => kind === port)
          .map(([name]) => ({ store: one.name, port: name })),
      );

  const tank = make(library.tank);
  const oilStores = 3 + Math.floor(3 * random());
  for (let i = 0; i < oilStores; i += 1) make(pick(stores('oil').filter((kind) => kind.kind !== 'tank')));
  const shaftStores = 2 + Math.floor(2 * random());
  for (let i = 0; i < shaftStores; i += 1) make(pick(stores('shaft')));
  if (random() < 0.6 || stores('road').some((kind) => kind.kind === must)) make(pick(stores('road')));
  // every closed side gets a relief valve, and every shaft a drag: without them random sources leave all validity
  for (const one of [...elements]) {
    if (one.kind.kind === 'oil-volume' || one.kind.kind === 'gas-accumulator')
      make(library.reliefValve, {
        from: { store: one.name, port: 'oil', ratio: 1 },
        to: { store: tank, port: 'oil', ratio: 1 },
      });
  }
  for (const place of places('shaft')) {
    const name = make(library.shaftDrag, { shaft: { ...place, ratio: 1 } });
    Object.assign(elements.find((one) => one.name === name)!.parameters, {
      quadraticDrag: between(random, 0.01, 0.05),
      constantDrag: 5,
    });
  }
  const branches = kinds.filter(
    (kind) => kind.role === 'branch' && kind.kind !== 'relief-valve' && kind.kind !== 'shaft-drag',
  );
  const wanted = elements.length + 6 + Math.floor(5 * random());
  for (let tries = 0; elements.length < wanted && tries < 100; tries += 1) {
    const kind = pick(branches);
    const connections: Record<string, Connection> = {};
    const taken = new Set<string>();
    let fits = true;
    for (const [port, portKind] of Object.entries(kind.ports)) {
      const free = places(portKind).filter((place) => !taken.has(`${place.store} ${portKind}`));
      const place = free[Math.floor(random() * free.length)];
      if (!place) fits = false;
      else {
        taken.add(`${place.store} ${portKind}`);
        connections[port] = { ...place, ratio: portKind === 'shaft' && random() < 0.4 ? between(random, 0.6, 2.5) : 1 };
      }
    }
    if (fits) make(kind, connections);
    else if (kind.kind === must && tries > 20) make(library.vehicle);
  }
  return { elements, refused };
}
