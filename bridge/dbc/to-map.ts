import type { CanLayout, MapSignal, MessageSpec } from '../message-map.js';
import {
  type Database,
  type DatabaseMessage,
  type DatabaseSignal,
  isParameterGroup,
  usualAttributes,
} from './database.js';

export interface ToMapOptions {
  readonly link: string;
  /** The node that is the control unit: what it sends, the bench receives; all else the bench sends. */
  readonly controller: string;
  /** Length of a tick, s. */
  readonly step: number;
}

export interface ImportedMessages {
  readonly messages: readonly MessageSpec[];
  /** What the map cannot say as the file does, and what was assumed. */
  readonly remarks: readonly string[];
}

/**
 * The messages of a database as those of a link. Paths are empty: what a sent signal carries and a received one drives
 * is for the bench file to say. Units stay texts of the file (`unitScale` 1); no signal is left away.
 */
export function messagesOf(database: Database, options: ToMapOptions): ImportedMessages {
  const remarks: string[] = [];
  const names = new Set<string>();
  if (!database.nodes.some((node) => node.name === options.controller))
    remarks.push(
      `the file has no node ${options.controller}: the bench sends all of its messages; its nodes: ${database.nodes.map((node) => node.name).join(', ') || 'none'}`,
    );
  const messages = database.messages.map((message) => messageOf(message, database, options, names, remarks));
  return { messages, remarks };
}

function messageOf(
  message: DatabaseMessage,
  database: Database,
  options: ToMapOptions,
  names: Set<string>,
  remarks: string[],
): MessageSpec {
  const received = message.senders.includes(options.controller);
  const name = free(message.name, names, `message ${message.name}`, remarks);
  const ticksOf = (attribute: string): number | undefined => {
    const said = numberOf(database, message.attributes[attribute], attribute);
    if (said === undefined || said <= 0) return undefined;
    const ticks = said / 1000 / options.step;
    if (Math.abs(ticks - Math.round(ticks)) > 1e-6 || ticks < 1)
      remarks.push(
        `message ${message.name}: ${attribute} ${said} ms is no whole number of ticks, ${Math.max(1, Math.round(ticks))} taken`,
      );
    return Math.max(1, Math.round(ticks));
  };
  const every = ticksOf(usualAttributes.cycle);
  const fast = ticksOf(usualAttributes.fastCycle);
  const sendType = textOf(database, message.attributes[usualAttributes.sendType], usualAttributes.sendType);
  const onChange = /change/i.test(sendType);
  const trigger =
    /request/i.test(sendType) && message.extended && isParameterGroup(message, database.definitions)
      ? 'on-request'
      : onChange
        ? /^onchange/i.test(sendType) || every === undefined
          ? 'on-change'
          : 'cyclic-and-change'
        : 'cyclic';
  if (every === undefined && trigger === 'cyclic') remarks.push(`message ${message.name} says no cycle: 100 ms taken`);
  const group = message.extended && isParameterGroup(message, database.definitions);
  const cycle =
    trigger === 'on-request' ? 0 : (every ?? (trigger === 'cyclic' ? Math.max(1, Math.round(0.1 / options.step)) : 0));
  const inner = new Set<string>();
  const renamed = new Map<string, string>();
  for (const signal of message.signals)
    renamed.set(signal.name, free(signal.name, inner, `signal ${message.name}.${signal.name}`, remarks));
  return {
    name,
    about: message.comment,
    link: options.link,
    direction: received ? 'received' : 'sent',
    identifier: message.identifier,
    ...(message.extended ? { extended: true } : {}),
    ...(group ? { j1939: true, ...(received ? { anyPriority: true } : {}) } : {}),
    ...(message.flexibleDataRate ? { flexibleDataRate: true } : {}),
    ...(message.bitRateSwitch ? { bitRateSwitch: true } : {}),
    bytes: message.bytes,
    every: cycle,
    phase: 0,
    startDelay: ticksOf(usualAttributes.startDelay) ?? 0,
    timeout: received ? Math.max(1, 5 * (cycle || Math.round(0.1 / options.step))) : 0,
    trigger,
    ...(fast === undefined ? {} : { fastEvery: fast }),
    outOfRange: received ? 'refuse' : 'saturate',
    signals: message.signals.map((signal) => signalOf(signal, renamed, database, remarks, message.name, received)),
  };
}

