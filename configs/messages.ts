import { examineMap } from '../bridge/examine-map.js';
import { identifierOf, isDirected } from '../bridge/j1939/identifier.js';
import { longestMessage } from '../bridge/j1939/transport.js';
import { receivedCounts } from '../bridge/link-counts.js';
import type { LinkSpec, MapSignal, MessageMap, MessageSpec, Protection } from '../bridge/message-map.js';
import { goesByCycle } from '../bridge/schedule.js';
import { spreadPhases } from '../bridge/spread-phases.js';
import { unitsStoodFor } from '../bridge/stand-ins.js';
import { isPresent } from '../bridge/value-program.js';
import type { Position } from '../runtime/contract.js';
import { overlappingBits } from './can-bits.js';
import type { Names } from './elements.js';
import type { Drivers } from './instruments.js';
import { readLink } from './links.js';
import { readSignal } from './message-signals.js';
import { shown } from './quantity.js';
import { parseFormula } from './requirement-parser.js';
import { lookup, positionIn } from './requirements.js';
import { type Section, suggestion } from './section.js';
import type { SignalList } from './signal-list.js';
import type { Scalar } from './source.js';
import { checkedTicks } from './ticks.js';
import { parseUnit, siUnit } from './units.js';

/** Places of messages and signals by `messages.a.b`, so that complaints about the finished map find their lines. */
type Places = Map<string, Position>;

/**
 * Reads `links:` and `messages:` to a message map. Received messages are declared as signals before the instruments are
 * tied (`declareMessages`), what they drive and what the sent ones carry is looked up after that (`finishMessages`).
 */
export interface PendingMessages {
  readonly links: readonly LinkSpec[];
  /** Also those with problems of their own. */
  readonly linkNames: readonly string[];
  readonly places: Places;
  readonly messages: readonly {
    readonly section: Section;
    readonly name: string;
    readonly signals: readonly [string, Section][];
  }[];
}

export function declareMessages(top: Section, names: Names, signals: SignalList): PendingMessages {
  const links: LinkSpec[] = [];
  const places: Places = new Map();
  const linkNames: string[] = [];
  for (const [name, section] of top.sections('links')) {
    linkNames.push(name);
    names.take(name, section.where, section.path);
    places.set(section.path, section.where);
    const link = readLink(name, section);
    if (link) links.push(link);
  }
  const messages = top.sections('messages').map(([name, section]) => {
    names.take(name, section.where, section.path);
    return { name, section, signals: section.sections('signals', { required: true }) };
  });
  for (const { name, section, signals: fields } of messages) {
    const direction = section.peek('direction');
    if (direction !== 'received') {
      if (direction !== 'sent') signals.unread.add(name);
      continue;
    }
    // What conditions of other messages ask of it: whether it is there.
    for (const count of ['age', 'timedOut'] as const) {
      const { about } = receivedCounts[count];
      signals.add({ path: `${name}.${count}`, group: 'link', unit: count === 'age' ? 's' : '1', about });
    }
    for (const [field, inner] of fields) {
      const target = signals.find(inner.peek('to') ?? '');
      const unit = target?.unit ?? unitOrUndefined(inner.peek('unit') ?? '1');
      if (unit === undefined) signals.unread.add(name);
      else
        signals.add({
          path: `${name}.${field}`,
          group: 'received',
          unit,
          about: inner.peek('about') ?? `${field} as received`,
        });
    }
  }
  return { links, linkNames, places, messages };
}

function unitOrUndefined(text: string): string | undefined {
  try {
    return siUnit(parseUnit(text));
  } catch {
    return undefined;
  }
}

export function finishMessages(
  pending: PendingMessages,
  top: Section,
  step: number,
  signals: SignalList,
  drivers: Drivers,
): MessageMap {
  const places: Places = new Map(pending.places);
  const before = top.problems.count;
  const messages = pending.messages.map((one) =>
    readMessage(one.name, one.section, one.signals, pending, step, signals, drivers, places),
  );
  const withPhase = new Set(pending.messages.filter(({ section }) => section.has('phase')).map(({ name }) => name));
  const map: MessageMap = {
    links: pending.links,
    messages: pending.links
      .filter((link) => link.kind !== 'udp')
      .reduce(
        (all, link) => spreadPhases(all, link, (message) => withPhase.has(message.name)),
        messages.filter((message) => message !== undefined),
      ),
  };
  signals.addCounts(map);
  // What is wrong with the map as a map is said once the parts are right: before that it would say things twice.
  if (top.problems.count === before) {
    for (const problem of examineMap(map)) {
      const where = places.get(problem.path);
      top.problems.all.push(where ? { ...problem, where } : problem);
    }
  }
  return map;
}

