import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CanCodec } from '../../bridge/can-codec.js';
import type { CanLayout, MapSignal, MessageSpec } from '../../bridge/message-map.js';
import { fieldVerdicts } from '../../bridge/udp-codec.js';
import { message, signal } from './sample-map.js';

const plain: CanLayout = {
  startBit: 0,
  length: 8,
  byteOrder: 'little',
  signed: false,
  float: false,
  scale: 1,
  offset: 0,
};
const field = (name: string, layout: Partial<CanLayout>, changes: Partial<MapSignal> = {}): MapSignal =>
  signal(name, '', { least: -1e300, most: 1e300, ...changes, can: { ...plain, ...layout } });
const frame = (signals: readonly MapSignal[], changes: Partial<MessageSpec> = {}): MessageSpec =>
  message('m', 0x123, 'sent', signals, { bytes: 8, ...changes });

function encode(spec: MessageSpec, values: readonly number[]): string {
  const codec = new CanCodec(spec);
  const bytes = new Uint8Array(64);
  codec.quantise(Float64Array.from(values), 0, new Float64Array(codec.count), 0);
  return Buffer.from(bytes.subarray(0, codec.write(bytes))).toString('hex');
}

function decode(spec: MessageSpec, hex: string): number[] {
  const codec = new CanCodec(spec);
  const bytes = new Uint8Array(64);
  bytes.set(Buffer.from(hex, 'hex'));
  const values = new Float64Array(codec.count).fill(Number.NaN);
  expect(codec.read(bytes, values, 0)).toBe(fieldVerdicts.fine);
  return [...values];
}

/**
 * The oracle: the payload as one whole number, the first byte lowest for a little-endian signal and highest for a
 * big-endian one; the signal is then a run of bits of it in either case.
 */
function rawBits(bytes: Uint8Array, layout: CanLayout): bigint {
  const little = layout.byteOrder === 'little';
  const whole = (little ? [...bytes].reverse() : [...bytes]).reduce((sum, byte) => (sum << 8n) | BigInt(byte), 0n);
  const low = little
    ? layout.startBit
    : bytes.length * 8 - 1 - ((layout.startBit >> 3) * 8 + 7 - (layout.startBit & 7)) - (layout.length - 1);
  const bits = (whole >> BigInt(low)) & ((1n << BigInt(layout.length)) - 1n);
  return layout.signed && bits >> BigInt(layout.length - 1) ? bits - (1n << BigInt(layout.length)) : bits;
}

const anyLayout = (payload: number): fc.Arbitrary<CanLayout> =>
  fc
    .record({
      byteOrder: fc.constantFrom('little' as const, 'big' as const),
      signed: fc.boolean(),
      length: fc.integer({ min: 1, max: 53 }),
      startBit: fc.integer({ min: 0, max: payload * 8 - 1 }),
    })
    .filter(({ byteOrder, length, startBit }) => {
      const from = byteOrder === 'little' ? startBit : (startBit >> 3) * 8 + 7 - (startBit & 7);
      return from + length <= payload * 8;
    })
    .map((one) => ({ ...plain, ...one }));