function signalOf(
  signal: DatabaseSignal,
  renamed: ReadonlyMap<string, string>,
  database: Database,
  remarks: string[],
  messageName: string,
  received: boolean,
): MapSignal {
  const { layout } = signal;
  const [least, most] = signal.least === 0 && signal.most === 0 ? rangeOf(layout) : [signal.least, signal.most];
  const start = numberOf(database, signal.attributes[usualAttributes.startValue], usualAttributes.startValue);
  const wanted = received && start !== undefined ? (layout.float ? start : start * layout.scale + layout.offset) : 0;
  const substitute = Math.min(most, Math.max(least, wanted));
  if (signal.least > signal.most)
    remarks.push(`signal ${messageName}.${signal.name}: its range ${signal.least} .. ${signal.most} is upside down`);
  const inner = new Set<string>();
  const names = Object.fromEntries(
    signal.values.map(([raw, name]) => [
      free(name, inner, `value ${raw} of ${messageName}.${signal.name}`, remarks),
      raw * layout.scale + layout.offset,
    ]),
  );
  return {
    name: renamed.get(signal.name)!,
    path: '',
    about: signal.comment || signal.name,
    unit: signal.unit || '1',
    unitScale: 1,
    unitOffset: 0,
    type: 'f32',
    scale: 1,
    offset: 0,
    least: Math.min(least, most),
    most: Math.max(least, most),
    substitute,
    ...(signal.values.length > 0 ? { names } : {}),
    can: layout.selectedBy
      ? { ...layout, selectedBy: { ...layout.selectedBy, signal: renamed.get(layout.selectedBy.signal)! } }
      : layout,
  };
}

/** What the bits can say. */
function rangeOf(layout: CanLayout): [number, number] {
  if (layout.float) return [-3.4028234663852886e38, 3.4028234663852886e38];
  const low = layout.signed ? -(2 ** (layout.length - 1)) : 0;
  const high = layout.signed ? 2 ** (layout.length - 1) - 1 : 2 ** layout.length - 1;
  const ends = [low, high].map((raw) => raw * layout.scale + layout.offset);
  return [Math.min(...ends), Math.max(...ends)];
}

/** A name of letters and digits, a letter first, that is not taken: `Engine_Speed` becomes `EngineSpeed`. */
function free(name: string, taken: Set<string>, what: string, remarks: string[]): string {
  const parts = name.split(/[^A-Za-z0-9]+/).filter((part) => part !== '');
  let bare = parts.map((part, i) => (i === 0 ? part : part[0]!.toUpperCase() + part.slice(1))).join('');
  if (!/^[A-Za-z]/.test(bare)) bare = `n${bare}`;
  let found = bare;
  for (let i = 2; taken.has(found); i += 1) found = `${bare}n${i}`;
  taken.add(found);
  if (found !== name) remarks.push(`${what} is called ${found}`);
  return found;
}

function numberOf(database: Database, said: number | string | undefined, attribute: string): number | undefined {
  const value = said ?? database.definitions.find((one) => one.name === attribute)?.usual;
  return typeof value === 'number'
    ? value
    : value !== undefined && value !== '' && Number.isFinite(Number(value))
      ? Number(value)
      : undefined;
}

function textOf(database: Database, said: number | string | undefined, attribute: string): string {
  const definition = database.definitions.find((one) => one.name === attribute);
  const value = said ?? definition?.usual ?? '';
  return typeof value === 'number' ? (definition?.choices?.[value] ?? '') : value;
}