function readMessage(
  name: string,
  section: Section,
  fields: readonly [string, Section][],
  pending: PendingMessages,
  step: number,
  signals: SignalList,
  drivers: Drivers,
  places: Places,
): MessageSpec | undefined {
  places.set(section.path, section.where);
  const about = section.text('about') ?? '';
  const direction = section.choice('direction', ['sent', 'received'] as const, { required: true });
  const link = readLinkName(section, pending.links, pending.linkNames);
  const can = link !== undefined && link.kind !== 'udp';
  const group = can ? readParameterGroup(section) : undefined;
  const extended = (section.flag('extended') ?? false) || group !== undefined;
  const said = section.whole(
    'id',
    { least: can ? 0 : 1, most: can ? (extended ? 0x1fffffff : 0x7ff) : 0xffff },
    { required: !section.has('j1939') },
  );
  const identifier = group ?? said;
  const trigger =
    section.choice('trigger', ['cyclic', 'on-change', 'cyclic-and-change', 'on-request'] as const) ?? 'cyclic';
  const every = checkedTicks(section, 'every', step, { required: goesByCycle({ trigger }), least: 1 }) ?? 0;
  const phase = checkedTicks(section, 'phase', step) ?? 0;
  const startDelay = checkedTicks(section, 'startDelay', step) ?? 0;
  const fastEvery = checkedTicks(section, 'fastEvery', step, { least: 1 });
  const timeout = checkedTicks(section, 'timeout', step, { required: direction === 'received' }) ?? 0;
  if (timeout > 0 && timeout < every)
    section.fail('timeout', 'time-out shorter than the cycle', 'make it some cycles long', {
      value: section.text('timeout')!,
    });
  const outOfRange =
    section.choice('outOfRange', ['saturate', 'refuse'] as const) ?? (direction === 'sent' ? 'saturate' : 'refuse');
  const flexibleDataRate = section.flag('flexibleDataRate');
  const bitRateSwitch = section.flag('bitRateSwitch');
  const most = flexibleDataRate ? 64 : group === undefined ? 8 : longestMessage;
  const troubles = fields.filter(([, inner]) => inner.has('trouble')).length;
  const saidBytes = section.whole('bytes', { least: 0, most }, { required: can && troubles === 0 });
  // Codes that the map does not know come too: room for twenty.
  const bytes = troubles === 0 ? saidBytes : (saidBytes ?? Math.max(2 + 4 * troubles, direction === 'sent' ? 8 : 82));
  const protection = readProtection(section);
  const standsFor = section.text('standsFor');
  if (standsFor !== undefined && direction === 'received')
    section.fail('standsFor', 'a message to the bench', 'the bench stands in only for what it sends: leave it away');
  if (standsFor !== undefined && !/^[a-z][A-Za-z0-9]*$/.test(standsFor))
    section.fail('standsFor', 'not a name', 'use letters and digits, a small letter first', {
      value: shown(standsFor),
    });
  const condition = readWhile(section, direction, step, signals);
  const read: MapSignal[] = [];
  for (const [field, inner] of fields) {
    places.set(`${section.path}.${field}`, inner.where);
    const signal = direction && readSignal(field, inner, section, name, direction, can, step, signals, drivers);
    if (signal) read.push(signal);
  }
  if (can && bytes !== undefined) {
    for (const clash of overlappingBits(read, bytes)) {
      const inner = fields.find(([field]) => field === clash.signal)![1];
      inner.fail('can', clash.what, clash.remedy, { value: clash.value, bound: clash.bound });
    }
  }
  section.finish();
  if (!direction || !link || identifier === undefined) return undefined;
  return {
    name,
    about,
    link: link.name,
    direction,
    ...(standsFor === undefined ? {} : { standsFor }),
    ...condition,
    identifier,
    ...(extended ? { extended } : {}),
    ...(group === undefined ? {} : { j1939: true }),
    ...(group !== undefined && direction === 'received' ? { anyPriority: true } : {}),
    ...(flexibleDataRate === undefined ? {} : { flexibleDataRate }),
    ...(bitRateSwitch === undefined ? {} : { bitRateSwitch }),
    ...(bytes === undefined ? {} : { bytes }),
    every,
    phase,
    startDelay,
    timeout,
    trigger,
    ...(fastEvery === undefined ? {} : { fastEvery }),
    outOfRange,
    ...(protection === undefined ? {} : { protection }),
    signals: read,
  };
}

