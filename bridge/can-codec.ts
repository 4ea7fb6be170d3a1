import type { CanLayout, MapSignal, MessageSpec } from './message-map.js';
import { fieldVerdicts } from './udp-codec.js';

/** What turns the values of a message into a payload and back. */
export interface PayloadCodec {
  readonly message: MessageSpec;
  /** Payload, bytes; the longest where it varies. */
  readonly length: number;
  readonly count: number;
  /** Whether a payload of this length can be read. */
  fits(length: number): boolean;
  quantise(values: Float64Array, from: number, carried: Float64Array, to: number): number;
  write(bytes: Uint8Array): number;
  read(bytes: Uint8Array, values: Float64Array, to: number, length: number): number;
  carries(index: number): boolean;
}

/**
 * Reads and writes the payload of one CAN message: any start bit, length to 64 bits, both byte orders, signed,
 * unsigned, IEEE 754 floats, scale and offset, multiplexing of any depth. Compiled into tables once; a call allocates
 * nothing. Values are in the units of the map, in map order, like UdpCodec's.
 *
 * A number is moved byte by byte: each piece is some bits of one byte and stands for some bits of the low or high half
 * of the raw number. Raw integers beyond 2^53 are rounded to what a double holds.
 *
 * Bits are numbered as in CAN database text: bit 8 b + i is bit i of byte b; a little-endian signal starts at its least
 * significant bit, a big-endian one at its most significant.
 */
export class CanCodec implements PayloadCodec {
  /** Payload, bytes. */
  readonly length: number;
  readonly count: number;
  private readonly refuses: boolean;
  private readonly fields: readonly Field[];
  /** Indices of the fields, selectors ahead of what they select. */
  readonly order: Int32Array;
  /** Per field of the last `quantise` or `read`: raw number, and 1 when the selectors say that it is there. */
  private readonly raw: Float64Array;
  private readonly present: Uint8Array;
  private readonly halves = new Int32Array(2);
  private readonly single = new Float32Array(this.halves.buffer);
  private readonly double = new Float64Array(this.halves.buffer);

  /** Throws when a signal has no layout on CAN; that bits fit and do not clash has been examined with the map. */
  constructor(readonly message: MessageSpec) {
    this.length = message.bytes ?? 8;
    this.count = message.signals.length;
    this.refuses = message.outOfRange === 'refuse';
    this.fields = message.signals.map((signal) => new Field(signal, message));
    this.order = selectorsFirst(message);
    this.raw = new Float64Array(this.count);
    this.present = new Uint8Array(this.count);
  }

  fits(length: number): boolean {
    return length === this.length;
  }

  /** As UdpCodec.quantise. A signal that the selectors leave out is carried as it came. */
  quantise(values: Float64Array, from: number, carried: Float64Array, to: number): number {
    let saturated = 0;
    for (let k = 0; k < this.count; k += 1) {
      const i = this.order[k];
      const field = this.fields[i];
      let value = values[from + i];
      carried[to + i] = value;
      this.present[i] = this.selected(field) ? 1 : 0;
      if (this.present[i] === 0) continue;
      if (!(value - value === 0)) return -1;
      if (value < field.least) {
        value = field.least;
        saturated += 1;
      } else if (value > field.most) {
        value = field.most;
        saturated += 1;
      }
      const raw = field.rawOf(value);
      this.raw[i] = raw;
      carried[to + i] = raw * field.scale + field.offset;
    }
    return saturated;
  }

  /** Writes the payload of the last `quantise`; its length, bytes. Bits that belong to no signal present are 0. */
  write(bytes: Uint8Array): number {
    for (let i = 0; i < this.length; i += 1) bytes[i] = 0;
    for (let i = 0; i < this.count; i += 1) if (this.present[i] === 1) this.put(bytes, this.fields[i], this.raw[i]);
    return this.length;
  }

