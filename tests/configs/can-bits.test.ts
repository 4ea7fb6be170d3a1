import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { CanLayout, MapSignal } from '../../bridge/message-map.js';
import { bitsOf, overlappingBits } from '../../configs/can-bits.js';

const layout = (
  startBit: number,
  length: number,
  byteOrder: 'little' | 'big' = 'little',
  more: Partial<CanLayout> = {},
): CanLayout => ({
  startBit,
  length,
  byteOrder,
  signed: false,
  float: false,
  scale: 1,
  offset: 0,
  ...more,
});
const signal = (name: string, can: CanLayout, more: Partial<MapSignal> = {}) =>
  ({ name, can, least: 0, most: 1, unit: '1', ...more }) as MapSignal;

describe('bits of a CAN payload', () => {
  it('little endian counts up from the least significant bit', () => {
    expect(bitsOf(layout(4, 8))).toEqual([4, 5, 6, 7, 8, 9, 10, 11]);
  });

  it('big endian runs down from the most significant bit and on in the next byte', () => {
    expect(bitsOf(layout(7, 16, 'big'))).toEqual([7, 6, 5, 4, 3, 2, 1, 0, 15, 14, 13, 12, 11, 10, 9, 8]);
    expect(bitsOf(layout(2, 5, 'big'))).toEqual([2, 1, 0, 15, 14]);
  });

  it('overlaps are found whatever the byte orders', () => {
    expect(
      overlappingBits([signal('a', layout(0, 8)), signal('b', layout(2, 5, 'big'))], 8).map((clash) => [
        clash.signal,
        clash.what,
        clash.bound,
      ]),
    ).toEqual([['b', 'bits shared with a', 'bit 2 is taken']]);
    expect(
      overlappingBits([signal('a', layout(0, 2)), signal('b', layout(2, 3, 'big')), signal('c', layout(8, 8))], 8)[0]!
        .signal,
    ).toBe('b');
    expect(
      overlappingBits([signal('a', layout(3, 5)), signal('b', layout(2, 3, 'big')), signal('c', layout(8, 8))], 8),
    ).toEqual([]);
  });

  it('multiplexed signals may share bits when they are never together', () => {
    const selector = signal('mode', layout(0, 4, 'little', { selector: true }));
    const when = (...values: [number, number][]) => ({ selectedBy: { signal: 'mode', values } });
    const a = signal('a', layout(8, 8, 'little', when([0, 1])));
    expect(overlappingBits([selector, a, signal('b', layout(8, 8, 'little', when([2, 5])))], 8)).toEqual([]);
    expect(overlappingBits([selector, a, signal('b', layout(8, 8, 'little', when([1, 1])))], 8)[0]!.what).toBe(
      'bits shared with a',
    );
    expect(overlappingBits([selector, a, signal('b', layout(8, 8))], 8)[0]!.what).toBe('bits shared with a');
    expect(overlappingBits([a], 8)[0]!.what).toBe('selected by a signal that is no selector');
  });

  it('signals end within the payload', () => {
    expect(overlappingBits([signal('a', layout(12, 8))], 2)[0]).toMatchObject({
      what: 'signal beyond the payload',
      bound: '2 bytes',
    });
    expect(overlappingBits([signal('a', layout(12, 4))], 2)).toEqual([]);
  });

  it('ranges are sayable in the bits', () => {
    const of = (least: number, most: number, can: CanLayout) =>
      overlappingBits([signal('a', can, { least, most, unit: 'rpm' })], 8).map((clash) => clash.bound);
    expect(of(0, 4000, layout(0, 12))).toEqual([]);
    expect(of(0, 4100, layout(0, 12))).toEqual(['0 .. 4095 rpm']);
    expect(of(-1, 100, layout(0, 12))).toEqual(['0 .. 4095 rpm']);
    expect(of(-2000, 2000, layout(0, 12, 'little', { signed: true }))).toEqual([]);
    expect(of(0, 10000, layout(0, 12, 'little', { scale: 2.5, offset: -100 }))).toEqual([]);
    expect(of(0, 1e9, layout(0, 32, 'little', { float: true }))).toEqual([]);
  });

  it('a signal has as many different bits as it is long', () => {
    fc.assert(
      fc.property(
        fc.nat(63),
        fc.integer({ min: 1, max: 64 }),
        fc.constantFrom('little' as const, 'big' as const),
        (start, length, order) => {
          expect(new Set(bitsOf(layout(start, length, order))).size).toBe(length);
        },
      ),
    );
  });
});
