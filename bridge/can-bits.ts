import type { CanLayout } from './message-map.js';

/**
 * Bits of a payload that a signal takes, numbered as in CAN database text: bit 8 b + i is bit i (0: least significant)
 * of byte b. Big endian starts at its most significant bit and runs down, then on to bit 7 of the next byte.
 */
export function bitsOf(layout: CanLayout): number[] {
  const bits: number[] = [];
  let bit = layout.startBit;
  for (let i = 0; i < layout.length; i += 1) {
    bits.push(bit);
    bit = layout.byteOrder === 'little' ? bit + 1 : bit % 8 === 0 ? bit + 15 : bit - 1;
  }
  return bits;
}
