import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { crc32 } from '../../bridge/checksums.js';
import { examineMap } from '../../bridge/examine-map.js';
import type { MapSignal, MessageSpec, WireType } from '../../bridge/message-map.js';
import { Datagram, fieldVerdicts, UdpCodec, UdpInbox, verdicts, writeControl } from '../../bridge/udp-codec.js';
import { canonicalText, kinds, limits, mapChecksum, sizes, udpLayout } from '../../bridge/udp-layout.js';
import { mapOf, message, sampleMap, signal } from './sample-map.js';

const types: WireType[] = ['u8', 'i8', 'u16', 'i16', 'u32', 'i32', 'f32', 'f64'];

const anySignal: fc.Arbitrary<Omit<MapSignal, 'name'>> = fc
  .record({
    type: fc.constantFrom(...types),
    scale: fc.constantFrom(1, 0.1, 0.01, 0.5, 2, -1, -0.25, 1e-3),
    offset: fc.constantFrom(0, -40, 100, 0.5),
    share: fc.tuple(fc.double({ min: 0, max: 1, noNaN: true }), fc.double({ min: 0, max: 1, noNaN: true })),
  })
  .map(({ type, scale, offset, share }) => {
    const [low, high] = type[0] === 'f' ? [-1e9, 1e9] : limits[type];
    const ends = share.map((part) => (low + part * (high - low)) * scale + offset).sort((a, b) => a - b);
    const { name: _name, ...rest } = signal('x', '', {
      type,
      scale,
      offset,
      least: ends[0],
      most: ends[1],
      substitute: ends[0],
    });
    return rest;
  })
  .filter((one) => examineMap(mapOf(message('m', 1, 'received', [{ name: 'x', ...one }]))).length === 0);

const anyMessage: fc.Arbitrary<MessageSpec> = fc
  .record({
    signals: fc.array(anySignal, { minLength: 1, maxLength: 12 }),
    identifier: fc.integer({ min: 1, max: 0xffff }),
    outOfRange: fc.constantFrom('refuse' as const, 'saturate' as const),
  })
  .map(({ signals, identifier, outOfRange }) =>
    message(
      'm',
      identifier,
      'received',
      signals.map((one, i) => ({ name: `s${i}`, ...one })),
      { outOfRange },
    ),
  );

function encode(codec: UdpCodec, values: readonly number[], sequence = 0, tick = 0): Datagram {
  const datagram = new Datagram(codec.length + 8);
  // A buffer is used again and again: what an earlier datagram left must not shine through.
  datagram.bytes.fill(0xff);
  expect(codec.quantise(Float64Array.from(values), 0, new Float64Array(codec.count), 0)).toBeGreaterThanOrEqual(0);
  expect(codec.write(datagram, sequence, tick)).toBe(codec.length);
  return datagram;
}

describe('layout', () => {
  it('aligns every number to its size and leaves no byte unaccounted', () => {
    fc.assert(
      fc.property(anyMessage, (spec) => {
        const layout = udpLayout(spec);
        const owner = new Uint8Array(layout.length);
        const claim = (from: number, count: number): void => {
          for (let i = from; i < from + count; i += 1) owner[i] += 1;
        };
        claim(0, 20);
        for (const field of layout.fields) {
          expect(field.offset % sizes[field.signal.type]).toBe(0);
          claim(field.offset, field.size);
        }
        for (const [from, count] of layout.padding) claim(from, count);
        claim(layout.checksumAt, 4);
        expect([...owner].every((claims) => claims === 1)).toBe(true);
      }),
    );
  });

  it('writes these bytes and no others', () => {
    const spec = message('m', 0x1234, 'sent', [
      signal('a', '', { type: 'u8', least: 0, most: 255 }),
      signal('b', '', { type: 'i16', scale: 0.1, least: -3000, most: 3000 }),
      signal('c', '', { type: 'f32' }),
      signal('d', '', { type: 'f64' }),
    ]);
    const codec = new UdpCodec(spec, 0x0a0b0c0d);
    const datagram = encode(codec, [200, -12.34, 1.5, -2.25], 0x01020304, -2);
    const hex = Buffer.from(datagram.bytes.subarray(0, codec.length - 4)).toString('hex');
    expect(hex).toBe(
      '4f494c53' +
        '01' +
        '01' +
        '3412' +
        '04030201' +
        'feffffff' +
        '0d0c0b0a' +
        'c8' +
        '00' +
        '85ff' +
        '0000c03f' +
        '00000000' +
        '00000000000002c0',
    );
    expect(datagram.view.getInt32(codec.length - 4, true)).toBe(crc32(datagram.bytes, 0, codec.length - 4));
  });

  it('has a checksum that follows what both ends must agree on and nothing else', () => {
    const map = sampleMap();
    const base = mapChecksum(map);
    const [first, ...others] = map.messages;
    const [one, ...rest] = first.signals;
    const changed = (changes: Partial<MapSignal>): number =>
      mapChecksum({ ...map, messages: [{ ...first, signals: [{ ...one, ...changes }, ...rest] }, ...others] });
    for (const changes of [
      { name: 'other' },
      { type: 'u32' as const },
      { scale: 0.02 },
      { offset: 1 },
      { most: 400 },
      { unit: 'MPa' },
      { names: { off: 0 } },
    ])
      expect(changed(changes)).not.toBe(base);
    for (const changes of [{ path: 'another.path' }, { about: 'other words' }]) expect(changed(changes)).toBe(base);
    expect(mapChecksum({ ...map, messages: [{ ...first, every: 7, timeout: 9 }, ...others] })).toBe(base);
    expect(canonicalText(map)).toContain('signal isolationValve u8 scale 1 offset 0 range 0 1 unit 1 shut=0 open=1\n');
  });
});

