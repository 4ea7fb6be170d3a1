import type { WatchLevel } from '../runtime/contract.js';
import type { Ambient, WatchedLimit, WatchedSignal } from './bench-spec.js';
import type { ReadElement } from './elements.js';
import type { Section } from './section.js';
import type { SignalList } from './signal-list.js';
import { formatQuantity } from './units.js';

/**
 * What the watch compares: the limits that elements declare, with their settings; for each pressure of an oil store the
 * relief valve of its side; and what the bench file adds under `watch:`.
 */

const levels: readonly WatchLevel[] = [
  'near relief',
  'relief passing',
  'above maximum',
  'above 1.1 maximum',
  'below precharge',
  'below least inlet',
  'over speed',
  'over temperature',
  'end of travel',
  'level low',
  'case pressure',
  'not following',
  'locked',
];

/** Parameter of a relief valve and of a store that the checks look for. */
const crackingParameter = 'cracking';
const maximumParameter = 'maximumAllowable';
/** A store's own statement of the relief setting of its side; filled in from the relief valve when left out. */
const reliefParameter = 'reliefSetting';

/** Warn when a pressure is within this share of its relief setting, or will be there within this time, s. */
const usualVicinity = 0.05;
const usualLookAhead = 0.2;

interface Draft {
  readonly path: string;
  readonly unit: string;
  readonly limits: WatchedLimit[];
  relief?: { readonly valve: string; readonly setting: number };
  vicinity: number;
  lookAhead: number;
}

export interface ReliefValve {
  readonly element: ReadElement;
  /** The store at its inlet. */
  readonly store: string;
  /** Pa, absolute. */
  readonly setting: number;
}

/** Whether a branch limits a pressure: it states an absolute cracking pressure. A check valve's is a difference. */
function limitsPressure(element: ReadElement): boolean {
  const cracking = element.kind.parameters[crackingParameter];
  return element.kind.role === 'branch' && cracking?.unit === 'Pa' && !cracking.difference;
}

/** Relief valves, also those inside charge pumps. What they protect is tied to `from`, or else to `outlet`. */
export function reliefValves(elements: readonly ReadElement[]): ReliefValve[] {
  const valves: ReliefValve[] = [];
  for (const element of elements) {
    const setting = element.parameters[crackingParameter];
    if (!limitsPressure(element) || setting === undefined || !element.complete) continue;
    const connection = element.connections['from'] ?? element.connections['outlet'];
    if (connection) valves.push({ element, store: connection.store, setting });
  }
  return valves;
}

/**
 * The relief valve of each oil store's side: its own, the lowest of several; otherwise that of the nearest store behind
 * branches that join oil and nothing else (isolation valves, orifices, lines). Check and relief valves, machines with a
 * shaft, and stores that are open to the air end a side; those need no valve.
 */
export function reliefOfSide(
  elements: readonly ReadElement[],
  valves: readonly ReliefValve[],
): Map<string, ReliefValve> {
  const own = new Map<string, ReliefValve>();
  for (const valve of valves) {
    const other = own.get(valve.store);
    // A relief valve of its own goes before the one inside a charge pump, which sets the charge pressure.
    if (!other || goesBefore(valve, other)) own.set(valve.store, valve);
  }
  const neighbours = new Map<string, string[]>();
  for (const element of elements) {
    if (
      element.kind.role !== 'branch' ||
      element.parameters[crackingParameter] !== undefined ||
      element.kind.kind.includes('check')
    )
      continue;
    const stores = Object.values(element.connections).map((connection) => connection.store);
    if (stores.length !== 2 || !Object.values(element.kind.ports).every((port) => port === 'oil')) continue;
    for (const [a, b] of [stores, [...stores].reverse()]) neighbours.set(a!, [...(neighbours.get(a!) ?? []), b!]);
  }
  for (const element of elements) if (isOpen(element)) neighbours.delete(element.name);
  const found = new Map(own);
  for (const element of elements) {
    if (element.kind.role !== 'store' || isOpen(element) || found.has(element.name)) continue;
    const nearest = search(element.name, neighbours, own);
    if (nearest) found.set(element.name, nearest);
  }
  return found;
}

/** Whether a store stands at the pressure of the air around it. */
function isOpen(element: ReadElement): boolean {
  return element.kind.role === 'store' && Object.hasOwn(element.kind.parameters, 'ambientPressure');
}

