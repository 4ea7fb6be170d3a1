import type { CanLayout } from '../message-map.js';

/**
 * A CAN database as the text format `.dbc` holds it: plain data, values and ranges in the units of the file. What the
 * format has and a message map has not (nodes, attributes, value tables) is here, so that a file can be written again.
 */
export interface Database {
  readonly version: string;
  readonly nodes: readonly DatabaseNode[];
  readonly messages: readonly DatabaseMessage[];
  readonly valueTables: readonly { readonly name: string; readonly values: readonly NamedValue[] }[];
  readonly definitions: readonly AttributeDefinition[];
  /** Attributes of the whole database. */
  readonly attributes: Attributes;
  readonly comment: string;
}

export interface DatabaseNode {
  readonly name: string;
  readonly comment: string;
  readonly attributes: Attributes;
}

export type Attributes = Readonly<Record<string, number | string>>;
export type NamedValue = readonly [value: number, name: string];

export interface AttributeDefinition {
  readonly name: string;
  readonly of: 'database' | 'node' | 'message' | 'signal';
  readonly type: 'INT' | 'HEX' | 'FLOAT' | 'STRING' | 'ENUM';
  readonly least?: number;
  readonly most?: number;
  readonly choices?: readonly string[];
  readonly usual?: number | string;
}

export interface DatabaseMessage {
  readonly name: string;
  readonly identifier: number;
  readonly extended: boolean;
  readonly bytes: number;
  readonly flexibleDataRate: boolean;
  readonly bitRateSwitch: boolean;
  /** Nodes that send it; empty where the file says none. */
  readonly senders: readonly string[];
  readonly comment: string;
  readonly attributes: Attributes;
  readonly signals: readonly DatabaseSignal[];
}

export interface DatabaseSignal {
  readonly name: string;
  readonly layout: CanLayout;
  /** As in the file; both 0 where it says none. */
  readonly least: number;
  readonly most: number;
  readonly unit: string;
  readonly receivers: readonly string[];
  readonly comment: string;
  readonly values: readonly NamedValue[];
  readonly attributes: Attributes;
}

/** Name that the format uses where no node is named. */
export const nobody = 'Vector__XXX';

/** Attributes by which the field's tools say what the format itself cannot: cycle and delays in ms, frame format. */
export const usualAttributes = {
  cycle: 'GenMsgCycleTime',
  fastCycle: 'GenMsgCycleTimeFast',
  startDelay: 'GenMsgStartDelayTime',
  sendType: 'GenMsgSendType',
  startValue: 'GenSigStartValue',
  frameFormat: 'VFrameFormat',
  bitRateSwitch: 'CANFD_BRS',
} as const;

/** Values of the attribute VFrameFormat, in their order. */
export const frameFormats: readonly string[] = [
  'StandardCAN',
  'ExtendedCAN',
  'reserved',
  'J1939PG',
  ...Array.from({ length: 10 }, () => 'reserved'),
  'StandardCAN_FD',
  'ExtendedCAN_FD',
];

/** Whether a message is CAN FD: by its length or by the attribute that says its frame format. */
export function isFlexible(
  message: Pick<DatabaseMessage, 'bytes' | 'attributes'>,
  definitions: readonly AttributeDefinition[],
): boolean {
  const format = formatOf(message, definitions);
  return format === 'J1939PG' ? false : message.bytes > 8 || format?.endsWith('_FD') === true;
}

/** Whether a message is a parameter group of SAE J1939. */
export function isParameterGroup(
  message: Pick<DatabaseMessage, 'attributes'>,
  definitions: readonly AttributeDefinition[],
): boolean {
  return formatOf(message, definitions) === 'J1939PG';
}

function formatOf(
  message: Pick<DatabaseMessage, 'attributes'>,
  definitions: readonly AttributeDefinition[],
): string | undefined {
  const definition = definitions.find((one) => one.name === usualAttributes.frameFormat);
  const said = message.attributes[usualAttributes.frameFormat] ?? definition?.usual;
  return typeof said === 'number' ? (definition?.choices ?? frameFormats)[said] : said;
}
