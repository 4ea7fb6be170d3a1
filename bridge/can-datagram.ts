import {
  frameFlags,
  frameSizes,
  identifierFlags,
  identifierMasks,
  identifierWord,
  payloadAt,
  writeFrameHead,
} from './can-frame.js';

/**
 * CAN frames as datagrams in the format of python-can's UDP multicast bus: one msgpack map of eleven keys in a fixed
 * order. Written and read by a template over bytes, so that nothing is allocated; what is in another order or form is
 * not taken.
 */
const keys = [
  'timestamp',
  'arbitration_id',
  'is_extended_id',
  'is_remote_frame',
  'is_error_frame',
  'channel',
  'dlc',
  'data',
  'is_fd',
  'bitrate_switch',
  'error_state_indicator',
] as const;

const keyBytes = keys.map((key) => Uint8Array.from([0xa0 | key.length, ...new TextEncoder().encode(key)]));

// msgpack: map of 11, nil, false, true, bin 8, float 64, uint 8, 16 and 32, str 8
const MAP_11 = 0x8b;
const NIL = 0xc0;
const FALSE = 0xc2;
const TRUE = 0xc3;
const BIN_8 = 0xc4;
const FLOAT_64 = 0xcb;
const UINT_8 = 0xcc;
const UINT_16 = 0xcd;
const UINT_32 = 0xce;
const STR_8 = 0xd9;

/** The group and port that python-can's scripts use when they say IPv4. */
export const usualGroup = { address: '239.74.163.2', port: 43113 } as const;

/** Longest datagram that is written, and that is read whole with a channel of up to 255 letters, bytes. */
export const greatestDatagram = 512;

export class CanDatagram {
  /** The datagram that `write` wrote last, or that is to be read. */
  readonly bytes = new Uint8Array(greatestDatagram);
  /** The stamp of the datagram read last: seconds since 1970, as its sender says. */
  readonly stamp = new Float64Array(1);
  private readonly view = new DataView(this.bytes.buffer);
  private at = 0;
  private length = 0;
  private sound = true;

  /** Writes a frame of 16 or 72 bytes; `stamp[index]`: seconds since 1970. The datagram's length, bytes. */
  write(frame: Uint8Array, size: number, stamp: Float64Array, index: number): number {
    const { bytes, view } = this;
    const word = identifierWord(frame);
    const length = frame[4];
    const flags = frame[5];
    const flexible = size === frameSizes.flexible;
    const remote = (word & identifierFlags.remote) !== 0;
    bytes[0] = MAP_11;
    this.at = 1;
    this.key(0);
    bytes[this.at] = FLOAT_64;
    view.setFloat64(this.at + 1, stamp[index]);
    this.at += 9;
    this.key(1);
    this.whole(word & identifierMasks.extended);
    this.flag(2, (word & identifierFlags.extended) !== 0);
    this.flag(3, remote);
    this.flag(4, (word & identifierFlags.error) !== 0);
    this.key(5);
    bytes[this.at] = NIL;
    this.at += 1;
    this.key(6);
    this.whole(length);
    this.key(7);
    const carried = remote ? 0 : length;
    bytes[this.at] = BIN_8;
    bytes[this.at + 1] = carried;
    this.at += 2;
    for (let i = 0; i < carried; i += 1) bytes[this.at + i] = frame[payloadAt + i];
    this.at += carried;
    this.flag(8, flexible);
    this.flag(9, flexible && (flags & frameFlags.bitRateSwitch) !== 0);
    this.flag(10, flexible && (flags & frameFlags.errorState) !== 0);
    return this.at;
  }