/** `while: life.key is on`: the message goes only while that holds. */
function readWhile(
  section: Section,
  direction: 'sent' | 'received' | undefined,
  step: number,
  signals: SignalList,
): Pick<MessageSpec, 'while' | 'whileText'> {
  const said = section.placed('while');
  if (!said) return {};
  if (direction === 'received') {
    section.fail('while', 'a message to the bench', 'only what the bench sends can wait for something: leave it away');
    return {};
  }
  if (signals.unread.size > 0) return {};
  const tree = section.tree.entries.get('while')!.value as Scalar;
  const formula = parseFormula(
    said.text,
    { signals: lookup(signals.all), step, present: true },
    section.problems,
    section.inner('while'),
    (offset) => positionIn(tree, offset),
  );
  if (!formula) return {};
  if (!isPresent(formula)) {
    section.fail('while', 'more than what is true now', 'compare signals, joined by and, or, not', {
      value: shown(said.text),
    });
    return {};
  }
  return { while: formula, whileText: said.text.trim() };
}

/** `without: [brakes]` of a bench file. */
export function readWithout(top: Section, map: MessageMap): string[] {
  const units = unitsStoodFor(map.messages);
  return (top.texts('without') ?? []).flatMap(({ text, where }) => {
    if (units.includes(text)) return [text];
    top.fail(
      'without',
      'the bench does not stand in for this control unit',
      units.length === 0 ? 'no message says standsFor:' : suggestion(text, units),
      { value: shown(text) },
      where,
    );
    return [];
  });
}

/** `j1939: { pgn: 65265, source: 0, priority: 6, destination: 255 }` in place of `id`: the identifier, or undefined. */
function readParameterGroup(section: Section): number | undefined {
  const inner = section.section('j1939');
  if (!inner) return undefined;
  if (section.has('id')) section.fail('id', 'an identifier and a parameter group', 'keep one of id: and j1939:');
  const pgn = inner.whole('pgn', { least: 0, most: 0x3ffff }, { required: true });
  const source = inner.whole('source', { least: 0, most: 253 }, { required: true });
  const priority = inner.whole('priority', { least: 0, most: 7 }) ?? 6;
  const destination = inner.whole('destination', { least: 0, most: 255 });
  inner.finish();
  if (pgn === undefined || source === undefined) return undefined;
  if (!isDirected(pgn) && destination !== undefined)
    return inner.fail('destination', 'a destination for a group that goes to everybody', 'leave it away', {
      value: String(destination),
      bound: 'PDU format 240 or more',
    });
  if (isDirected(pgn) && (pgn & 0xff) !== 0)
    return inner.fail('pgn', 'the low byte of a group with a destination is 0', 'say the destination by destination:', {
      value: String(pgn),
    });
  return identifierOf({ priority, pgn, source, ...(destination === undefined ? {} : { destination }) });
}

function readLinkName(section: Section, links: readonly LinkSpec[], names: readonly string[]): LinkSpec | undefined {
  const said = section.text('link');
  if (said === undefined) {
    if (section.has('link')) return undefined;
    if (names.length === 1) return links[0];
    return section.fail(
      'link',
      'missing',
      names.length === 0 ? 'declare a link under links:' : `add link: with one of ${names.join(', ')}`,
    );
  }
  if (!names.includes(said))
    return section.fail('link', 'unknown link', suggestion(said, names), { value: shown(said) });
  return links.find((one) => one.name === said);
}

function readProtection(section: Section): Protection | undefined {
  const inner = section.section('protection');
  if (!inner) return undefined;
  const kind = inner.text('is', { required: true }, 'counter-and-crc');
  const settings: Record<string, number | string> = {};
  for (const key of inner.keys()) {
    if (key === 'is') continue;
    if (!/^[a-z][A-Za-z0-9]*$/.test(key)) continue;
    const text = inner.text(key);
    if (text !== undefined) settings[key] = text.trim() !== '' && Number.isFinite(Number(text)) ? Number(text) : text;
  }
  inner.finish();
  return kind === undefined ? undefined : { kind, settings };
}
