import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import * as checksums from '../../../bridge/checksums.js';
import { crcs } from '../../../bridge/protection/crc.js';
import { makeProtector, readProtection } from '../../../bridge/protection/make.js';
import { message } from '../sample-map.js';

const digits = new TextEncoder().encode('123456789');

describe('checks in steps', () => {
  // The AUTOSAR CRC library specification and the public CRC catalogue, over the nine ASCII digits.
  it.each([
    ['crc8-j1850', 0x4b],
    ['crc8-h2f', 0xdf],
    ['crc16-ccitt', 0x29b1],
    ['crc32', 0xcbf43926],
    ['crc32-p4', 0x1697d06a],
  ] as const)('%s', (name, expected) => {
    const crc = crcs[name];
    expect(crc.finish(crc.run(crc.initial, digits, 0, 9)) >>> 0).toBe(expected);
  });

  it('agree with the ones over whole ranges, cut anywhere', () => {
    fc.assert(
      fc.property(fc.uint8Array({ minLength: 1, maxLength: 64 }), fc.nat(), (bytes, seed) => {
        const cut = seed % (bytes.length + 1);
        const pairs = [
          [crcs['crc8-j1850'], checksums.crc8J1850],
          [crcs['crc8-h2f'], checksums.crc8H2F],
          [crcs['crc16-ccitt'], checksums.crc16],
          [crcs.crc32, checksums.crc32],
          [crcs['crc32-p4'], checksums.crc32P4],
        ] as const;
        for (const [crc, whole] of pairs)
          expect(crc.finish(crc.run(crc.run(crc.initial, bytes, 0, cut), bytes, cut, bytes.length))).toBe(
            whole(bytes, 0, bytes.length),
          );
      }),
      { numRuns: 200 },
    );
  });
});

describe('a plain counter and check', () => {
  const protectorOf = (settings: Record<string, number | string>, kind = 'counter-and-crc') =>
    makeProtector(message('m', 1, 'sent', [], { bytes: 8, protection: { kind, settings } }))!;

  it('stand where they are said to stand', () => {
    const payload = Uint8Array.from([1, 2, 3, 4, 5, 0xff, 0, 0]);
    protectorOf({
      start: 42,
      length: 4,
      crc: 'crc16-ccitt',
      byte: 6,
      order: 'big',
      to: 6,
      prefix: '0x12 0x34',
    }).protect(payload, 8, 9);
    // 9 << 2 in byte 5, its other bits kept
    expect(payload[5]).toBe((0xff & ~0x3c) | 0x24);
    const expected = checksums.crc16(Uint8Array.from([0x12, 0x34, ...payload.subarray(0, 6)]), 0, 8);
    expect((payload[6] << 8) | payload[7]).toBe(expected);
  });

  it('cover all bytes but their own', () => {
    fc.assert(
      fc.property(
        fc.uint8Array({ minLength: 8, maxLength: 8 }),
        fc.constantFrom(...Object.keys(crcs)),
        fc.nat(4),
        fc.nat(14),
        (bytes, crc, at, counter) => {
          const payload = Uint8Array.from(bytes);
          const width = crcs[crc as keyof typeof crcs].width / 8;
          const start = at > 0 ? 0 : 8 * width;
          const protector = protectorOf({ start, length: 4, modulo: 15, crc, byte: at });
          protector.protect(payload, 8, counter);
          expect(protector.check(payload, 8)).toBe(counter);
          for (let byte = 0; byte < 8; byte += 1) {
            payload[byte] ^= 0x10;
            expect(protector.check(payload, 8)).toBe(-1);
            payload[byte] ^= 0x10;
          }
        },
      ),
      { numRuns: 200 },
    );
  });

  it('a counter alone has no check but its range', () => {
    const protector = protectorOf({ start: 0, length: 4, modulo: 15 }, 'counter');
    expect(protector.check(Uint8Array.of(0xae), 1)).toBe(14);
    expect(protector.check(Uint8Array.of(0xaf), 1)).toBe(-1);
  });

  it('say all that is wrong with their settings', () => {
    const { faults } = readProtection(
      message('m', 1, 'sent', [], {
        bytes: 8,
        protection: {
          kind: 'counter-and-crc',
          settings: { length: 40, crc: 'crc7', byte: 7, prefix: '300', colour: 1 },
        },
      }),
    );
    expect(faults.map((fault) => fault.what)).toEqual([
      'unknown setting of counter-and-crc',
      'start is missing',
      'length is not allowed',
      'crc is unknown',
      'prefix is not a row of bytes',
    ]);
  });
});
