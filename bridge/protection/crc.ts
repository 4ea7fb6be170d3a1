/**
 * Cyclic redundancy checks in steps, for payloads whose check covers pieces that do not lie together. Parameters as in
 * the AUTOSAR "Specification of CRC Routines" (SWS_CRCLibrary). Registers are small integers; 32-bit ones are signed.
 */
export class Crc {
  private readonly table: Int32Array;

  constructor(
    /** 8, 16 or 32 bits; the polynomial with its bits reversed where it is reflected. */
    readonly width: 8 | 16 | 32,
    readonly polynomial: number,
    readonly initial: number,
    readonly final: number,
    readonly reflected = false,
  ) {
    this.table = reflected ? rightTable(polynomial) : leftTable(width, polynomial);
  }

  /** The register after one byte more. */
  step(register: number, byte: number): number {
    if (this.reflected) return (register >>> 8) ^ this.table[(register ^ byte) & 0xff];
    if (this.width === 8) return this.table[(register ^ byte) & 0xff];
    return ((register << 8) & 0xffff) ^ this.table[((register >>> 8) ^ byte) & 0xff];
  }

  /** The register after bytes[from .. to). */
  run(register: number, bytes: Uint8Array, from: number, to: number): number {
    let next = register;
    for (let i = from; i < to; i += 1) next = this.step(next, bytes[i]);
    return next;
  }

  /** The check that a register stands for. */
  finish(register: number): number {
    return (register ^ this.final) | 0;
  }
}

/** The checks by the names of a bench file. */
export const crcs = {
  'crc8-j1850': new Crc(8, 0x1d, 0xff, 0xff),
  'crc8-h2f': new Crc(8, 0x2f, 0xff, 0xff),
  'crc16-ccitt': new Crc(16, 0x1021, 0xffff, 0),
  crc32: new Crc(32, 0xedb88320, -1, -1, true),
  'crc32-p4': new Crc(32, 0xc8df352f, -1, -1, true),
} as const;

function leftTable(width: number, polynomial: number): Int32Array {
  const top = 1 << (width - 1);
  const mask = (1 << width) - 1;
  const table = new Int32Array(256);
  for (let byte = 0; byte < 256; byte += 1) {
    let value = byte << (width - 8);
    for (let bit = 0; bit < 8; bit += 1) value = (value & top ? (value << 1) ^ polynomial : value << 1) & mask;
    table[byte] = value;
  }
  return table;
}

/** `polynomial` with its bits reversed. */
function rightTable(polynomial: number): Int32Array {
  const table = new Int32Array(256);
  for (let byte = 0; byte < 256; byte += 1) {
    let value = byte;
    for (let bit = 0; bit < 8; bit += 1) value = value & 1 ? (value >>> 1) ^ polynomial : value >>> 1;
    table[byte] = value;
  }
  return table;
}