  /**
   * Reads a payload into values[to ..] as UdpCodec.read. A signal that the selectors leave out keeps the value that is
   * there; `carries` then says 0 for it.
   */
  read(bytes: Uint8Array, values: Float64Array, to: number): number {
    let verdict: number = fieldVerdicts.fine;
    for (let k = 0; k < this.count; k += 1) {
      const i = this.order[k];
      const field = this.fields[i];
      this.present[i] = this.selected(field) ? 1 : 0;
      if (this.present[i] === 0) continue;
      const raw = this.get(bytes, field);
      this.raw[i] = raw;
      let value = raw * field.scale + field.offset;
      if (!(value - value === 0)) return fieldVerdicts.refused;
      if (value < field.wireLeast || value > field.wireMost) {
        if (this.refuses) return fieldVerdicts.refused;
        verdict = fieldVerdicts.saturated;
      }
      if (value < field.least) value = field.least;
      else if (value > field.most) value = field.most;
      values[to + i] = value;
    }
    return verdict;
  }

  /** Whether the payload of the last call had signal number `index` in it. */
  carries(index: number): boolean {
    return this.present[index] === 1;
  }

  private selected(field: Field): boolean {
    if (field.selector < 0) return true;
    if (this.present[field.selector] === 0) return false;
    const raw = this.raw[field.selector];
    const ranges = field.selectorValues;
    for (let i = 0; i < ranges.length; i += 2) if (raw >= ranges[i] && raw <= ranges[i + 1]) return true;
    return false;
  }

  private get(bytes: Uint8Array, field: Field): number {
    let low = 0;
    let high = 0;
    const { byte, shift, mask, place } = field;
    for (let i = 0; i < byte.length; i += 1) {
      const bits = (bytes[byte[i]] >>> shift[i]) & mask[i];
      if (place[i] < 32) low |= bits << place[i];
      else high |= bits << (place[i] - 32);
    }
    if (field.float) {
      this.halves[0] = low;
      this.halves[1] = high;
      return field.bits === 32 ? this.single[0] : this.double[0];
    }
    const unused = field.unused;
    if (field.bits <= 32) return field.signed ? (low << unused) >> unused : low >>> 0;
    return (field.signed ? (high << unused) >> unused : high >>> 0) * 0x100000000 + (low >>> 0);
  }

  private put(bytes: Uint8Array, field: Field, raw: number): void {
    let low = 0;
    let high = 0;
    if (field.float) {
      if (field.bits === 32) this.single[0] = raw;
      else this.double[0] = raw;
      low = this.halves[0];
      high = this.halves[1];
    } else {
      const upper = Math.floor(raw / 0x100000000);
      low = (raw - upper * 0x100000000) | 0;
      high = upper | 0;
    }
    const { byte, shift, mask, place } = field;
    for (let i = 0; i < byte.length; i += 1) {
      const bits = place[i] < 32 ? low >>> place[i] : high >>> (place[i] - 32);
      bytes[byte[i]] |= (bits & mask[i]) << shift[i];
    }
  }
}

/** One signal as tables. Piece i: `mask[i]` of byte `byte[i]` shifted down by `shift[i]` is bit `place[i]` and up of raw. */
export class Field {
  readonly bits: number;
  readonly signed: boolean;
  readonly float: boolean;
  readonly scale: number;
  readonly offset: number;
  readonly least: number;
  readonly most: number;
  readonly wireLeast: number;
  readonly wireMost: number;
  /** Bits of the upper half (of the only one to 32 bits) above the number. */
  readonly unused: number;
  readonly byte: Uint16Array;
  readonly shift: Uint8Array;
  readonly mask: Uint8Array;
  readonly place: Uint8Array;
  /** Index of the signal that selects this one, or -1, and the raw values of it that do: least, most, least, most, ... */
  readonly selector: number;
  readonly selectorValues: Float64Array;
  readonly rawLeast: number;
  readonly rawMost: number;

