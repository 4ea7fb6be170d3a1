import type { PayloadCodec } from '../can-codec.js';
import type { MapSignal, MessageSpec } from '../message-map.js';
import { fieldVerdicts } from '../udp-codec.js';

/**
 * Active trouble codes, SAE J1939-73 DM1 (parameter group 65226): two bytes of lamps, then four bytes for each code: 19 bits
 * suspect parameter number, 5 bits failure mode identifier, 7 bits occurrence count, conversion method 0 (version 4). With
 * none or one it is a frame of 8 bytes, with more it goes by the transport protocol.
 *
 * A signal with `trouble` is the occurrence count of its code, 0 when it is not active; one with `lamp` the state of a lamp
 * (0 off, 1 on, 2 error, 3 not available).
 */
export const lamps = { malfunction: 6, stop: 4, warning: 2, protect: 0 } as const;
export const activeTroubleCodes = 65226;
/** Greatest occurrence count; 127 says that it is not known. */
const mostOccurrences = 126;

export class TroubleCodec implements PayloadCodec {
  readonly length: number;
  readonly count: number;
  private readonly spn: Int32Array;
  private readonly fmi: Int32Array;
  /** Shift of a lamp, or -1. */
  private readonly lamp: Int32Array;
  private readonly values: Float64Array;

  constructor(readonly message: MessageSpec) {
    const { signals } = message;
    this.count = signals.length;
    this.spn = Int32Array.from(signals, (signal) => signal.trouble?.spn ?? -1);
    this.fmi = Int32Array.from(signals, (signal) => signal.trouble?.fmi ?? -1);
    this.lamp = Int32Array.from(signals, (signal) => (signal.lamp === undefined ? -1 : lamps[signal.lamp]));
    this.values = new Float64Array(this.count);
    this.length = Math.max(message.bytes ?? 0, lengthOfTroubles(signals));
  }

  fits(length: number): boolean {
    return length === 8 || (length > 8 && length <= this.length && (length - 2) % 4 === 0);
  }

  quantise(values: Float64Array, from: number, carried: Float64Array, to: number): number {
    let saturated = 0;
    for (let i = 0; i < this.count; i += 1) {
      const value = values[from + i];
      if (!(value - value === 0)) return -1;
      const most = this.lamp[i] >= 0 ? 3 : mostOccurrences;
      const whole = Math.round(value);
      const kept = Math.min(most, Math.max(0, whole));
      if (kept !== whole) saturated += 1;
      this.values[i] = kept;
      carried[to + i] = kept;
    }
    return saturated;
  }

  write(bytes: Uint8Array): number {
    // Lamps that no signal speaks of are off; none flashes (all bits of the second byte 1: as the lamp, no flash).
    bytes[0] = 0;
    bytes[1] = 0xff;
    let at = 2;
    for (let i = 0; i < this.count; i += 1) {
      const value = this.values[i];
      if (this.lamp[i] >= 0) bytes[0] |= value << this.lamp[i];
      else if (value > 0) {
        const spn = this.spn[i];
        bytes[at] = spn;
        bytes[at + 1] = spn >> 8;
        bytes[at + 2] = ((spn >> 16) << 5) | this.fmi[i];
        bytes[at + 3] = value;
        at += 4;
      }
    }
    if (at === 2) for (; at < 6; at += 1) bytes[at] = 0;
    if (at < 8) for (; at < 8; at += 1) bytes[at] = 0xff;
    return at;
  }

  read(bytes: Uint8Array, values: Float64Array, to: number, length: number): number {
    for (let i = 0; i < this.count; i += 1) {
      if (this.lamp[i] >= 0) {
        values[to + i] = (bytes[0] >> this.lamp[i]) & 3;
        continue;
      }
      values[to + i] = 0;
      for (let at = 2; at + 4 <= length; at += 4) {
        const spn = bytes[at] | (bytes[at + 1] << 8) | ((bytes[at + 2] >> 5) << 16);
        if (spn === this.spn[i] && (bytes[at + 2] & 31) === this.fmi[i])
          values[to + i] = Math.min(mostOccurrences, Math.max(1, bytes[at + 3] & 127));
      }
    }
    return fieldVerdicts.fine;
  }

  carries(_index: number): boolean {
    return true;
  }
}

/** Bytes of a message with all of its codes active. */
export function lengthOfTroubles(signals: readonly MapSignal[]): number {
  return Math.max(8, 2 + 4 * signals.filter((signal) => signal.trouble !== undefined).length);
}
