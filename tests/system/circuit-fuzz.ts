import * as library from '../../plants/library.js';
import { portKinds } from '../../plants/ports.js';
import { buildCircuit, type Circuit, places } from '../../runtime/circuit/build.js';
import type { Connection, ElementInstance, ElementKind, ParameterDeclaration } from '../../runtime/contract.js';
import { Plant } from '../../runtime/plant.js';
import { oil } from '../support/oil.js';

/**
 * Random circuits over all elements, with random parameters and commands, and what has to hold on each of them: numbers
 * stay finite, oil is neither made nor lost, each element balances its own energy at every state, no element has a
 * negative loss, and the ledger of the run closes. Everything follows from the seed.
 */
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

/** How often each kind, and each pair of kinds that share a port of a store, has been in an accepted circuit. */
export class Coverage {
  readonly elements = new Map<string, number>();
  readonly pairs = new Map<string, number>();
  seconds = 0;

  add(elements: readonly ElementInstance[], seconds: number): void {
    this.seconds += seconds;
    const at = new Map<string, Set<string>>();
    const count = (map: Map<string, number>, key: string) => map.set(key, (map.get(key) ?? 0) + 1);
    for (const one of elements) count(this.elements, one.kind.kind);
    for (const one of elements)
      for (const to of Object.values(one.connections)) {
        const place = `${to.store}.${to.port}`;
        const store = elements.find((other) => other.name === to.store)!;
        at.set(place, (at.get(place) ?? new Set([store.kind.kind])).add(one.kind.kind));
      }
    const seen = new Set<string>();
    for (const group of at.values()) for (const a of group) for (const b of group) if (a < b) seen.add(`${a} ${b}`);
    for (const pair of seen) count(this.pairs, pair);
  }
}

/** Pairs of kinds that could share a port of a store. */
export function possiblePairs(): number {
  const touches = (kind: ElementKind) => new Set(Object.values(kind.ports));
  let count = 0;
  for (const a of kinds)
    for (const b of kinds) {
      if (a.kind >= b.kind || (a.role === 'store' && b.role === 'store')) continue;
      if ([...touches(a)].some((port) => touches(b).has(port))) count += 1;
    }
  return count;
}

const between = (random: () => number, low: number, high: number) => low + (high - low) * random();

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
  if (kind.kind === 'pump-motor' && parameters.losses === 1) parameters.caseHeatShare = 0;
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

