import { crc32 } from './checksums.js';
import type { MapSignal, MessageMap, MessageSpec, WireType } from './message-map.js';

/**
 * The fixed layout of a datagram: a header, the fields of the message in map order, a CRC-32 over all before it. All
 * little-endian, every number aligned to its own size counted from the first byte, gaps filled with explicit zero
 * bytes, so that a packed and an unpacked C struct are the same bytes.
 *
 * | offset | type | header                                                                                       |
 * |-------:|------|----------------------------------------------------------------------------------------------|
 * |      0 | u32  | magic: the ASCII letters `OILS`                                                                |
 * |      4 | u8   | version of this layout                                                                         |
 * |      5 | u8   | kind: 1 message, 2 end, 3 done, 4 hello                                                        |
 * |      6 | u16  | number of the message; 0 for the other kinds                                                   |
 * |      8 | u32  | sequence: counts up by one per datagram of this message (or of this kind), modulo 2^32         |
 * |     12 | u32  | tick, modulo 2^32: the bench writes its own, the controller echoes the newest that it has seen |
 * |     16 | u32  | checksum of the message map                                                                    |
 */
export const header = {
  magic: 0,
  version: 4,
  kind: 5,
  message: 6,
  sequence: 8,
  tick: 12,
  map: 16,
  length: 20,
} as const;

/** `OILS` read as a little-endian number. */
export const magic = 0x534c494f;
export const version = 1;

/** What a datagram is: a message of the map, the barrier's two words, or `I have just started`. */
export const kinds = { message: 1, end: 2, done: 3, hello: 4 } as const;

/** Length of a datagram without fields: header and checksum. */
export const controlLength = header.length + 4;

/** The largest datagram that an Ethernet frame of 1500 bytes carries whole over IPv4 (RFC 791, RFC 768). */
export const greatestLength = 1500 - 20 - 8;

export const sizes: Readonly<Record<WireType, number>> = {
  u8: 1,
  i8: 1,
  u16: 2,
  i16: 2,
  u32: 4,
  i32: 4,
  f32: 4,
  f64: 8,
};

/** Least and greatest number that a wire type carries. */
export const limits: Readonly<Record<WireType, readonly [number, number]>> = {
  u8: [0, 0xff],
  i8: [-0x80, 0x7f],
  u16: [0, 0xffff],
  i16: [-0x8000, 0x7fff],
  u32: [0, 0xffffffff],
  i32: [-0x80000000, 0x7fffffff],
  f32: [-3.4028234663852886e38, 3.4028234663852886e38],
  f64: [-Number.MAX_VALUE, Number.MAX_VALUE],
};

export interface UdpField {
  readonly signal: MapSignal;
  /** Bytes from the start of the datagram. */
  readonly offset: number;
  readonly size: number;
}

export interface UdpLayout {
  readonly message: MessageSpec;
  readonly fields: readonly UdpField[];
  /** Zero bytes between fields: [offset, count]. */
  readonly padding: readonly (readonly [number, number])[];
  readonly checksumAt: number;
  /** Of the whole datagram, bytes. */
  readonly length: number;
}

export function udpLayout(message: MessageSpec): UdpLayout {
  const padding: [number, number][] = [];
  let at: number = header.length;
  const align = (size: number): void => {
    const gap = (size - (at % size)) % size;
    if (gap > 0) padding.push([at, gap]);
    at += gap;
  };
  const fields = message.signals.map((signal) => {
    const size = sizes[signal.type];
    align(size);
    const field = { signal, offset: at, size };
    at += size;
    return field;
  });
  align(4);
  return { message, fields, padding, checksumAt: at, length: at + 4 };
}

/** The wire number nearest to `value` (in the signal's unit), inside the type. */
export function wireNumber(signal: MapSignal, value: number): number {
  const [low, high] = limits[signal.type];
  const exact = Math.min(high, Math.max(low, (value - signal.offset) / signal.scale));
  if (signal.type === 'f64') return exact;
  return signal.type === 'f32' ? Math.fround(exact) : Math.round(exact);
}

/**
 * The text whose CRC-32 stands in every header: all that both ends must agree on to understand each other's numbers.
 * One line per message, then one per signal. What only the bench needs (paths, texts, cycles, addresses, time-outs) is
 * not in it, so that these may change without a new build of the controller.
 */
export function canonicalText(map: MessageMap): string {
  const lines: string[] = [`layout ${version}`];
  for (const message of map.messages) {
    lines.push(`message ${message.link} ${message.direction} ${message.identifier} ${message.name}`);
    for (const signal of message.signals) {
      const names = Object.entries(signal.names ?? {}).map(([name, value]) => ` ${name}=${value}`);
      lines.push(
        `signal ${signal.name} ${signal.type} scale ${signal.scale} offset ${signal.offset} range ${signal.least} ${signal.most} unit ${signal.unit}${names.join('')}`,
      );
    }
  }
  return `${lines.join('\n')}\n`;
}

/** Checksum of the map, as a signed 32-bit number (see checksums.ts). */
export function mapChecksum(map: MessageMap): number {
  const text = new TextEncoder().encode(canonicalText(map));
  return crc32(text, 0, text.length);
}