describe('CAN codec', () => {
  it('writes hand-made frames', () => {
    // 12 bits little endian from bit 4: 0xABC over the high nibble of byte 0 and byte 1.
    expect(encode(frame([field('a', { startBit: 4, length: 12 })]), [0xabc])).toBe('c0ab000000000000');
    // 12 bits big endian from bit 3 (most significant): low nibble of byte 0, then byte 1.
    expect(encode(frame([field('a', { startBit: 3, length: 12, byteOrder: 'big' })]), [0xabc])).toBe(
      '0abc000000000000',
    );
    expect(
      encode(
        frame([field('a', { startBit: 7, length: 16, byteOrder: 'big', signed: true, scale: 0.5, offset: 10 })]),
        [9],
      ),
    ).toBe('fffe000000000000');
    expect(encode(frame([field('a', { startBit: 24, length: 32, float: true })]), [1.5])).toBe('0000000000c03f00');
    expect(encode(frame([field('a', { startBit: 7, length: 64, byteOrder: 'big', float: true })]), [-2])).toBe(
      'c000000000000000',
    );
  });

  it('reads any integer of any place as plain arithmetic on the whole payload does, and writes it back', () => {
    fc.assert(
      fc.property(
        fc
          .constantFrom(1, 3, 8, 64)
          .chain((payload) => fc.tuple(anyLayout(payload), fc.uint8Array({ minLength: payload, maxLength: payload }))),
        ([layout, bytes]) => {
          const spec = frame([field('a', layout)], { bytes: bytes.length });
          const [value] = decode(spec, Buffer.from(bytes).toString('hex'));
          expect(BigInt(value)).toBe(rawBits(bytes, layout));
          const written = Uint8Array.from(Buffer.from(encode(spec, [value]), 'hex'));
          expect(rawBits(written, layout)).toBe(rawBits(bytes, layout));
          // No other bit is touched: what is left when the signal's bits are taken out is nothing.
          const ones = Uint8Array.from(
            Buffer.from(
              encode(frame([field('a', { ...layout, signed: false })], { bytes: bytes.length }), [
                2 ** layout.length - 1,
              ]),
              'hex',
            ),
          );
          expect([...ones].reduce((sum, byte) => sum + byte.toString(2).replaceAll('0', '').length, 0)).toBe(
            layout.length,
          );
        },
      ),
      { numRuns: 1500 },
    );
  });

  it('reads and writes 64-bit integers to the precision of a double', () => {
    const unsigned = frame([field('a', { length: 64 })]);
    const signed = frame([field('a', { length: 64, signed: true, byteOrder: 'big', startBit: 7 })]);
    expect(decode(unsigned, 'ffffffffffffffff')).toEqual([2 ** 64]);
    expect(encode(unsigned, [2 ** 64])).toBe('00f8ffffffffffff');
    expect(decode(signed, '8000000000000000')).toEqual([-(2 ** 63)]);
    expect(encode(signed, [-(2 ** 63)])).toBe('8000000000000000');
    expect(encode(signed, [-1])).toBe('ffffffffffffffff');
  });

  it('saturates into field and range, and refuses what is not finite', () => {
    const spec = frame([field('a', { length: 8, signed: true, scale: 0.5 }, { least: -100, most: 20.2 })]);
    expect(encode(spec, [500])).toBe('2800000000000000');
    expect(encode(spec, [-500])).toBe('8000000000000000');
    expect(new CanCodec(spec).quantise(Float64Array.of(Number.NaN), 0, new Float64Array(1), 0)).toBe(-1);
    const codec = new CanCodec({ ...spec, outOfRange: 'refuse' });
    const values = new Float64Array(1);
    const bytes = Uint8Array.of(0x29, 0, 0, 0, 0, 0, 0, 0);
    expect(codec.read(bytes, values, 0)).toBe(fieldVerdicts.refused);
    expect(new CanCodec({ ...spec, outOfRange: 'saturate' }).read(bytes, values, 0)).toBe(fieldVerdicts.saturated);
    expect(values[0]).toBe(20.2);
  });

  it('carries what the selectors select, of any depth, whatever the order in the map', () => {
    const spec = frame([
      field('deep', { startBit: 16, length: 8, selectedBy: { signal: 'inner', values: [[2, 3]] } }),
      field('inner', {
        startBit: 8,
        length: 4,
        selector: true,
        selectedBy: {
          signal: 'outer',
          values: [
            [1, 1],
            [5, 7],
          ],
        },
      }),
      field('outer', { startBit: 0, length: 8, selector: true }),
      field('other', { startBit: 16, length: 16, selectedBy: { signal: 'outer', values: [[0, 0]] } }),
      field('always', { startBit: 56, length: 8 }),
    ]);
    expect(encode(spec, [0xaa, 2, 6, 0x1234, 9])).toBe('0602aa0000000009');
    expect(encode(spec, [0xaa, 1, 6, 0x1234, 9])).toBe('0601000000000009');
    expect(encode(spec, [0xaa, 2, 0, 0x1234, 9])).toBe('0000341200000009');
    expect(decode(spec, '0503bb0000000007')).toEqual([0xbb, 3, 5, Number.NaN, 7]);
    expect(decode(spec, '0003bb0000000007')).toEqual([Number.NaN, Number.NaN, 0, 0xbb, 7]);
    const ring = frame([
      field('a', { selectedBy: { signal: 'b', values: [[0, 0]] } }),
      field('b', { selectedBy: { signal: 'a', values: [[0, 0]] } }),
    ]);
    expect(() => new CanCodec(ring)).toThrow('messages.m.a selects itself');
  });
});
