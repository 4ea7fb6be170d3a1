import { gzipSync } from 'node:zlib';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { crc8H2F, crc8J1850, crc15Can, crc16, crc32, crc32P4 } from '../../bridge/checksums.js';

const digits = new TextEncoder().encode('123456789');

describe('checksums of "123456789"', () => {
  // AUTOSAR Classic Platform, Specification of CRC Routines (SWS_CRCLibrary), the "check" value of each routine;
  // CRC-15 CAN: catalogue of parametrised CRC algorithms (reveng.sourceforge.io/crc-catalogue), ISO 11898-1 polynomial.
  it.each([
    ['CRC-8 SAE J1850', crc8J1850, 0x4b],
    ['CRC-8H2F', crc8H2F, 0xdf],
    ['CRC-16 CCITT-FALSE', crc16, 0x29b1],
    ['CRC-32 IEEE 802.3', crc32, 0xcbf43926],
    ['CRC-32P4', crc32P4, 0x1697d06a],
    ['CRC-15 CAN', crc15Can, 0x059e],
  ] as const)('%s', (_name, check, value) => {
    expect(check(digits, 0, digits.length) >>> 0).toBe(value);
  });

  it('looks at bytes[from .. to) and at nothing else', () => {
    fc.assert(
      fc.property(
        fc.uint8Array({ maxLength: 40 }),
        fc.uint8Array({ maxLength: 8 }),
        fc.uint8Array({ maxLength: 8 }),
        (data, before, after) => {
          const framed = Uint8Array.from([...before, ...data, ...after]);
          for (const check of [crc8J1850, crc8H2F, crc16, crc32, crc32P4, crc15Can])
            expect(check(framed, before.length, before.length + data.length)).toBe(check(data, 0, data.length));
        },
      ),
      { numRuns: 200 },
    );
  });

  // SWS_CRCLibrary: examples of 8-bit checks over 00 00 00 00.
  it('over four zero bytes', () => {
    const zeros = new Uint8Array(4);
    expect(crc8J1850(zeros, 0, 4)).toBe(0x59);
    expect(crc8H2F(zeros, 0, 4)).toBe(0x12);
    expect(crc16(zeros, 0, 4)).toBe(0x84c0);
    expect(crc32(zeros, 0, 4) >>> 0).toBe(0x2144df1c);
    expect(crc32P4(zeros, 0, 4) >>> 0).toBe(0x6fb32240);
  });

  // RFC 1952 section 2.3.1: the trailer of a gzip member is the CRC-32 of the data, then its length.
  it('CRC-32 as zlib writes it into a gzip trailer', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), (data) => {
        const member = gzipSync(data);
        expect(crc32(data, 0, data.length)).toBe(member.readInt32LE(member.length - 8));
      }),
      { numRuns: 100 },
    );
  });
});
