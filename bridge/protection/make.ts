import { bitsOf } from '../can-bits.js';
import type { MessageSpec } from '../message-map.js';
import { crcs } from './crc.js';
import { type DataIdMode, ListProfile, LongProfile, NibbleProfile, ShortProfile } from './end-to-end.js';
import { type CounterPlace, type CrcPlace, PlainProtector } from './plain.js';
import type { Protector } from './protector.js';

/** The kinds of protection of a bench file and the settings of each. */
export const protectionKinds = {
  counter: ['start', 'length', 'modulo', 'mostStep'],
  crc: ['crc', 'byte', 'order', 'from', 'to', 'prefix', 'suffix'],
  'counter-and-crc': [
    'start',
    'length',
    'modulo',
    'mostStep',
    'crc',
    'byte',
    'order',
    'from',
    'to',
    'prefix',
    'suffix',
  ],
  'e2e-1': ['dataId', 'mode', 'offset', 'mostStep'],
  'e2e-2': ['dataIds', 'offset', 'mostStep'],
  'e2e-4': ['dataId', 'offset', 'mostStep'],
  'e2e-5': ['dataId', 'offset', 'mostStep'],
  'e2e-11': ['dataId', 'mode', 'offset', 'mostStep'],
  'e2e-22': ['dataIds', 'offset', 'mostStep'],
} as const satisfies Readonly<Record<string, readonly string[]>>;

export type ProtectionKind = keyof typeof protectionKinds;

/** What is wrong with a message's protection. */
export interface ProtectionFault {
  readonly what: string;
  readonly value: string;
  readonly bound: string;
  readonly remedy: string;
}

/** A field of the payload that the protection fills, numbered as in CAN database text. */
export interface ProtectionField {
  readonly name: 'counter' | 'checksum' | 'dataId' | 'length';
  readonly startBit: number;
  readonly length: number;
  readonly byteOrder: 'little' | 'big';
}

export interface ReadProtection {
  readonly protector: Protector | undefined;
  readonly fields: readonly ProtectionField[];
  /** All bits of the fields. */
  readonly bits: readonly number[];
  readonly faults: readonly ProtectionFault[];
}

/** The protector of a message, or undefined without protection. Throws when `readProtection` finds faults. */
export function makeProtector(message: MessageSpec): Protector | undefined {
  const { protector, faults } = readProtection(message);
  const [fault] = faults;
  if (fault)
    throw new Error(
      `messages.${message.name}.protection: ${fault.what}, ${fault.value}, ${fault.bound}; ${fault.remedy}`,
    );
  return protector;
}

/** The byte of the payload in which the checksum begins, or -1 without one. */
export function checkByteOf(message: MessageSpec): number {
  const field = readProtection(message).fields.find(({ name }) => name === 'checksum');
  return field === undefined ? -1 : field.startBit >> 3;
}

/** Reads the settings of a message's protection. */
export function readProtection(message: MessageSpec): ReadProtection {
  const { protection } = message;
  if (!protection) return { protector: undefined, fields: [], bits: [], faults: [] };
  const reader = new Reader(message);
  const { kind } = protection;
  if (!Object.hasOwn(protectionKinds, kind)) {
    const known = Object.keys(protectionKinds).join(', ');
    return {
      protector: undefined,
      fields: [],
      bits: [],
      faults: [{ what: 'unknown protection', value: kind, bound: `known: ${known}`, remedy: 'choose one of them' }],
    };
  }
  const allowed: readonly string[] = protectionKinds[kind as ProtectionKind];
  for (const key of Object.keys(protection.settings))
    if (!allowed.includes(key))
      reader.fail(`unknown setting of ${kind}`, key, `known: ${allowed.join(', ')}`, 'remove it');
  const { protector, fields } = kind.startsWith('e2e-') ? endToEnd(kind, reader) : plain(kind, reader);
  const bits = fields.flatMap((field) => bitsOf({ ...field, signed: false, float: false, scale: 1, offset: 0 }));
  if (bits.some((bit) => bit >= reader.bytes * 8))
    reader.fail(
      'counter or check beyond the payload',
      `bit ${Math.max(...bits)}`,
      `${reader.bytes} bytes`,
      'make the message longer',
    );
  return { protector: reader.faults.length > 0 ? undefined : protector, fields, bits, faults: reader.faults };
}

interface Made {
  protector: Protector;
  fields: ProtectionField[];
}

/** A field of whole bytes from byte `at` on. */
function byteField(
  name: ProtectionField['name'],
  at: number,
  bytes: number,
  byteOrder: 'little' | 'big',
): ProtectionField {
  return { name, startBit: 8 * at + (byteOrder === 'big' ? 7 : 0), length: 8 * bytes, byteOrder };
}

function bitField(name: ProtectionField['name'], startBit: number, length: number): ProtectionField {
  return { name, startBit, length, byteOrder: 'little' };
}

