import fc from 'fast-check';
import { Packr, unpack } from 'msgpackr';
import { describe, expect, it } from 'vitest';
import { CanDatagram } from '../../bridge/can-datagram.js';
import { frameFlags, frameSizes, identifierFlags, makeFrame } from '../../bridge/can-frame.js';

// The oracle: a general msgpack library over the eleven keys of python-can's format.
const packr = new Packr({ useRecords: false, variableMapSize: true });

interface Fields {
  readonly timestamp: number;
  readonly arbitration_id: number;
  readonly is_extended_id: boolean;
  readonly is_remote_frame: boolean;
  readonly is_error_frame: boolean;
  readonly channel: string | null;
  readonly dlc: number;
  readonly data: Buffer;
  readonly is_fd: boolean;
  readonly bitrate_switch: boolean;
  readonly error_state_indicator: boolean;
}

const flexibleLengths = [0, 1, 2, 3, 4, 5, 6, 7, 8, 12, 16, 20, 24, 32, 48, 64];
const anyFields: fc.Arbitrary<Fields> = fc
  .record({
    timestamp: fc
      .double({ min: 1e9, max: 4e9, noNaN: true, noDefaultInfinity: true })
      .filter((value) => !Number.isInteger(value)),
    is_extended_id: fc.boolean(),
    identifier: fc.oneof(fc.constantFrom(0, 0x7f, 0x80, 0xff, 0x100, 0xffff, 0x10000, 0x1fffffff), fc.nat(0x1fffffff)),
    is_fd: fc.boolean(),
    remote: fc.boolean(),
    is_error_frame: fc.boolean(),
    bytes: fc.uint8Array({ minLength: 64, maxLength: 64 }),
    size: fc.nat(15),
    bitrate_switch: fc.boolean(),
    error_state_indicator: fc.boolean(),
  })
  .map((one) => {
    const dlc = one.is_fd ? flexibleLengths[one.size] : one.size % 9;
    const remote = one.remote && !one.is_fd;
    return {
      timestamp: one.timestamp,
      arbitration_id: one.is_extended_id ? one.identifier : one.identifier % 0x800,
      is_extended_id: one.is_extended_id,
      is_remote_frame: remote,
      is_error_frame: one.is_error_frame && !one.is_fd,
      channel: null,
      dlc,
      data: Buffer.from(one.bytes.subarray(0, remote ? 0 : dlc)),
      is_fd: one.is_fd,
      bitrate_switch: one.is_fd && one.bitrate_switch,
      error_state_indicator: one.is_fd && one.error_state_indicator,
    };
  });

function frameOf(fields: Fields): Uint8Array {
  const frame = makeFrame(fields.arbitration_id, fields.data, {
    extended: fields.is_extended_id,
    remote: fields.is_remote_frame,
    flexible: fields.is_fd,
    bitRateSwitch: fields.bitrate_switch,
  });
  frame[4] = fields.dlc;
  if (fields.error_state_indicator) frame[5] |= frameFlags.errorState;
  if (fields.is_error_frame) frame[3] |= identifierFlags.error >>> 24;
  return frame;
}

describe('CAN frames as datagrams', () => {
  it('are the published example, byte for byte', () => {
    const datagram = new CanDatagram();
    const length = datagram.write(makeFrame(0x123, [1, 2, 3]), frameSizes.classic, new Float64Array(1), 0);
    expect(Buffer.from(datagram.bytes.subarray(0, length)).toString('hex')).toBe(
      '8ba974696d657374616d70cb0000000000000000ae6172626974726174696f6e5f6964cd0123ae69735f657874656e6465645f6964c2af69735f72656d6f74655f6672616d65c2ae69735f6572726f725f6672616d65c2a76368616e6e656cc0a3646c6303a464617461c403010203a569735f6664c2ae626974726174655f737769746368c2b56572726f725f73746174655f696e64696361746f72c2',
    );
  });

  it('are the bytes that a msgpack library writes, and read back from them', () => {
    const datagram = new CanDatagram();
    const frame = new Uint8Array(frameSizes.flexible);
    fc.assert(
      fc.property(anyFields, (fields) => {
        const expected = frameOf(fields);
        const packed = packr.pack(fields);
        const length = datagram.write(expected, expected.length, Float64Array.of(fields.timestamp), 0);
        expect(Buffer.from(datagram.bytes.subarray(0, length))).toEqual(packed);
        const unpacked = unpack(datagram.bytes.subarray(0, length)) as Fields;
        expect({ ...unpacked, data: Buffer.from(unpacked.data) }).toEqual(fields);
        datagram.bytes.set(packed);
        expect(datagram.read(packed.length, frame)).toBe(expected.length);
        expect(frame.subarray(0, expected.length)).toEqual(expected);
        expect(datagram.stamp[0]).toBe(fields.timestamp);
      }),
      { numRuns: 2000 },
    );
  });

  it('may name a channel of any length', () => {
    const datagram = new CanDatagram();
    const frame = new Uint8Array(frameSizes.flexible);
    for (const channel of ['', 'vcan0', 'x'.repeat(31), 'y'.repeat(200)]) {
      const packed = packr.pack({
        timestamp: 1.5,
        arbitration_id: 5,
        is_extended_id: false,
        is_remote_frame: false,
        is_error_frame: false,
        channel,
        dlc: 1,
        data: Buffer.of(9),
        is_fd: false,
        bitrate_switch: false,
        error_state_indicator: false,
      });
      datagram.bytes.set(packed);
      expect(datagram.read(packed.length, frame)).toBe(16);
      expect(frame[8]).toBe(9);
    }
  });

  it('are refused when cut, changed or lying about their length, and nothing throws', () => {
    const datagram = new CanDatagram();
    const frame = new Uint8Array(frameSizes.flexible);
    fc.assert(
      fc.property(anyFields, fc.nat(), fc.nat(255), fc.uint8Array({ maxLength: 400 }), (fields, seed, byte, noise) => {
        const packed = packr.pack(fields);
        datagram.bytes.set(packed);
        const cut = seed % packed.length;
        expect(datagram.read(cut, frame)).toBe(-1);
        datagram.bytes.set(packed);
        datagram.bytes[cut] = byte;
        const size = datagram.read(packed.length, frame);
        if (size >= 0) expect(frame[4]).toBeLessThanOrEqual(size === frameSizes.classic ? 8 : 64);
        datagram.bytes.fill(0);
        datagram.bytes.set(noise);
        expect(datagram.read(noise.length, frame)).toBe(-1);
        const lying = packr.pack({ ...fields, dlc: 65 });
        datagram.bytes.set(lying);
        expect(datagram.read(lying.length, frame)).toBe(-1);
      }),
      { numRuns: 2000 },
    );
    expect(datagram.read(10_000, frame)).toBe(-1);
  });
});