describe('codec', () => {
  it('brings back what was sent, within half a step of the wire, inside the range', () => {
    fc.assert(
      fc.property(
        anyMessage,
        fc.array(fc.double({ min: -0.2, max: 1.2, noNaN: true }), { minLength: 12, maxLength: 12 }),
        (spec, shares) => {
          const codec = new UdpCodec(spec, 77);
          const inbox = new UdpInbox([codec], 77);
          const values = spec.signals.map((one, i) => one.least + shares[i] * (one.most - one.least));
          const carried = new Float64Array(codec.count);
          const outside = values.filter(
            (value, i) => value < spec.signals[i].least || value > spec.signals[i].most,
          ).length;
          expect(codec.quantise(Float64Array.from(values), 0, carried, 0)).toBe(outside);
          const datagram = encode(codec, values);
          expect(inbox.inspect(datagram, codec.length)).toBe(verdicts.sound);
          expect(inbox.index(datagram)).toBe(0);
          const back = new Float64Array(codec.count);
          expect(codec.read(datagram, back, 0)).toBe(fieldVerdicts.fine);
          spec.signals.forEach((one, i) => {
            const inside = Math.min(one.most, Math.max(one.least, values[i]));
            const step = one.type === 'f64' ? Number.EPSILON : one.type === 'f32' ? 2 ** -23 : 0;
            const error =
              one.type[0] === 'f'
                ? step * (Math.abs(inside) + 2 * Math.abs(one.offset))
                : 0.5000001 * Math.abs(one.scale);
            expect(Math.abs(back[i] - inside)).toBeLessThanOrEqual(error);
            expect(back[i]).toBeGreaterThanOrEqual(one.least);
            expect(back[i]).toBeLessThanOrEqual(one.most);
            expect(Math.abs(carried[i] - inside)).toBeLessThanOrEqual(error);
          });
        },
      ),
      { numRuns: 500 },
    );
  });

  it('refuses to send what is not finite', () => {
    const codec = new UdpCodec(message('m', 1, 'sent', [signal('a', ''), signal('b', '')]), 0);
    for (const bad of [Number.NaN, Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY])
      expect(codec.quantise(Float64Array.of(1, bad), 0, new Float64Array(2), 0)).toBe(-1);
  });

  it('refuses what is not finite and what is out of range when it comes, or brings it into range where the map says so', () => {
    const make = (outOfRange: 'refuse' | 'saturate'): UdpCodec =>
      new UdpCodec(message('m', 1, 'received', [signal('a', '', { least: -10, most: 10.1 })], { outOfRange }), 0);
    const values = new Float64Array(1);
    for (const [wire, refusing, saturating, value] of [
      [Number.NaN, fieldVerdicts.refused, fieldVerdicts.refused, 0],
      [Number.POSITIVE_INFINITY, fieldVerdicts.refused, fieldVerdicts.refused, 0],
      [10.2, fieldVerdicts.refused, fieldVerdicts.saturated, 10.1],
      [-1e30, fieldVerdicts.refused, fieldVerdicts.saturated, -10],
      // 10.1 as a 32-bit number is a little more than 10.1: what was sent as the bound is inside.
      [10.1, fieldVerdicts.fine, fieldVerdicts.fine, 10.1],
    ] as const) {
      const datagram = encode(make('refuse'), [0]);
      datagram.view.setFloat32(20, wire, true);
      expect(make('refuse').read(datagram, values, 0)).toBe(refusing);
      expect(make('saturate').read(datagram, values, 0)).toBe(saturating);
      if (saturating !== fieldVerdicts.refused) expect(values[0]).toBe(value);
    }
  });
});