  constructor(signal: MapSignal, message: MessageSpec) {
    const layout = signal.can;
    if (!layout)
      throw new Error(`messages.${message.name}.${signal.name} has no layout on CAN, give it start bit and length`);
    if (layout.float && layout.length !== 32 && layout.length !== 64)
      throw new Error(
        `messages.${message.name}.${signal.name}: a float of ${layout.length} bits, 32 or 64 bits, change its length`,
      );
    this.bits = layout.length;
    this.signed = layout.signed;
    this.float = layout.float;
    this.scale = layout.scale;
    this.offset = layout.offset;
    this.least = signal.least;
    this.most = signal.most;
    [this.rawLeast, this.rawMost] = rawLimits(layout);
    this.unused = (32 - (layout.length % 32)) % 32;
    const pieces = piecesOf(layout);
    this.byte = Uint16Array.from(pieces, (piece) => piece.byte);
    this.shift = Uint8Array.from(pieces, (piece) => piece.shift);
    this.mask = Uint8Array.from(pieces, (piece) => (1 << piece.count) - 1);
    this.place = Uint8Array.from(pieces, (piece) => piece.place);
    const by = layout.selectedBy;
    this.selector = by ? message.signals.findIndex((other) => other.name === by.signal) : -1;
    if (by && this.selector < 0)
      throw new Error(`messages.${message.name}.${signal.name}: no selector ${by.signal}, name one of the message`);
    this.selectorValues = Float64Array.from(by?.values.flat() ?? []);
    const carried = [signal.least, signal.most].map((end) => this.rawOf(end) * this.scale + this.offset);
    this.wireLeast = Math.min(signal.least, ...carried);
    this.wireMost = Math.max(signal.most, ...carried);
  }

  /** The raw number nearest to `value`, inside the field. */
  rawOf(value: number): number {
    const exact = (value - this.offset) / this.scale;
    if (this.float)
      return this.bits === 32 ? Math.fround(Math.min(this.rawMost, Math.max(this.rawLeast, exact))) : exact;
    return Math.min(this.rawMost, Math.max(this.rawLeast, Math.round(exact)));
  }
}

export interface Piece {
  byte: number;
  shift: number;
  count: number;
  /** Bit of the raw number that the lowest bit of the piece is. */
  place: number;
}

/** A signal as pieces of bytes, none across the middle of a 64-bit number. */
export function piecesOf(layout: CanLayout): Piece[] {
  const pieces: Piece[] = [];
  const { startBit, length, byteOrder } = layout;
  // From the least significant bit up: little endian upwards, big endian down the bytes.
  let bit = startBit;
  if (byteOrder === 'big') for (let i = 1; i < length; i += 1) bit = bit % 8 === 0 ? bit + 15 : bit - 1;
  for (let place = 0; place < length; place += 1) {
    const last = pieces.at(-1);
    const byte = bit >> 3;
    if (last && last.byte === byte && last.shift + last.count === bit % 8 && place !== 32) last.count += 1;
    else pieces.push({ byte, shift: bit % 8, count: 1, place });
    bit = byteOrder === 'little' || bit % 8 < 7 ? bit + 1 : bit - 15;
  }
  return pieces;
}

/** Least and most raw number of a field; of integers beyond 53 bits the doubles next to the ends, inside. */
function rawLimits(layout: CanLayout): [number, number] {
  if (layout.float)
    return layout.length === 32
      ? [-3.4028234663852886e38, 3.4028234663852886e38]
      : [-Number.MAX_VALUE, Number.MAX_VALUE];
  const bits = layout.signed ? layout.length - 1 : layout.length;
  const most = bits <= 53 ? 2 ** bits - 1 : 2 ** bits - 2 ** (bits - 53);
  return [layout.signed ? -(2 ** bits) : 0, most];
}

function selectorsFirst(message: MessageSpec): Int32Array {
  const order: number[] = [];
  const visit = (index: number, under: readonly number[]): void => {
    if (order.includes(index)) return;
    const signal = message.signals[index];
    if (under.includes(index))
      throw new Error(`messages.${message.name}.${signal.name} selects itself, break the ring of selectors`);
    const by = signal.can?.selectedBy;
    const selector = by ? message.signals.findIndex((other) => other.name === by.signal) : -1;
    if (selector >= 0) visit(selector, [...under, index]);
    order.push(index);
  };
  message.signals.forEach((_, i) => {
    visit(i, []);
  });
  return Int32Array.from(order);
}
