import type { CircuitSpec, ElementInstance } from '../runtime/contract.js';
import type { Ambient } from './bench-spec.js';
import { readParameters } from './parameters.js';
import { shown } from './quantity.js';
import { type Section, suggestion } from './section.js';

type Starts = Record<string, Record<string, number>>;

/**
 * Reads the start state of a scenario, over that of the bench:
 *
 *   start:
 *     speed: 50 km/h              # of the vehicle; wheels, axles and shafts that are geared to it turn along
 *     gear: 4
 *     temperature: -20 degC       # of all oil and gas
 *     highAccumulator: { pressure: 300 bar(g) }   # any start value of any element
 *
 * Oil volumes that the bench starts at the pressure of an accumulator follow it when a scenario gives that another one. What is
 * said of an element itself goes before everything.
 */
export function readStartState(section: Section, circuit: CircuitSpec, ambient: Ambient): Starts {
  const said: Starts = {};
  const speed = section.quantity('speed', { unit: 'm/s' });
  const temperature = section.quantity('temperature', { unit: 'K', least: 200, most: 420 });
  const gear = section.quantity('gear', { unit: '1', least: -1, most: 12 });
  const shortcuts = ['speed', 'temperature', 'gear'];
  for (const name of section.keys()) {
    if (shortcuts.includes(name)) continue;
    const element = circuit.elements.find((one) => one.name === name);
    const entry = section.entry(name)!;
    if (!element) {
      section.fail(
        name,
        'no such element',
        suggestion(name, [...circuit.elements.map((one) => one.name), ...shortcuts]),
        { value: shown(name) },
        entry.where,
      );
      continue;
    }
    const own = section.sectionIn(entry.value, name);
    if (!own) continue;
    const known = Object.keys(element.kind.starts);
    const given = own.keys().filter((key) => known.includes(key));
    const declared = Object.fromEntries(given.map((key) => [key, element.kind.starts[key]!]));
    const read = readParameters(own, declared, ambient);
    own.finish(known);
    said[name] = { ...read.values };
  }
  section.finish();
  return consistent(circuit, said, { speed, temperature, gear });
}

interface Shortcuts {
  readonly speed: number | undefined;
  readonly temperature: number | undefined;
  readonly gear: number | undefined;
}

/** What is said, and what follows from it. */
function consistent(circuit: CircuitSpec, said: Starts, { speed, temperature, gear }: Shortcuts): Starts {
  const all: Starts = {};
  const put = (element: ElementInstance, key: string, value: number) => {
    if (!Object.hasOwn(element.kind.starts, key)) return;
    all[element.name] ??= {};
    all[element.name]![key] = value;
  };
  for (const element of circuit.elements) {
    if (temperature !== undefined) for (const key of ['temperature', 'oilTemperature']) put(element, key, temperature);
    if (gear !== undefined && element.kind.kind === 'stepped-gearbox') put(element, 'gear', gear);
    const before = element.start['pressure'];
    const now = said[element.name]?.['pressure'];
    if (element.kind.kind !== 'gas-accumulator' || before === undefined || now === undefined) continue;
    for (const other of circuit.elements)
      if (other.kind.kind === 'oil-volume' && other.start['pressure'] === before) put(other, 'pressure', now);
  }
  for (const [name, values] of Object.entries(said)) all[name] = { ...all[name], ...values };
  if (speed !== undefined)
    for (const [name, value] of turning(circuit, speed, all)) all[name] = { ...value, ...all[name] };
  return all;
}

/** How fast a port of a store turns for one unit of its start speed: 1, or a ratio. */
const portRatios: Readonly<Record<string, (element: ElementInstance, port: string) => number>> = {
  inertia: () => 1,
  axle: (element, port) => (port === 'input' ? (element.parameters['ratio'] ?? 1) : 1),
};

/**
 * Speeds of everything that turns with the wheels: through tyres that roll without slip, stiff and compliant shafts, clutches that
 * start closed and the gear that starts engaged.
 */
function turning(circuit: CircuitSpec, velocity: number, said: Starts): Map<string, Record<string, number>> {
  const found = new Map<string, Record<string, number>>();
  const stores = new Map(circuit.elements.map((element) => [element.name, element]));
  const speeds = new Map<string, number>();
  for (const element of circuit.elements) {
    if (element.kind.kind === 'vehicle') found.set(element.name, { velocity });
  }
  const startOf = (element: ElementInstance, key: string) => said[element.name]?.[key] ?? element.start[key] ?? 0;
  /** Speed of a connection as its branch sees it. */
  const seen = ({ store, port, ratio }: ElementInstance['connections'][string]) => {
    const speed = speeds.get(store);
    const own = stores.get(store)!;
    return speed === undefined ? undefined : ratio * portRatios[own.kind.kind]!(own, port) * speed;
  };
  const give = ({ store, port, ratio }: ElementInstance['connections'][string], value: number): boolean => {
    const own = stores.get(store)!;
    const share = portRatios[own.kind.kind]?.(own, port);
    if (share === undefined || speeds.has(store)) return false;
    speeds.set(store, value / (ratio * share));
    return true;
  };
  for (let changed = true; changed; ) {
    changed = false;
    for (const branch of circuit.elements) {
      const ties = branch.connections;
      if (branch.kind.kind === 'tyre' && ties['wheel'])
        changed = give(ties['wheel'], velocity / (branch.parameters['radius'] ?? 1)) || changed;
      const gear = startOf(branch, 'gear');
      const [a, b, ratio] =
        branch.kind.kind === 'compliant-shaft' ||
        (branch.kind.kind === 'clutch' && startOf(branch, 'application') >= 0.5)
          ? [ties['a'], ties['b'], 1]
          : branch.kind.kind === 'stepped-gearbox' && gear !== 0
            ? [
                ties['input'],
                ties['output'],
                gear > 0 ? (branch.parameters[`ratio${gear}`] ?? 1) : -(branch.parameters['reverseRatio'] ?? 1),
              ]
            : [undefined, undefined, 1];
      if (
        !a ||
        !b ||
        !portRatios[stores.get(a.store)?.kind.kind ?? ''] ||
        !portRatios[stores.get(b.store)?.kind.kind ?? '']
      )
        continue;
      const atA = seen(a);
      const atB = seen(b);
      if (atA === undefined && atB !== undefined) changed = give(a, atB * ratio) || changed;
      else if (atB === undefined && atA !== undefined) changed = give(b, atA / ratio) || changed;
    }
  }
  for (const [name, speed] of speeds) found.set(name, { speed });
  return found;
}
