import { describe, expect, it } from 'vitest';
import { frameBits } from '../../bridge/frame-bits.js';
import { arbitrationKey, type FrameStream, responseTimes } from '../../bridge/response-times.js';

describe('frame lengths', () => {
  // Davis, Burns, Bril, Lukkien, Real-Time Systems 35 (2007) 239, equations 2 and 3: 55 + 10 s and 80 + 10 s bits.
  it('of classic frames are 55 + 10 s bits, and 80 + 10 s with 29 bit identifiers', () => {
    for (let bytes = 0; bytes <= 8; bytes += 1) {
      expect(frameBits(bytes)).toEqual({ nominal: 55 + 10 * bytes, data: 0 });
      expect(frameBits(bytes, { extended: true })).toEqual({ nominal: 80 + 10 * bytes, data: 0 });
    }
  });

  // linux/can/length.h, can_frame_bits() of the Linux kernel: header 22 or 41 bits and payload stuffed, CRC field of 28 or 33
  // bits with its delimiter, footer 9, intermission 3.
  it('of FD frames are those of the Linux kernel, whatever goes at which rate', () => {
    for (const bytes of [0, 1, 8, 12, 16, 20, 32, 64])
      for (const extended of [false, true]) {
        const stuffed = (extended ? 41 : 22) + 8 * bytes;
        const kernel = stuffed + Math.floor((stuffed - 1) / 4) + (bytes <= 16 ? 28 : 33) + 9 + 3;
        const plain = frameBits(bytes, { extended, flexible: true });
        const switched = frameBits(bytes, { extended, flexible: true, bitRateSwitch: true });
        expect(plain).toEqual({ nominal: kernel, data: 0 });
        expect(switched.nominal + switched.data).toBe(kernel);
        // SOF to BRS with their stuff bits, CRC delimiter to intermission
        expect(switched.nominal).toBe(extended ? 36 + 8 + 13 : 17 + 4 + 13);
      }
  });
});

describe('response times', () => {
  /** Frames of 7 bytes at 125 kbit/s: 125 bits, 1 ms. */
  const time = frameBits(7).nominal / 125e3;
  const stream = (priority: number, period: number): FrameStream => ({ priority, period, time, jitter: 0 });

  // The paper's example (section 3.1): A every 2.5 ms, B and C every 3.5 ms, each 1 ms. The first frame of C needs 3 ms,
  // the second one, in the same busy period, 3.5 ms: what the analysis of 1994 missed.
  it('are those of the example by which the analysis was corrected', () => {
    expect(time).toBe(1e-3);
    const [a, b, c] = responseTimes([stream(1, 2.5e-3), stream(2, 3.5e-3), stream(3, 3.5e-3)], 8e-6);
    expect(a.response).toBeCloseTo(2e-3, 12);
    expect(b.response).toBeCloseTo(3e-3, 12);
    expect(c.response).toBeCloseTo(3.5e-3, 12);
    expect(c.queueing).toBeCloseTo(2.5e-3, 12);
  });

  it('are never above those of a bus played frame by frame, whatever its phases, and reached by some', () => {
    const bit = 1 / 125e3;
    const streams = [stream(1, 4e-3), stream(2, 6e-3), stream(3, 7e-3), stream(4, 9e-3)];
    const bound = responseTimes(streams, bit);
    const worst = streams.map(() => 0);
    let seed = 5;
    const random = (most: number): number => {
      seed = (Math.imul(seed, 1664525) + 1013904223) >>> 0;
      return (seed / 2 ** 32) * most;
    };
    for (let round = 0; round < 400; round += 1) {
      const offsets = streams.map(({ period }, i) => (round < 4 ? (i > round ? 0 : bit) : random(period)));
      const seen = play(streams, offsets, 0.3);
      for (let i = 0; i < worst.length; i += 1) worst[i] = Math.max(worst[i], seen[i]);
    }
    for (let i = 0; i < worst.length; i += 1) {
      expect(worst[i]).toBeLessThanOrEqual(bound[i].response + 1e-9);
      expect(worst[i]).toBeGreaterThan(0.8 * bound[i].response);
    }
  });

  it('are endless on a bus that cannot carry its load', () => {
    const [a, b] = responseTimes([stream(1, 1.5e-3), stream(2, 2e-3)], 8e-6);
    expect(a.response).toBeCloseTo(2e-3, 12);
    expect(b.response).toBe(Infinity);
  });

  // ISO 11898-1: a standard frame wins against an extended one with the same base identifier.
  it('go by the arbitration: base identifier first, then 11 bits before 29', () => {
    const keys = [
      arbitrationKey(0x100, false),
      arbitrationKey(0x100 << 18, true),
      arbitrationKey((0x100 << 18) | 1, true),
      arbitrationKey(0x101, false),
      arbitrationKey(0x1fffffff, true),
    ];
    expect(keys).toEqual([...keys].sort((x, y) => x - y));
    expect(new Set(keys).size).toBe(keys.length);
  });
});

/** Longest time from due to done of each stream on a bus that sends the most urgent waiting frame whenever it is free. */
function play(streams: readonly FrameStream[], offsets: readonly number[], until: number): number[] {
  const next = [...offsets];
  const waiting: { due: number; stream: number }[] = [];
  const worst = streams.map(() => 0);
  let now = 0;
  while (now < until) {
    streams.forEach((stream, i) => {
      for (; next[i] <= now; next[i] += stream.period) waiting.push({ due: next[i], stream: i });
    });
    if (waiting.length === 0) {
      now = Math.min(...next);
      continue;
    }
    waiting.sort((x, y) => streams[x.stream].priority - streams[y.stream].priority || x.due - y.due);
    const { due, stream } = waiting.shift()!;
    now += streams[stream].time;
    worst[stream] = Math.max(worst[stream], now - due);
  }
  return worst;
}