/** Draws a circuit. Kinds that have been used least come first; `must` is in it. `change` replaces a kind. */
export function drawCircuit(
  seed: number,
  used: ReadonlyMap<string, number>,
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
  /** One of the kinds, the least used ones first. */
  const pick = (from: readonly ElementKind[]) => {
    const forced = from.find((kind) => kind.kind === must && !elements.some((one) => one.kind.kind === must));
    if (forced) return forced;
    const rank = (kind: ElementKind) =>
      (used.get(kind.kind) ?? 0) + 2 * elements.filter((one) => one.kind.kind === kind.kind).length + 3 * random();
    return from.map((kind) => [rank(kind), kind] as const).reduce((a, b) => (b[0] < a[0] ? b : a))[1];
  };
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

/** Ranges of commands without both ends. */
const reach: Readonly<Record<string, number>> = {
  'N m': 250,
  'm3/s': 8e-4,
  Pa: 2e6,
  W: 3000,
  'rad/s': 200,
  'm/s': 5,
  N: 5000,
  kg: 3000,
  'kg/s': 0.01,
  '1': 1,
};

function commandOf(random: () => number, declared: ElementKind['commands'][string]): number {
  if (declared.fault && random() < 0.9) return declared.rest;
  const span = reach[declared.unit] ?? 1;
  const low = Math.max(declared.least ?? -span, -Math.max(span, 1));
  const high = Math.min(
    declared.most ?? span,
    Math.max(span, declared.unit === '1' ? 3 : 1e-9),
    declared.least === undefined ? span : Math.max(span, low),
  );
  return random() < 0.3 ? declared.rest : between(random, low, Math.max(low, high));
}

export interface FuzzResult {
  /** What was wrong; undefined: nothing. */
  readonly fault: string | undefined;
  /** It left what the laws are valid for, and was stopped there. */
  readonly left: string | undefined;
  /** Substeps that the safety net had to replace: the solver says itself that it could not follow there. */
  readonly replaced: number;
  readonly seconds: number;
  readonly residual: number;
  readonly oil: number;
  readonly imbalance: number;
}

/**
 * `imbalance`: the accumulator's oil volume comes from two Newton steps and is found least well when nearly empty. A
 * circuit whose solver replaces a substep (it counts and reports that) is judged up to there and stopped.
 */
export const bounds = { residual: 2e-3, oil: 1e-11, imbalance: 5e-6 };

/** Steps before the checks begin. */
const settling = 50;

/**
 * Runs a circuit for `seconds` and checks it on the way. Where energy is out of its bound at four substeps but within it
 * at sixteen, the step was too long and nothing is wrong with an element: `finer` says so, as `check` would.
 */
export function runCircuit(
  elements: readonly ElementInstance[],
  seed: number,
  seconds: number,
): FuzzResult & { readonly finer: boolean } {
  const result = runAt(elements, seed, seconds, 4);
  if (!result.fault?.startsWith('energy')) return { ...result, finer: false };
  return { ...runAt(elements, seed, seconds, 16), finer: true };
}

/** One run with commands that change every 40 ms, and checks it on the way. */
function runAt(elements: readonly ElementInstance[], seed: number, seconds: number, substeps: number): FuzzResult {
  const random = generator(seed ^ 0x5eed);
  const circuit = buildCircuit({ name: 'fuzz', portKinds, elements });
  const plant = Plant.alone(circuit, { step: 1e-3, substeps });
  const at = places(circuit);
  const stuff = circuit.stuffs.indexOf('oil');
  // random pressures beside one another are no state that a bench starts from: they settle first
  for (let step = 0; step < settling; step += 1) plant.step();
  const replacedBefore = plant.solver.replaced;
  const ledger = plant.ledger.slice();
  const energyAtStart = plant.observed[at.energy]!;
  const held = stuff < 0 ? 0 : plant.observed[at.holdings + stuff]!;
  const powers = circuit.readings.flatMap((reading, i) => (/^(loss|supply|throughput)$/.test(reading.name) ? [i] : []));
  const losses = circuit.readings.flatMap((reading, i) => (reading.name === 'loss' ? [i] : []));
  const declared = new Map(elements.map((one) => [one.name, one.kind]));
  const audit = new Float64Array(2 * elements.length);
  let passed = 0;
  let imbalance = 0;
  const steps = Math.round(seconds * 1000);
  const done = (step: number, fault?: string, left?: string): FuzzResult => ({
    fault,
    left,
    replaced: plant.solver.replaced - replacedBefore,
    seconds: step * 1e-3,
    residual:
      Math.abs(
        plant.observed[at.energy]! - energyAtStart - (plant.ledger[0]! - ledger[0]!) + (plant.ledger[1]! - ledger[1]!),
      ) / Math.max(passed, 100),
    oil:
      held > 0
        ? Math.abs(plant.observed[at.holdings + stuff]! - held - (plant.ledger[2 + stuff]! - ledger[2 + stuff]!)) / held
        : 0,
    imbalance,
  });
  for (let step = 0; step < steps; step += 1) {
    if (step % 40 === 0)
      circuit.commands.forEach((slot, i) => {
        plant.u[i] = commandOf(random, declared.get(slot.element)!.commands[slot.name]!);
      });
    const before = done(step);
    plant.step();
    // what went before has to be right all the same
    if (plant.solver.replaced > replacedBefore) return judged({ ...before, replaced: 1 });
    for (const i of powers) passed += 1e-3 * Math.abs(plant.observed[i]!);
    for (let i = 0; i < plant.y.length; i += 1)
      if (!Number.isFinite(plant.y[i]!)) return done(step, `${circuit.states[i]!.path} is ${plant.y[i]} at ${step} ms`);
    for (let i = 0; i < circuit.readings.length; i += 1)
      if (!Number.isFinite(plant.observed[i]!))
        return done(step, `${circuit.readings[i]!.path} is ${plant.observed[i]} at ${step} ms`);
    const left = outside(circuit, plant);
    if (left) return judged({ ...before, left });
    for (const i of losses)
      if (plant.observed[i]! < -1e-6 * (1 + passed))
        return done(step, `${circuit.readings[i]!.path} is ${plant.observed[i]} W at ${step} ms`);
    if (step % 10 === 7) {
      circuit.functions.audit(plant.y, plant.u, plant.m, audit);
      for (let i = 0; i < elements.length; i += 1) {
        const share = Math.abs(audit[i]!) / Math.max(audit[elements.length + i]!, 1);
        imbalance = Math.max(imbalance, share);
        if (!(share <= bounds.imbalance))
          return done(
            step,
            `${elements[i]!.kind.kind} makes ${audit[i]} W of ${audit[elements.length + i]} W at ${step} ms`,
          );
      }
    }
  }
  return judged(done(steps));
}

function judged(result: FuzzResult): FuzzResult {
  if (!(result.oil <= bounds.oil)) return { ...result, fault: `oil is off by ${result.oil} of it` };
  if (!(result.residual <= bounds.residual))
    return { ...result, fault: `energy is off by ${result.residual} of what passed` };
  return result;
}

/** A signal past what the laws are made for. */
function outside(circuit: Circuit, plant: Plant): string | undefined {
  for (let i = 0; i < circuit.readings.length; i += 1) {
    const { unit, path } = circuit.readings[i]!;
    const value = plant.observed[i]!;
    if (path.endsWith('ressure') && value > 1200e5) return `${path} ${value} Pa`;
    if (unit === 'rad/s' && Math.abs(value) > 2000) return `${path} ${value} rad/s`;
    // past its end stop the accumulator's volume is found to 1e-4 only
    if (path.endsWith('.stateOfCharge') && value > 1) return `${path} ${value}`;
    if (unit === 'K' && (value < 200 || value > 550)) return `${path} ${value} K`;
  }
  return undefined;
}
