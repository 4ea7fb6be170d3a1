import { Crc, crcs } from './crc.js';
import { type Protector, wrongCheck } from './protector.js';

/*
 * The profiles of AUTOSAR's end-to-end protection: Foundation, "E2E Protocol Specification" (PRS_E2EProtocol), with the
 * checks of "Specification of CRC Routines". Offsets are in bytes here and in bits there.
 */

/** How the data identifier of profiles 1 and 11 goes into the check. */
export type DataIdMode = 'both' | 'alternating' | 'low' | 'nibble';

/**
 * Profiles 1 and 11: check in one byte, then a nibble of counter 0 .. 14; in mode `nibble` the next nibble carries bits
 * 8 .. 11 of the data identifier. The check is CRC-8 SAE J1850 with initial and final value 0.
 */
export class NibbleProfile implements Protector {
  readonly modulo = 15;
  readonly crc = j1850Zero;

  constructor(
    readonly dataId: number,
    readonly mode: DataIdMode,
    readonly offset: number,
    readonly mostStep: number,
  ) {}

  protect(payload: Uint8Array, length: number, counter: number): void {
    const { offset } = this;
    const upper = this.mode === 'nibble' ? ((this.dataId >>> 8) & 0xf) << 4 : payload[offset + 1] & 0xf0;
    payload[offset + 1] = upper | counter;
    payload[offset] = this.compute(payload, length, counter);
  }

  check(payload: Uint8Array, length: number): number {
    const { offset } = this;
    const counter = payload[offset + 1] & 0xf;
    if (counter >= this.modulo || payload[offset] !== this.compute(payload, length, counter)) return wrongCheck;
    if (this.mode === 'nibble' && payload[offset + 1] >>> 4 !== ((this.dataId >>> 8) & 0xf)) return wrongCheck;
    return counter;
  }

  private compute(payload: Uint8Array, length: number, counter: number): number {
    const low = this.dataId & 0xff;
    const high = (this.dataId >>> 8) & 0xff;
    let register = 0;
    if (this.mode === 'both') register = j1850Zero.step(j1850Zero.step(0, low), high);
    else if (this.mode === 'nibble') register = j1850Zero.step(j1850Zero.step(0, low), 0);
    else if (this.mode === 'low') register = j1850Zero.step(0, low);
    else register = j1850Zero.step(0, counter % 2 === 0 ? low : high);
    register = j1850Zero.run(register, payload, 0, this.offset);
    return j1850Zero.run(register, payload, this.offset + 1, length);
  }
}

const j1850Zero = new Crc(8, 0x1d, 0, 0);

/** Profiles 2 and 22: CRC-8H2F in one byte, then a nibble of counter 0 .. 15; the counter picks one of 16 identifiers. */
export class ListProfile implements Protector {
  readonly modulo = 16;

  constructor(
    readonly dataIds: Uint8Array,
    readonly offset: number,
    readonly mostStep: number,
  ) {}

  protect(payload: Uint8Array, length: number, counter: number): void {
    const { offset } = this;
    payload[offset + 1] = (payload[offset + 1] & 0xf0) | counter;
    payload[offset] = this.compute(payload, length, counter);
  }

  check(payload: Uint8Array, length: number): number {
    const counter = payload[this.offset + 1] & 0xf;
    return payload[this.offset] === this.compute(payload, length, counter) ? counter : wrongCheck;
  }

  private compute(payload: Uint8Array, length: number, counter: number): number {
    let register = h2f.run(h2f.initial, payload, 0, this.offset);
    register = h2f.run(register, payload, this.offset + 1, length);
    return h2f.finish(h2f.step(register, this.dataIds[counter])) & 0xff;
  }
}

const h2f = crcs['crc8-h2f'];

/** Profile 4: length, counter (16 bit), data identifier (32 bit) and CRC-32P4, big endian, twelve bytes. */
export class LongProfile implements Protector {
  readonly modulo = 0x10000;

  constructor(
    readonly dataId: number,
    readonly offset: number,
    readonly mostStep: number,
  ) {}

  protect(payload: Uint8Array, length: number, counter: number): void {
    const { offset } = this;
    payload[offset] = length >>> 8;
    payload[offset + 1] = length;
    payload[offset + 2] = counter >>> 8;
    payload[offset + 3] = counter;
    for (let i = 0; i < 4; i += 1) payload[offset + 4 + i] = this.dataId >>> (24 - 8 * i);
    const value = this.compute(payload, length);
    for (let i = 0; i < 4; i += 1) payload[offset + 8 + i] = value >>> (24 - 8 * i);
  }

  check(payload: Uint8Array, length: number): number {
    const { offset } = this;
    if (((payload[offset] << 8) | payload[offset + 1]) !== length) return wrongCheck;
    for (let i = 0; i < 4; i += 1)
      if (payload[offset + 4 + i] !== ((this.dataId >>> (24 - 8 * i)) & 0xff)) return wrongCheck;
    const value = this.compute(payload, length);
    for (let i = 0; i < 4; i += 1) if (payload[offset + 8 + i] !== ((value >>> (24 - 8 * i)) & 0xff)) return wrongCheck;
    return (payload[offset + 2] << 8) | payload[offset + 3];
  }

  private compute(payload: Uint8Array, length: number): number {
    const register = p4.run(p4.initial, payload, 0, this.offset + 8);
    return p4.finish(p4.run(register, payload, this.offset + 12, length));
  }
}

const p4 = crcs['crc32-p4'];

/** Profile 5: CRC-16 in two bytes, little endian, then a counter of one byte. */
export class ShortProfile implements Protector {
  readonly modulo = 0x100;

  constructor(
    readonly dataId: number,
    readonly offset: number,
    readonly mostStep: number,
  ) {}

  protect(payload: Uint8Array, length: number, counter: number): void {
    const { offset } = this;
    payload[offset + 2] = counter;
    const value = this.compute(payload, length);
    payload[offset] = value;
    payload[offset + 1] = value >>> 8;
  }

  check(payload: Uint8Array, length: number): number {
    const { offset } = this;
    const value = this.compute(payload, length);
    if (payload[offset] !== (value & 0xff) || payload[offset + 1] !== value >>> 8) return wrongCheck;
    return payload[offset + 2];
  }

  private compute(payload: Uint8Array, length: number): number {
    let register = ccitt.run(ccitt.initial, payload, 0, this.offset);
    register = ccitt.run(register, payload, this.offset + 2, length);
    register = ccitt.step(register, this.dataId & 0xff);
    return ccitt.finish(ccitt.step(register, (this.dataId >>> 8) & 0xff));
  }
}

const ccitt = crcs['crc16-ccitt'];