  /** Reads the datagram in `bytes` into `frame`; the frame's size (16 or 72), or -1 when it is not of this form. */
  read(length: number, frame: Uint8Array): number {
    const { bytes } = this;
    if (length > bytes.length || bytes[0] !== MAP_11) return -1;
    this.length = length;
    this.at = 1;
    this.sound = true;
    this.expectKey(0);
    this.readStamp();
    this.expectKey(1);
    const identifier = this.readWhole();
    const extended = this.readFlag(2);
    const remote = this.readFlag(3);
    const error = this.readFlag(4);
    this.expectKey(5);
    this.skipChannel();
    this.expectKey(6);
    const bytesSaid = this.readWhole();
    this.expectKey(7);
    const dataAt = this.at + 2;
    const carried = this.at + 1 < length && bytes[this.at] === BIN_8 ? bytes[this.at + 1] : -1;
    if (carried < 0 || dataAt + carried > length) return -1;
    this.at = dataAt + carried;
    const flexible = this.readFlag(8);
    const switched = this.readFlag(9);
    const indicated = this.readFlag(10);
    if (!this.sound || this.at !== length) return -1;
    if (identifier < 0 || identifier > (extended ? identifierMasks.extended : identifierMasks.standard)) {
      if (!error || identifier > identifierMasks.extended) return -1;
    }
    if (bytesSaid > (flexible ? 64 : 8) || (remote ? carried !== 0 || flexible : carried !== bytesSaid)) return -1;
    const size = flexible ? frameSizes.flexible : frameSizes.classic;
    const word =
      identifier |
      (extended ? identifierFlags.extended : 0) |
      (remote ? identifierFlags.remote : 0) |
      (error ? identifierFlags.error : 0);
    const flags = flexible
      ? frameFlags.flexible | (switched ? frameFlags.bitRateSwitch : 0) | (indicated ? frameFlags.errorState : 0)
      : 0;
    writeFrameHead(frame, word, bytesSaid, flags);
    for (let i = 0; i < carried; i += 1) frame[payloadAt + i] = bytes[dataAt + i];
    for (let i = payloadAt + carried; i < size; i += 1) frame[i] = 0;
    return size;
  }

  private key(index: number): void {
    const key = keyBytes[index];
    for (let i = 0; i < key.length; i += 1) this.bytes[this.at + i] = key[i];
    this.at += key.length;
  }

  private flag(index: number, value: boolean): void {
    this.key(index);
    this.bytes[this.at] = value ? TRUE : FALSE;
    this.at += 1;
  }

  private whole(value: number): void {
    const { bytes, view, at } = this;
    if (value < 0x80) {
      bytes[at] = value;
      this.at += 1;
    } else if (value <= 0xff) {
      bytes[at] = UINT_8;
      bytes[at + 1] = value;
      this.at += 2;
    } else if (value <= 0xffff) {
      bytes[at] = UINT_16;
      view.setUint16(at + 1, value);
      this.at += 3;
    } else {
      bytes[at] = UINT_32;
      view.setUint32(at + 1, value);
      this.at += 5;
    }
  }

  private expectKey(index: number): void {
    const key = keyBytes[index];
    if (this.at + key.length > this.length) this.sound = false;
    for (let i = 0; i < key.length && this.sound; i += 1) if (this.bytes[this.at + i] !== key[i]) this.sound = false;
    this.at += key.length;
  }

  private readFlag(index: number): boolean {
    this.expectKey(index);
    const byte = this.at < this.length ? this.bytes[this.at] : 0;
    if (byte !== TRUE && byte !== FALSE) this.sound = false;
    this.at += 1;
    return byte === TRUE;
  }

  private readStamp(): void {
    if (this.at + 9 > this.length || this.bytes[this.at] !== FLOAT_64) this.sound = false;
    else this.stamp[0] = this.view.getFloat64(this.at + 1);
    this.at += 9;
  }

  private readWhole(): number {
    const { bytes, view, at } = this;
    if (at + 5 > this.length) {
      this.sound = false;
      return 0;
    }
    const byte = bytes[at];
    if (byte < 0x80) {
      this.at += 1;
      return byte;
    }
    if (byte === UINT_8) {
      this.at += 2;
      return bytes[at + 1];
    }
    if (byte === UINT_16) {
      this.at += 3;
      return view.getUint16(at + 1);
    }
    // No CAN number needs the sign bit.
    const value = byte === UINT_32 ? view.getInt32(at + 1) : -1;
    this.at += 5;
    if (value < 0) this.sound = false;
    return value;
  }

  private skipChannel(): void {
    const byte = this.at < this.length ? this.bytes[this.at] : 0;
    if (byte === NIL) this.at += 1;
    else if ((byte & 0xe0) === 0xa0) this.at += 1 + (byte & 0x1f);
    else if (byte === STR_8) this.at += 2 + this.bytes[this.at + 1];
    else this.sound = false;
  }
}
