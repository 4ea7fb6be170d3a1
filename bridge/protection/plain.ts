import type { Crc } from './crc.js';
import { type Protector, wrongCheck } from './protector.js';

export interface CounterPlace {
  /** Lowest bit, numbered as in CAN database text, and number of bits (little endian). */
  readonly start: number;
  readonly length: number;
  readonly modulo: number;
  readonly mostStep: number;
}

export interface CrcPlace {
  readonly crc: Crc;
  /** First byte of the check in the payload. */
  readonly at: number;
  readonly order: 'little' | 'big';
  /** The check is over payload bytes from .. to (exclusive), without its own. */
  readonly from: number;
  readonly to: number;
  /** Bytes that are no part of the payload, ahead of it and behind it. */
  readonly prefix: Uint8Array;
  readonly suffix: Uint8Array;
}

/** A counter of any place and a checksum over stated bytes, either or both. */
export class PlainProtector implements Protector {
  readonly modulo: number;
  readonly mostStep: number;

  constructor(
    readonly counter: CounterPlace | undefined,
    readonly place: CrcPlace | undefined,
  ) {
    this.modulo = counter?.modulo ?? 0;
    this.mostStep = counter?.mostStep ?? 0;
  }

  protect(payload: Uint8Array, _length: number, counter: number): void {
    if (this.counter !== undefined) writeBits(payload, this.counter.start, this.counter.length, counter);
    const place = this.place;
    if (place === undefined) return;
    const value = compute(place, payload);
    const bytes = place.crc.width >> 3;
    for (let i = 0; i < bytes; i += 1)
      payload[place.at + i] = value >>> (8 * (place.order === 'little' ? i : bytes - 1 - i));
  }

  check(payload: Uint8Array, _length: number): number {
    const place = this.place;
    if (place !== undefined) {
      const value = compute(place, payload);
      const bytes = place.crc.width >> 3;
      for (let i = 0; i < bytes; i += 1)
        if (payload[place.at + i] !== ((value >>> (8 * (place.order === 'little' ? i : bytes - 1 - i))) & 0xff))
          return wrongCheck;
    }
    if (this.counter === undefined) return 0;
    const counter = readBits(payload, this.counter.start, this.counter.length);
    return counter < this.modulo ? counter : wrongCheck;
  }
}

function compute(place: CrcPlace, payload: Uint8Array): number {
  const { crc, at, from, to } = place;
  let register = crc.run(crc.initial, place.prefix, 0, place.prefix.length);
  const end = at + (crc.width >> 3);
  register = crc.run(register, payload, from, at < to ? Math.max(from, at) : to);
  register = crc.run(register, payload, Math.max(from, end), to);
  register = crc.run(register, place.suffix, 0, place.suffix.length);
  return crc.finish(register);
}

export function writeBits(payload: Uint8Array, start: number, length: number, value: number): void {
  for (let i = 0; i < length; i += 1) {
    const bit = start + i;
    const mask = 1 << (bit & 7);
    if ((value >>> i) & 1) payload[bit >> 3] |= mask;
    else payload[bit >> 3] &= ~mask;
  }
}

export function readBits(payload: Uint8Array, start: number, length: number): number {
  let value = 0;
  for (let i = 0; i < length; i += 1) {
    const bit = start + i;
    value |= ((payload[bit >> 3] >>> (bit & 7)) & 1) << i;
  }
  return value;
}
