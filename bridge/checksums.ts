/**
 * Cyclic redundancy checks of the field, table-driven, over bytes[from .. to). Nothing is allocated in a call.
 * Parameters as in the AUTOSAR Classic Platform "Specification of CRC Routines" (SWS_CRCLibrary) and ISO 11898-1 (the
 * 15-bit one); check values, over the nine ASCII digits "123456789", are tested.
 *
 * 32-bit results are signed (a small integer to the
 * engine, not a boxed number); `>>> 0` where they are printed.
 */

/** CRC-8 SAE J1850: polynomial 0x1D, initial and final 0xFF. */
export function crc8J1850(bytes: Uint8Array, from: number, to: number): number {
  return crc8(table1D, bytes, from, to);
}

/** CRC-8H2F: polynomial 0x2F, initial and final 0xFF. */
export function crc8H2F(bytes: Uint8Array, from: number, to: number): number {
  return crc8(table2F, bytes, from, to);
}

/** CRC-16 CCITT-FALSE: polynomial 0x1021, initial 0xFFFF, final 0. */
export function crc16(bytes: Uint8Array, from: number, to: number): number {
  let crc = 0xffff;
  for (let i = from; i < to; i += 1) crc = ((crc << 8) & 0xffff) ^ table1021[(crc >>> 8) ^ bytes[i]];
  return crc;
}

/** CRC-32 (IEEE 802.3): reflected, polynomial 0x04C11DB7, initial and final 0xFFFFFFFF. Signed 32 bit. */
export function crc32(bytes: Uint8Array, from: number, to: number): number {
  return crc32Reflected(tablesEDB88320, bytes, from, to);
}

/** CRC-32P4: reflected, polynomial 0xF4ACFB13, initial and final 0xFFFFFFFF. Signed 32 bit. */
export function crc32P4(bytes: Uint8Array, from: number, to: number): number {
  return crc32Reflected(tablesC8DF352F, bytes, from, to);
}

/** CRC-15 of classic CAN frames, over whole bytes: polynomial 0x4599, initial and final 0. */
export function crc15Can(bytes: Uint8Array, from: number, to: number): number {
  let crc = 0;
  for (let i = from; i < to; i += 1) crc = ((crc << 8) & 0x7fff) ^ table4599[((crc >>> 7) ^ bytes[i]) & 0xff];
  return crc;
}

function crc8(table: Int32Array, bytes: Uint8Array, from: number, to: number): number {
  let crc = 0xff;
  for (let i = from; i < to; i += 1) crc = table[crc ^ bytes[i]];
  return crc ^ 0xff;
}

/** Four bytes a step (slicing, Kounavis and Berry 2005), the rest byte by byte. */
function crc32Reflected(tables: Int32Array, bytes: Uint8Array, from: number, to: number): number {
  let crc = -1;
  let i = from;
  for (; i + 3 < to; i += 4) {
    crc ^= bytes[i] | (bytes[i + 1] << 8) | (bytes[i + 2] << 16) | (bytes[i + 3] << 24);
    crc =
      tables[768 + (crc & 0xff)] ^
      tables[512 + ((crc >>> 8) & 0xff)] ^
      tables[256 + ((crc >>> 16) & 0xff)] ^
      tables[crc >>> 24];
  }
  for (; i < to; i += 1) crc = (crc >>> 8) ^ tables[(crc ^ bytes[i]) & 0xff];
  return ~crc;
}

/** Table of a check of `width` bits (8 to 16) that shifts left. */
function leftTable(width: number, polynomial: number): Int32Array {
  const top = 1 << (width - 1);
  const mask = (1 << width) - 1;
  const table = new Int32Array(256);
  for (let byte = 0; byte < 256; byte += 1) {
    let value = byte << (width - 8);
    for (let bit = 0; bit < 8; bit += 1) value = ((value & top ? (value << 1) ^ polynomial : value << 1) & mask) >>> 0;
    table[byte] = value;
  }
  return table;
}

/** Tables of a reflected 32-bit check, the k-th for a byte with k bytes after it; `polynomial` with its bits reversed. */
function rightTables(polynomial: number): Int32Array {
  const tables = new Int32Array(4 * 256);
  for (let byte = 0; byte < 256; byte += 1) {
    let value = byte;
    for (let bit = 0; bit < 8; bit += 1) value = value & 1 ? (value >>> 1) ^ polynomial : value >>> 1;
    tables[byte] = value;
  }
  for (let at = 256; at < tables.length; at += 1) {
    const before = tables[at - 256];
    tables[at] = (before >>> 8) ^ tables[before & 0xff];
  }
  return tables;
}

const table1D = leftTable(8, 0x1d);
const table2F = leftTable(8, 0x2f);
const table1021 = leftTable(16, 0x1021);
const table4599 = leftTable(15, 0x4599);
const tablesEDB88320 = rightTables(0xedb88320);
const tablesC8DF352F = rightTables(0xc8df352f);