function search(
  from: string,
  neighbours: ReadonlyMap<string, readonly string[]>,
  own: ReadonlyMap<string, ReliefValve>,
): ReliefValve | undefined {
  const seen = new Set([from]);
  let edge = [from];
  while (edge.length > 0) {
    const next: string[] = [];
    for (const store of edge) {
      for (const neighbour of neighbours.get(store) ?? []) {
        if (!seen.has(neighbour)) next.push(neighbour);
        seen.add(neighbour);
      }
    }
    const valves = next.map((store) => own.get(store)).filter((valve) => valve !== undefined);
    if (valves.length > 0) return valves.reduce((low, valve) => (valve.setting < low.setting ? valve : low));
    edge = next;
  }
  return undefined;
}

function goesBefore(one: ReliefValve, other: ReliefValve): boolean {
  const inPump = (valve: ReliefValve) => valve.element.connections['from'] === undefined;
  return inPump(one) === inPump(other) ? one.setting < other.setting : inPump(other);
}

/** A relief valve set above what its node may carry protects nothing. */
export function checkReliefSettings(
  top: Section,
  elements: readonly ReadElement[],
  valves: readonly ReliefValve[],
  sides: ReadonlyMap<string, ReliefValve>,
): void {
  for (const element of elements) {
    const most = element.parameters[maximumParameter];
    if (element.kind.role !== 'store' || most === undefined || !(most > 0)) continue;
    const bound = `PS of ${element.name} is ${formatQuantity(most, 'bar(g)')}`;
    const ownValves = valves.filter((valve) => valve.store === element.name);
    for (const { element: valve, setting } of ownValves) {
      if (setting <= most) continue;
      top.problems.add(
        valve.places.get(crackingParameter) ?? valve.where,
        `${valve.path}.${crackingParameter}`,
        'relief setting above the maximum allowable pressure',
        `set it to ${formatQuantity(most, 'bar(g)')} or below`,
        { value: formatQuantity(setting, 'bar(g)'), bound },
      );
    }
    const side = sides.get(element.name);
    if (ownValves.length === 0 && side && side.setting > most) {
      top.problems.remark(
        element.places.get(maximumParameter) ?? element.where,
        `${element.path}.${maximumParameter}`,
        `relief valve of this side, ${side.element.name}, is set higher`,
        'give the store a relief valve of its own or lower that one',
        { value: formatQuantity(side.setting, 'bar(g)'), bound },
      );
    }
  }
}

/** A store that states another relief setting than its valve has is worth a look. */
export function remarkReliefSettings(
  top: Section,
  elements: readonly ReadElement[],
  sides: ReadonlyMap<string, ReliefValve>,
): void {
  for (const element of elements) {
    const stated = element.parameters[reliefParameter];
    const place = element.places.get(reliefParameter);
    const side = sides.get(element.name);
    if (!place || !side || stated === undefined || stated === 0 || Math.abs(stated - side.setting) < 1) continue;
    top.problems.remark(
      place,
      `${element.path}.${reliefParameter}`,
      `another relief setting than that of ${side.element.name}`,
      'leave it away or make the two agree',
      {
        value: formatQuantity(stated, 'bar(g)'),
        bound: formatQuantity(side.setting, 'bar(g)'),
      },
    );
  }
}

/** Stores that state a relief setting but leave it out of the file get that of the relief valve of their side. */
export function fillReliefSettings(
  elements: readonly ReadElement[],
  sides: ReadonlyMap<string, ReliefValve>,
): ReadElement[] {
  return elements.map((element) => {
    const side = sides.get(element.name);
    if (!side || !Object.hasOwn(element.kind.parameters, reliefParameter) || element.places.has(reliefParameter))
      return element;
    return { ...element, parameters: { ...element.parameters, [reliefParameter]: side.setting } };
  });
}