function plain(kind: string, reader: Reader): Made {
  const fields: ProtectionField[] = [];
  let counter: CounterPlace | undefined;
  let check: CrcPlace | undefined;
  if (kind !== 'crc') {
    const start = reader.whole('start', 0, 511);
    const length = reader.whole('length', 1, 16);
    const modulo = reader.whole('modulo', 2, 2 ** length, 2 ** length);
    counter = { start, length, modulo, mostStep: reader.mostStep(modulo) };
    fields.push(bitField('counter', start, length));
  }
  if (kind !== 'counter') {
    const crc = crcs[reader.choice('crc', Object.keys(crcs) as (keyof typeof crcs)[])];
    const at = reader.whole('byte', 0, 63);
    check = {
      crc,
      at,
      order: reader.choice('order', ['little', 'big'] as const, 'little'),
      from: reader.whole('from', 0, reader.bytes, 0),
      to: reader.whole('to', 0, reader.bytes, reader.bytes),
      prefix: reader.bytesOf('prefix'),
      suffix: reader.bytesOf('suffix'),
    };
    fields.push(byteField('checksum', at, crc.width / 8, check.order));
  }
  return { protector: new PlainProtector(counter, check), fields };
}

function endToEnd(kind: string, reader: Reader): Made {
  const offset = reader.whole('offset', 0, 63, 0);
  const nibble = 8 * (offset + 1);
  switch (kind) {
    case 'e2e-1':
    case 'e2e-11': {
      const modes: readonly DataIdMode[] =
        kind === 'e2e-1' ? ['both', 'alternating', 'low', 'nibble'] : ['both', 'nibble'];
      const mode = reader.choice('mode', modes, 'both');
      const dataId = reader.whole('dataId', 0, mode === 'nibble' ? 0xfff : 0xffff);
      return {
        protector: new NibbleProfile(dataId, mode, offset, reader.mostStep(15)),
        fields: [
          byteField('checksum', offset, 1, 'little'),
          bitField('counter', nibble, 4),
          ...(mode === 'nibble' ? [bitField('dataId', nibble + 4, 4)] : []),
        ],
      };
    }
    case 'e2e-2':
    case 'e2e-22': {
      const dataIds = reader.bytesOf('dataIds');
      if (dataIds.length !== 16)
        reader.fail(
          'not 16 data identifiers',
          `${dataIds.length}`,
          '16 bytes',
          "write dataIds: '0x01 0x02 ...', one for each value of the counter",
        );
      return {
        protector: new ListProfile(dataIds, offset, reader.mostStep(16)),
        fields: [byteField('checksum', offset, 1, 'little'), bitField('counter', nibble, 4)],
      };
    }
    case 'e2e-4':
      return {
        protector: new LongProfile(reader.whole('dataId', 0, 0xffffffff), offset, reader.mostStep(0x10000)),
        fields: [
          byteField('length', offset, 2, 'big'),
          byteField('counter', offset + 2, 2, 'big'),
          byteField('dataId', offset + 4, 4, 'big'),
          byteField('checksum', offset + 8, 4, 'big'),
        ],
      };
    default:
      return {
        protector: new ShortProfile(reader.whole('dataId', 0, 0xffff), offset, reader.mostStep(0x100)),
        fields: [byteField('checksum', offset, 2, 'little'), byteField('counter', offset + 2, 1, 'little')],
      };
  }
}

class Reader {
  readonly faults: ProtectionFault[] = [];
  readonly bytes: number;
  private readonly settings: Readonly<Record<string, number | string>>;

  constructor(message: MessageSpec) {
    this.bytes = message.bytes ?? 8;
    this.settings = message.protection!.settings;
  }

  fail(what: string, value: string, bound: string, remedy: string): void {
    this.faults.push({ what, value, bound, remedy });
  }

  whole(key: string, least: number, most: number, usual?: number): number {
    const value = this.settings[key] ?? usual;
    if (typeof value === 'number' && Number.isInteger(value) && value >= least && value <= most) return value;
    this.fail(
      value === undefined ? `${key} is missing` : `${key} is not allowed`,
      `${value ?? 'nothing'}`,
      `a whole number ${least} to ${most}`,
      `give ${key}`,
    );
    return least;
  }

  choice<T extends string>(key: string, choices: readonly T[], usual?: T): T {
    const value = this.settings[key] ?? usual;
    const found = choices.find((choice) => choice === value);
    if (found !== undefined) return found;
    this.fail(
      value === undefined ? `${key} is missing` : `${key} is unknown`,
      `${value ?? 'nothing'}`,
      `one of ${choices.join(', ')}`,
      `give ${key}`,
    );
    return choices[0]!;
  }

  /** Bytes as text: `0x12 0x34` or `18 52`; nothing without the setting. */
  bytesOf(key: string): Uint8Array {
    const value = this.settings[key];
    if (value === undefined) return new Uint8Array(0);
    const parts = String(value)
      .trim()
      .split(/[\s,]+/)
      .map(Number);
    if (parts.every((part) => Number.isInteger(part) && part >= 0 && part <= 255)) return Uint8Array.from(parts);
    this.fail(
      `${key} is not a row of bytes`,
      `${value}`,
      'whole numbers 0 to 255 with spaces between',
      `write it as in ${key}: '0x12 0x34'`,
    );
    return new Uint8Array(0);
  }

  /** Greatest step of the counter that counts as a gap: under half of its range unless said. */
  mostStep(modulo: number): number {
    return this.whole('mostStep', 1, modulo - 1, Math.max(1, Math.floor((modulo - 1) / 2)));
  }
}
