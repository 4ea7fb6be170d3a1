import { lamps } from '../j1939/trouble-codec.js';
import type { CanLayout, MapSignal, MessageMap, MessageSpec } from '../message-map.js';
import { readProtection } from '../protection/make.js';
import {
  type AttributeDefinition,
  type Attributes,
  type Database,
  type DatabaseMessage,
  type DatabaseSignal,
  frameFormats,
  usualAttributes,
} from './database.js';

export interface FromMapOptions {
  /** Names of the two nodes. */
  readonly bench?: string;
  readonly controller?: string;
  /** Length of a tick, s. */
  readonly step: number;
}

const sendTypes = ['Cyclic', 'OnChange', 'CyclicAndOnChange', 'OnRequest'] as const;
const sendTypeOf = { cyclic: 0, 'on-change': 1, 'cyclic-and-change': 2, 'on-request': 3 } as const;

const definitions: readonly AttributeDefinition[] = [
  { name: usualAttributes.cycle, of: 'message', type: 'INT', least: 0, most: 3600000, usual: 0 },
  { name: usualAttributes.fastCycle, of: 'message', type: 'INT', least: 0, most: 3600000, usual: 0 },
  { name: usualAttributes.startDelay, of: 'message', type: 'INT', least: 0, most: 3600000, usual: 0 },
  { name: usualAttributes.sendType, of: 'message', type: 'ENUM', choices: sendTypes, usual: 'Cyclic' },
  { name: usualAttributes.frameFormat, of: 'message', type: 'ENUM', choices: frameFormats, usual: 'StandardCAN' },
  { name: usualAttributes.bitRateSwitch, of: 'message', type: 'ENUM', choices: ['0', '1'], usual: '0' },
  { name: usualAttributes.startValue, of: 'signal', type: 'FLOAT', least: -1e300, most: 1e300, usual: 0 },
  { name: 'BusType', of: 'database', type: 'STRING', usual: 'CAN' },
];

/**
 * The CAN database of one link of a map, with the counters and checksums that protect its messages as signals. Throws
 * for a link that is not CAN.
 */
export function databaseOf(map: MessageMap, link: string, options: FromMapOptions): Database {
  const spec = map.links.find((one) => one.name === link);
  if (!spec || spec.kind === 'udp')
    throw new Error(`link ${link} ${spec ? 'is UDP' : 'is not in the map'}: a CAN database needs a link that is CAN`);
  const bench = options.bench ?? 'Bench';
  const controller = options.controller ?? 'Controller';
  const own = map.messages.filter((message) => message.link === link);
  const flexible = own.some((message) => message.flexibleDataRate);
  return {
    version: '',
    comment: '',
    nodes: [
      { name: bench, comment: 'the bench: stands in for the vehicle', attributes: {} },
      { name: controller, comment: 'the control unit', attributes: {} },
    ],
    valueTables: [],
    definitions,
    attributes: { BusType: flexible ? 'CAN FD' : 'CAN' },
    messages: own.map((message) => {
      const [from, to] = message.direction === 'sent' ? [bench, controller] : [controller, bench];
      return messageOf(message, from, to, options.step);
    }),
  };
}

function messageOf(message: MessageSpec, sender: string, receiver: string, step: number): DatabaseMessage {
  const flexible = message.flexibleDataRate === true;
  const milliseconds = (ticks: number): number => Math.round(ticks * step * 1000);
  const format = frameFormats.indexOf(
    message.j1939 ? 'J1939PG' : `${message.extended ? 'Extended' : 'Standard'}CAN${flexible ? '_FD' : ''}`,
  );
  const attributes: Attributes = {
    ...(message.every > 0 ? { [usualAttributes.cycle]: milliseconds(message.every) } : {}),
    ...(message.fastEvery === undefined ? {} : { [usualAttributes.fastCycle]: milliseconds(message.fastEvery) }),
    ...(message.startDelay > 0 ? { [usualAttributes.startDelay]: milliseconds(message.startDelay) } : {}),
    ...(message.trigger === 'cyclic' ? {} : { [usualAttributes.sendType]: sendTypeOf[message.trigger] }),
    ...(format > 0 ? { [usualAttributes.frameFormat]: format } : {}),
    ...(message.bitRateSwitch ? { [usualAttributes.bitRateSwitch]: 1 } : {}),
  };
  const guards: DatabaseSignal[] = readProtection(message).fields.map(({ name, ...place }) => ({
    name: `${message.name}${name[0]!.toUpperCase()}${name.slice(1)}`,
    layout: { ...place, signed: false, float: false, scale: 1, offset: 0 },
    least: 0,
    most: 2 ** place.length - 1,
    unit: '',
    receivers: [receiver],
    comment: `${name} of the protection ${message.protection!.kind}`,
    values: [],
    attributes: {},
  }));
  return {
    name: message.name,
    identifier: message.identifier,
    extended: message.extended === true,
    bytes: message.bytes ?? 8,
    flexibleDataRate: flexible,
    bitRateSwitch: message.bitRateSwitch === true,
    senders: [sender],
    comment: commentOf(message),
    attributes,
    signals: [
      ...message.signals
        .filter((signal) => signal.trouble === undefined)
        .map((signal) => signalOf(signal, message, receiver)),
      ...guards,
    ],
  };
}

/** What a message says of itself, with the trouble codes, which have no place of their own in its bits. */
function commentOf(message: MessageSpec): string {
  const codes = message.signals.flatMap(({ name, trouble }) =>
    trouble === undefined ? [] : [`${name} SPN ${trouble.spn} FMI ${trouble.fmi}`],
  );
  return codes.length === 0 ? message.about : `${message.about || message.name}; trouble codes: ${codes.join(', ')}`;
}

function lampLayout(lamp: keyof typeof lamps): CanLayout {
  return { startBit: lamps[lamp], length: 2, byteOrder: 'little', signed: false, float: false, scale: 1, offset: 0 };
}

function signalOf(signal: MapSignal, message: MessageSpec, receiver: string): DatabaseSignal {
  const layout = signal.lamp === undefined ? signal.can : lampLayout(signal.lamp);
  if (!layout) throw new Error(`messages.${message.name}.${signal.name} has no layout on CAN`);
  const start = layout.float ? signal.substitute : Math.round((signal.substitute - layout.offset) / layout.scale);
  return {
    name: signal.name,
    layout,
    least: signal.least,
    most: signal.most,
    unit: signal.unit,
    receivers: [receiver],
    comment: signal.about,
    values: Object.entries(signal.names ?? {}).map(([name, value]) => [rawOf(value, layout), name]),
    attributes: message.direction === 'received' && start !== 0 ? { [usualAttributes.startValue]: start } : {},
  };
}

/** Names of a database stand at raw values, those of a map at values in the signal's unit. */
function rawOf(value: number, layout: { readonly scale: number; readonly offset: number }): number {
  return Math.round((value - layout.offset) / layout.scale);
}