export function readWatched(
  top: Section,
  elements: readonly ReadElement[],
  signals: SignalList,
  sides: ReadonlyMap<string, ReliefValve>,
  ambient: Ambient,
): WatchedSignal[] {
  const drafts = new Map<string, Draft>();
  const draft = (path: string, unit: string): Draft => {
    let one = drafts.get(path);
    if (!one) {
      one = { path, unit, limits: [], vicinity: usualVicinity, lookAhead: usualLookAhead };
      drafts.set(path, one);
    }
    return one;
  };
  for (const element of elements) {
    for (const limit of element.kind.limits) {
      const value = element.parameters[limit.parameter];
      const reading = element.kind.readings[limit.reading] ?? element.kind.states[limit.reading];
      if (reading === undefined || value === undefined || !(Math.abs(value) > 0) || Number.isNaN(value)) continue;
      draft(`${element.name}.${limit.reading}`, reading.unit).limits.push({
        level: limit.level,
        side: limit.side,
        setting: shareOf(value, limit.share ?? 1, element.kind.parameters[limit.parameter]!, ambient),
        meaning: limit.meaning,
        from: `${element.name}.${limit.parameter}`,
      });
    }
    const pressure = pressureReading(element);
    const relief = reliefOf(element, sides.get(element.name));
    if (pressure !== undefined && relief) draft(`${element.name}.${pressure}`, 'Pa').relief = relief;
  }
  readAdditions(top, signals, draft, elements);
  return [...drafts.values()];
}

/** What the store itself states, or else the relief valve of its side. Stated as 0: none. */
function reliefOf(element: ReadElement, side: ReliefValve | undefined): Draft['relief'] | undefined {
  const stated = element.places.has(reliefParameter) ? element.parameters[reliefParameter] : undefined;
  if (stated === 0) return undefined;
  const setting = stated ?? side?.setting;
  return setting === undefined ? undefined : { valve: side?.element.name ?? '', setting };
}

/** 1.1 PS is 1.1 times the gauge pressure: what the wall carries. */
function shareOf(
  value: number,
  share: number,
  declared: { unit: string; difference?: boolean },
  ambient: Ambient,
): number {
  return declared.unit === 'Pa' && !declared.difference
    ? ambient.pressure + (value - ambient.pressure) * share
    : value * share;
}

/** The reading that is the pressure of an oil store's oil: `pressure`, or `oilPressure`, or the only one in Pa. */
function pressureReading(element: ReadElement): string | undefined {
  if (!Object.values(element.kind.ports).includes('oil')) return undefined;
  const inPascal = Object.keys(element.kind.readings).filter((name) => element.kind.readings[name]!.unit === 'Pa');
  return (
    ['pressure', 'oilPressure'].find((name) => inPascal.includes(name)) ??
    (inPascal.length === 1 ? inPascal[0] : undefined)
  );
}

/** `watch: { highLine.pressure: { above: 340 bar(g), level: near relief, meaning: ..., vicinity: 5 %, lookAhead: 0.2 s, relief: valve } }` */
function readAdditions(
  top: Section,
  signals: SignalList,
  draft: (path: string, unit: string) => Draft,
  elements: readonly ReadElement[],
): void {
  for (const [path, section] of top.sections('watch')) {
    const info = signals.resolve(section, '', { text: path, where: section.where }, {});
    const vicinity = section.quantity('vicinity', { unit: '1', least: 0, most: 1 });
    const lookAhead = section.quantity('lookAhead', { unit: 's', least: 0 });
    const relief = readRelief(section, elements);
    const level = section.choice('level', levels);
    const meaning = section.text('meaning');
    const expected = { unit: info?.unit ?? '1', difference: info?.difference };
    const additions: ['above' | 'below', number][] = [];
    for (const side of ['above', 'below'] as const) {
      // Without a signal there is no unit to check against.
      if (!info) section.skip(side);
      const setting = info && section.quantity(side, expected);
      if (setting !== undefined) additions.push([side, setting]);
    }
    section.finish();
    if (!info) continue;
    if (additions.length > 0 && level === undefined && !section.has('level')) {
      section.fail('level', 'missing', `add level: with one of ${levels.join(', ')}`);
    }
    const one = draft(info.path, info.unit);
    if (vicinity !== undefined) one.vicinity = vicinity;
    if (lookAhead !== undefined) one.lookAhead = lookAhead;
    if (relief) one.relief = relief;
    if (level === undefined) continue;
    for (const [side, setting] of additions)
      one.limits.push({
        level,
        side,
        setting,
        meaning: meaning ?? `${info.about} is ${side} the setting of the bench`,
        from: 'watch',
      });
  }
}

function readRelief(section: Section, elements: readonly ReadElement[]): Draft['relief'] {
  const valves = elements.filter(
    (element) => limitsPressure(element) && element.parameters[crackingParameter] !== undefined,
  );
  const names = valves.map((element) => element.name);
  const said = section.choice('relief', names);
  const valve = valves.find((element) => element.name === said);
  return valve && { valve: valve.name, setting: valve.parameters[crackingParameter]! };
}