describe('inbox', () => {
  const map = sampleMap();
  const checksum = mapChecksum(map);
  const codecs = map.messages.filter((one) => one.direction === 'received').map((one) => new UdpCodec(one, checksum));
  const inbox = new UdpInbox(codecs, checksum);
  const sound = (): Datagram => encode(codecs[0], [100, 1], 5, 6);
  const sign = (datagram: Datagram, length: number): Datagram => {
    datagram.view.setInt32(length - 4, crc32(datagram.bytes, 0, length - 4), true);
    return datagram;
  };

  it('tells what is wrong with a datagram', () => {
    const length = codecs[0].length;
    const changed = (change: (datagram: Datagram) => void, signed: boolean): number => {
      const datagram = sound();
      change(datagram);
      return inbox.inspect(signed ? sign(datagram, length) : datagram, length);
    };
    expect(inbox.inspect(sound(), length)).toBe(verdicts.sound);
    expect(changed((d) => d.view.setUint8(0, 0x4e), true)).toBe(verdicts.malformed);
    expect(changed((d) => d.view.setUint8(4, 2), true)).toBe(verdicts.malformed);
    expect(changed((d) => d.view.setUint8(5, 9), true)).toBe(verdicts.malformed);
    expect(changed((d) => d.view.setUint16(6, 999, true), true)).toBe(verdicts.malformed);
    expect(changed((d) => d.view.setInt32(16, 1, true), true)).toBe(verdicts.wrongMap);
    expect(changed((d) => d.view.setUint16(20, 7, true), false)).toBe(verdicts.wrongChecksum);
    expect(changed((d) => d.view.setUint16(6, 33, true), true)).toBe(verdicts.wrongLength);
    for (let cut = 0; cut < length; cut += 1) expect(inbox.inspect(sound(), cut)).toBe(verdicts.wrongLength);
    expect(inbox.inspect(sound(), length + 1)).toBe(verdicts.wrongLength);
    const control = new Datagram(64);
    expect(inbox.inspect(control, writeControl(control, kinds.hello, 1, 2, checksum))).toBe(verdicts.sound);
  });

  it('finds every single and double bit error', () => {
    const length = codecs[0].length;
    const datagram = sound();
    for (let one = 0; one < length * 8; one += 1)
      for (let other = one; other < length * 8; other += 1) {
        datagram.bytes[one >> 3] ^= 1 << (one & 7);
        if (other !== one) datagram.bytes[other >> 3] ^= 1 << (other & 7);
        if (inbox.inspect(datagram, length) === verdicts.sound) expect.unreachable(`bits ${one} and ${other}`);
        datagram.bytes[one >> 3] ^= 1 << (one & 7);
        if (other !== one) datagram.bytes[other >> 3] ^= 1 << (other & 7);
      }
    expect(inbox.inspect(datagram, length)).toBe(verdicts.sound);
  });

  it('believes no random bytes', () => {
    const datagram = new Datagram(inbox.capacity);
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: inbox.capacity }), fc.boolean(), (bytes, dressed) => {
        datagram.bytes.fill(0);
        datagram.bytes.set(bytes);
        if (dressed) datagram.bytes.set(sound().bytes.subarray(0, 20));
        expect(inbox.inspect(datagram, bytes.length)).not.toBe(verdicts.sound);
      }),
      { numRuns: 2000 },
    );
  });
});

describe('examination of a map', () => {
  it('finds nothing in a sound map', () => expect(examineMap(sampleMap())).toEqual([]));

  it.each([
    ['a link that is not there', mapOf(message('m', 1, 'sent', [], { link: 'other' })), 'unknown link'],
    [
      'a number that is taken',
      mapOf(message('m', 1, 'sent', []), message('n', 1, 'received', [])),
      'the number is taken on this link',
    ],
    ['a number too large', mapOf(message('m', 0x10000, 'sent', [])), 'the number does not fit a datagram'],
    ['a name twice', mapOf(message('m', 1, 'sent', []), message('m', 2, 'sent', [])), 'the name is taken'],
    ['a name C cannot have', mapOf(message('m-1', 1, 'sent', [])), 'the name cannot be used in C'],
    [
      'a signal named like a count',
      mapOf(message('m', 1, 'received', [signal('age', '')])),
      'the name belongs to the link itself',
    ],
    [
      'a range that does not fit',
      mapOf(message('m', 1, 'sent', [signal('a', '', { type: 'u8', least: 0, most: 300 })])),
      'the range does not fit u8',
    ],
    [
      'a range that rounds over the end',
      mapOf(message('m', 1, 'sent', [signal('a', '', { type: 'u8', least: 0, most: 255.5 })])),
      'the range does not fit u8',
    ],
    [
      'a range upside down',
      mapOf(message('m', 1, 'sent', [signal('a', '', { least: 2, most: 1 })])),
      'the range is upside down',
    ],
    ['a scale of zero', mapOf(message('m', 1, 'sent', [signal('a', '', { scale: 0 })])), 'the scale is zero'],
    [
      'a substitute out of range',
      mapOf(message('m', 1, 'received', [signal('a', '', { least: 1, most: 2 })])),
      'the substitute lies outside the range',
    ],
    [
      'a phase outside the cycle',
      mapOf(message('m', 1, 'sent', [], { every: 10, phase: 10 })),
      'the phase lies outside the cycle',
    ],
    ['no cycle', mapOf(message('m', 1, 'sent', [], { every: 0 })), 'the cycle is not a whole number of ticks'],
    [
      'a datagram too long',
      mapOf(
        message(
          'm',
          1,
          'sent',
          Array.from({ length: 200 }, (_, i) => signal(`s${i}`, '', { type: 'f64' })),
        ),
      ),
      'the datagram is too long',
    ],
  ])('finds %s', (_what, map, problem) => expect(examineMap(map).map((one) => one.what)).toContain(problem));
});
