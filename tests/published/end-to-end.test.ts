import { describe, expect, it } from 'vitest';
import type { Protection } from '../../bridge/message-map.js';
import { makeProtector } from '../../bridge/protection/make.js';
import { message } from '../bridge/sample-map.js';

/*
 * AUTOSAR Foundation, "E2E Protocol Specification" (PRS_E2EProtocol): its worked examples for profiles 1, 2, 4, 5 and 11
 * as the tests of the open-source package `e2e` (PyPI, MIT) repeat them. Profile 22 is the computation of profile 2 with
 * another state machine: the same bytes.
 */
const hex = (bytes: Uint8Array): string => Buffer.from(bytes).toString('hex');

function protectorOf(protection: Protection, bytes: number) {
  return makeProtector(message('m', 1, 'sent', [], { bytes, protection, flexibleDataRate: bytes > 8 }))!;
}

/** The bytes of a payload, protected with this counter; and that the check takes them and no payload with a bit flipped. */
function protectedBytes(kind: string, settings: Protection['settings'], payload: Uint8Array, counter: number): string {
  const protector = protectorOf({ kind, settings }, payload.length);
  protector.protect(payload, payload.length, counter);
  expect(protector.check(payload, payload.length)).toBe(counter);
  for (let bit = 0; bit < payload.length * 8; bit += 1) {
    payload[bit >> 3] ^= 1 << (bit & 7);
    expect(protector.check(payload, payload.length)).toBe(-1);
    payload[bit >> 3] ^= 1 << (bit & 7);
  }
  return hex(payload);
}

describe('profile 1 and profile 11, data identifier 0x123', () => {
  it.each([
    ['e2e-1', 'both', 0, 'cc00000000000000'],
    ['e2e-1', 'both', 1, '9101000000000000'],
    ['e2e-1', 'alternating', 0, 'ce00000000000000'],
    ['e2e-1', 'alternating', 1, '0201000000000000'],
    ['e2e-1', 'low', 0, 'ce00000000000000'],
    ['e2e-1', 'low', 1, '9301000000000000'],
    ['e2e-1', 'nibble', 0, '2a10000000000000'],
    ['e2e-1', 'nibble', 1, '7711000000000000'],
    ['e2e-11', 'both', 0, 'cc00000000000000'],
    ['e2e-11', 'both', 1, '9101000000000000'],
    ['e2e-11', 'nibble', 0, '2a10000000000000'],
    ['e2e-11', 'nibble', 1, '7711000000000000'],
  ])('%s %s, counter %d', (kind, mode, counter, expected) => {
    expect(protectedBytes(kind, { dataId: 0x123, mode }, new Uint8Array(8), counter)).toBe(expected);
  });

  it('with an offset of eight bytes', () => {
    const at = (kind: string, counter: number): string =>
      protectedBytes(kind, { dataId: 0x123, mode: 'nibble', offset: 8 }, new Uint8Array(16), counter);
    expect(at('e2e-11', 0)).toBe('00000000000000007d10000000000000');
    expect(at('e2e-1', 1)).toBe('00000000000000002011000000000000');
  });
});

describe('profile 2 and profile 22', () => {
  const ids = Array.from({ length: 16 }, (_, i) => i + 1).join(' ');
  const published = '0e 1b 98 31 0d 18 9b 65 08 1d 9e 37 0b 1e 9d cd'.split(' ');
  it.each(published.map((check, counter) => [counter, check]))('identifiers 1 .. 16, counter %d', (counter, check) => {
    const expected = `${check}0${Number(counter).toString(16)}000000000000`;
    expect(protectedBytes('e2e-2', { dataIds: ids }, new Uint8Array(8), Number(counter))).toBe(expected);
    expect(protectedBytes('e2e-22', { dataIds: ids }, new Uint8Array(8), Number(counter))).toBe(expected);
  });

  it('over bytes 0 .. 7 and identifiers 0 .. 15', () => {
    const list = Array.from({ length: 16 }, (_, i) => i).join(' ');
    expect(protectedBytes('e2e-2', { dataIds: list }, Uint8Array.from([0, 1, 2, 3, 4, 5, 6, 7]), 2)).toBe(
      'bc02020304050607',
    );
    expect(protectedBytes('e2e-2', { dataIds: list }, Uint8Array.from([0, 1, 2, 3, 4, 5, 6, 7]), 1)).toBe(
      '6101020304050607',
    );
  });
});

describe('profile 4, data identifier 0x0A0B0C0D', () => {
  it.each([
    [16, 0, 0, '001000000a0b0c0d862b055600000000'],
    [16, 0, 1, '001000010a0b0c0da58e680700000000'],
    [24, 8, 0, '0000000000000000001800000a0b0c0d69d7502e00000000'],
  ])('%d bytes, header at %d, counter %d', (bytes, offset, counter, expected) => {
    expect(protectedBytes('e2e-4', { dataId: 0x0a0b0c0d, offset }, new Uint8Array(bytes), counter)).toBe(expected);
  });
});

describe('profile 5, data identifier 0x1234', () => {
  it.each([
    [8, 0, 0, '1cca000000000000'],
    [8, 0, 1, 'cf8d010000000000'],
    [16, 8, 0, '00000000000000002891000000000000'],
    [16, 8, 1, '0000000000000000fbd6010000000000'],
  ])('%d bytes, header at %d, counter %d', (bytes, offset, counter, expected) => {
    expect(protectedBytes('e2e-5', { dataId: 0x1234, offset }, new Uint8Array(bytes), counter)).toBe(expected);
  });
});
