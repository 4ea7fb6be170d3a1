import { crc32 } from './checksums.js';
import type { MapSignal, MessageSpec } from './message-map.js';
import { controlLength, header, kinds, magic, type UdpLayout, udpLayout, version, wireNumber } from './udp-layout.js';

/** A buffer for one datagram with its view, made once. */
export class Datagram {
  readonly bytes: Uint8Array;
  readonly view: DataView;

  constructor(readonly capacity: number) {
    this.bytes = new Uint8Array(capacity);
    this.view = new DataView(this.bytes.buffer);
  }
}

/** What a look at header and checksum says of a datagram. */
export const verdicts = { sound: 0, malformed: 1, wrongChecksum: 2, wrongMap: 3, wrongLength: 4 } as const;

/** What the fields of a sound message say: all inside their range, some brought into it, or not to be used. */
export const fieldVerdicts = { fine: 0, saturated: 1, refused: 2 } as const;

const typeNumbers = { u8: 0, i8: 1, u16: 2, i16: 3, u32: 4, i32: 5, f32: 6, f64: 7 } as const;

/**
 * Reads and writes one message of the map. Tables made once; a call allocates nothing. Values are in the units of the
 * map, in map order, in a slice of a Float64Array that the caller names by its first index.
 */
export class UdpCodec {
  readonly layout: UdpLayout;
  readonly length: number;
  readonly count: number;
  private readonly refuses: boolean;
  private readonly number: number;
  private readonly type: Uint8Array;
  private readonly at: Int32Array;
  private readonly scale: Float64Array;
  private readonly offset: Float64Array;
  private readonly least: Float64Array;
  private readonly most: Float64Array;
  /** The range widened by what rounding to the wire adds: a bound that was sent must come back as inside. */
  private readonly wireLeast: Float64Array;
  private readonly wireMost: Float64Array;
  /** Offsets of the padding bytes. */
  private readonly gaps: Int32Array;
  /** The numbers of the last `quantise`, as they go on the wire. */
  private readonly wire: Float64Array;

  constructor(
    readonly message: MessageSpec,
    private readonly mapChecksum: number,
  ) {
    const { signals } = message;
    const column = (value: (signal: MapSignal) => number): Float64Array => Float64Array.from(signals, value);
    const carried = (signal: MapSignal, value: number): number =>
      wireNumber(signal, value) * signal.scale + signal.offset;
    this.layout = udpLayout(message);
    this.length = this.layout.length;
    this.count = signals.length;
    this.refuses = message.outOfRange === 'refuse';
    this.number = message.identifier;
    this.type = Uint8Array.from(signals, (signal) => typeNumbers[signal.type]);
    this.at = Int32Array.from(this.layout.fields, (field) => field.offset);
    this.gaps = Int32Array.from(
      this.layout.padding.flatMap(([from, count]) => Array.from({ length: count }, (_, i) => from + i)),
    );
    this.scale = column((signal) => signal.scale);
    this.offset = column((signal) => signal.offset);
    this.least = column((signal) => signal.least);
    this.most = column((signal) => signal.most);
    this.wireLeast = column((signal) => Math.min(signal.least, carried(signal, signal.least)));
    this.wireMost = column((signal) => Math.max(signal.most, carried(signal, signal.most)));
    this.wire = new Float64Array(signals.length);
  }

  /**
   * Brings values[from ..] into range and onto the wire's steps; writes what the wire will carry to carried[to ..].
   * Returns how many values had to be brought into range, or -1 when one is not finite: such a message is not sent.
   */
  quantise(values: Float64Array, from: number, carried: Float64Array, to: number): number {
    let saturated = 0;
    for (let i = 0; i < this.count; i += 1) {
      let value = values[from + i];
      if (!(value - value === 0)) return -1;
      if (value < this.least[i]) {
        value = this.least[i];
        saturated += 1;
      } else if (value > this.most[i]) {
        value = this.most[i];
        saturated += 1;
      }
      const exact = (value - this.offset[i]) / this.scale[i];
      const type = this.type[i];
      const wire = type === 7 ? exact : type === 6 ? Math.fround(exact) : Math.round(exact);
      this.wire[i] = wire;
      carried[to + i] = wire * this.scale[i] + this.offset[i];
    }
    return saturated;
  }

  /** Writes the datagram of the last `quantise`; its length, bytes. */
  write(datagram: Datagram, sequence: number, tick: number): number {
    const view = datagram.view;
    writeHeader(view, kinds.message, this.number, sequence, tick, this.mapChecksum);
    for (let i = 0; i < this.gaps.length; i += 1) datagram.bytes[this.gaps[i]] = 0;
    for (let i = 0; i < this.count; i += 1) {
      const at = this.at[i];
      const wire = this.wire[i];
      switch (this.type[i]) {
        case 0:
          view.setUint8(at, wire);
          break;
        case 1:
          view.setInt8(at, wire);
          break;
        case 2:
          view.setUint16(at, wire, true);
          break;
        case 3:
          view.setInt16(at, wire, true);
          break;
        case 4:
          view.setUint32(at, wire, true);
          break;
        case 5:
          view.setInt32(at, wire, true);
          break;
        case 6:
          view.setFloat32(at, wire, true);
          break;
        default:
          view.setFloat64(at, wire, true);
      }
    }
    view.setInt32(this.length - 4, crc32(datagram.bytes, 0, this.length - 4), true);
    return this.length;
  }

