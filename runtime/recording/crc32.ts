import zlib from 'node:zlib';

const native = (zlib as unknown as { crc32?: (bytes: Uint8Array, start?: number) => number }).crc32;
let table: Int32Array | undefined;

/** CRC-32 (IEEE 802.3) of `bytes`, continued from `start` (the result over what came before). Unsigned. */
export function crc32(bytes: Uint8Array, start = 0): number {
  // zlib.crc32 came with Node 20.15.
  return native === undefined ? crc32ByTable(bytes, start) : native(bytes, start);
}

export function crc32ByTable(bytes: Uint8Array, start = 0): number {
  table ??= Int32Array.from({ length: 256 }, (_, byte) => {
    let value = byte;
    for (let bit = 0; bit < 8; bit += 1) value = value & 1 ? (value >>> 1) ^ 0xedb88320 : value >>> 1;
    return value;
  });
  let crc = ~start;
  for (let i = 0; i < bytes.length; i += 1) crc = (crc >>> 8) ^ table[(crc ^ bytes[i]!) & 0xff]!;
  return ~crc >>> 0;
}