  /**
   * Reads the fields of a datagram that `inspect` found sound into values[to ..], all inside their ranges. When the
   * verdict is `refused` the values written are not to be used.
   */
  read(datagram: Datagram, values: Float64Array, to: number): number {
    const view = datagram.view;
    let verdict: number = fieldVerdicts.fine;
    for (let i = 0; i < this.count; i += 1) {
      const at = this.at[i];
      let wire = 0;
      switch (this.type[i]) {
        case 0:
          wire = view.getUint8(at);
          break;
        case 1:
          wire = view.getInt8(at);
          break;
        case 2:
          wire = view.getUint16(at, true);
          break;
        case 3:
          wire = view.getInt16(at, true);
          break;
        case 4:
          wire = view.getUint32(at, true);
          break;
        case 5:
          wire = view.getInt32(at, true);
          break;
        case 6:
          wire = view.getFloat32(at, true);
          break;
        default:
          wire = view.getFloat64(at, true);
      }
      let value = wire * this.scale[i] + this.offset[i];
      if (!(value - value === 0)) return fieldVerdicts.refused;
      if (value < this.wireLeast[i] || value > this.wireMost[i]) {
        if (this.refuses) return fieldVerdicts.refused;
        verdict = fieldVerdicts.saturated;
      }
      if (value < this.least[i]) value = this.least[i];
      else if (value > this.most[i]) value = this.most[i];
      values[to + i] = value;
    }
    return verdict;
  }
}

/** Writes a header; `sequence`, `tick` and `mapChecksum` modulo 2^32. */
export function writeHeader(
  view: DataView,
  kind: number,
  message: number,
  sequence: number,
  tick: number,
  mapChecksum: number,
): void {
  view.setInt32(header.magic, magic, true);
  view.setUint8(header.version, version);
  view.setUint8(header.kind, kind);
  view.setUint16(header.message, message, true);
  view.setInt32(header.sequence, sequence, true);
  view.setInt32(header.tick, tick, true);
  view.setInt32(header.map, mapChecksum, true);
}

/** Writes a datagram without fields (`end`, `done`, `hello`); its length, bytes. */
export function writeControl(
  datagram: Datagram,
  kind: number,
  sequence: number,
  tick: number,
  mapChecksum: number,
): number {
  writeHeader(datagram.view, kind, 0, sequence, tick, mapChecksum);
  datagram.view.setInt32(header.length, crc32(datagram.bytes, 0, header.length), true);
  return controlLength;
}

/**
 * The codecs of all messages that may come in on one link, found by number, and the judgement of a datagram before
 * any of its fields is believed.
 */
export class UdpInbox {
  /** Long enough for the longest datagram of the link and one byte more, so that a longer one is seen to be longer. */
  readonly capacity: number;
  private readonly byNumber: Int16Array;
  private readonly lengths: Int32Array;

  constructor(
    codecs: readonly UdpCodec[],
    private readonly mapChecksum: number,
  ) {
    this.byNumber = new Int16Array(0x10000).fill(-1);
    this.lengths = Int32Array.from(codecs, (codec) => codec.length);
    codecs.forEach((codec, i) => {
      this.byNumber[codec.message.identifier] = i;
    });
    this.capacity = Math.max(controlLength, ...this.lengths) + 1;
  }

  /**
   * One of `verdicts`. The checksum is over what came, so that a whole datagram of another map is told from a damaged
   * one; of two faults the one that says more about the cause is named. A datagram longer than any of the link was cut:
   * its checksum is gone, and the map's in its header is believed.
   */
  inspect(datagram: Datagram, length: number): number {
    if (length < controlLength) return verdicts.wrongLength;
    const view = datagram.view;
    if (view.getInt32(header.magic, true) !== magic || view.getUint8(header.version) !== version)
      return verdicts.malformed;
    const cut = length >= this.capacity;
    const whole = !cut && view.getInt32(length - 4, true) === crc32(datagram.bytes, 0, length - 4);
    if ((whole || cut) && view.getInt32(header.map, true) !== this.mapChecksum) return verdicts.wrongMap;
    if (cut) return verdicts.wrongLength;
    const kind = view.getUint8(header.kind);
    let expected: number = controlLength;
    if (kind === kinds.message) {
      const index = this.byNumber[view.getUint16(header.message, true)];
      if (index < 0) return whole ? verdicts.malformed : verdicts.wrongChecksum;
      expected = this.lengths[index];
    } else if (kind < kinds.message || kind > kinds.hello) return whole ? verdicts.malformed : verdicts.wrongChecksum;
    if (length !== expected) return verdicts.wrongLength;
    return whole ? verdicts.sound : verdicts.wrongChecksum;
  }

  /** Index of the codec of a sound datagram of kind `message`. */
  index(datagram: Datagram): number {
    return this.byNumber[datagram.view.getUint16(header.message, true)];
  }
}
