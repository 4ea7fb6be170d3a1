import { Worker } from 'node:worker_threads';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { createRing, type RingHandle, RingReader, RingWriter } from '../../runtime/ring.js';
import { typescriptArguments } from '../support/child.js';

/** Writes a record of `length` bytes that all have the value of `seed`; true when it was taken. */
function put(ring: RingWriter, kind: number, length: number, seed: number, droppable: boolean): boolean {
  const at = ring.claim(kind, length, droppable);
  if (at < 0) return false;
  expect(at % 8).toBe(0);
  expect(at + length).toBeLessThanOrEqual(ring.capacity);
  ring.bytes.fill(seed & 255, at, at + length);
  ring.publish();
  return true;
}

function take(ring: RingReader): { kind: number; length: number; seed: number } | undefined {
  if (!ring.next()) return undefined;
  const bytes = ring.bytes.subarray(ring.offset, ring.offset + ring.length);
  const seed = bytes[0] ?? -1;
  expect(bytes.every((byte) => byte === seed)).toBe(true);
  return { kind: ring.kind, length: ring.length, seed };
}

type Step = { do: 'put'; length: number; droppable: boolean } | { do: 'take'; count: number } | { do: 'release' };
const step: fc.Arbitrary<Step> = fc.oneof(
  {
    weight: 4,
    arbitrary: fc.record({ do: fc.constant('put' as const), length: fc.nat(200), droppable: fc.boolean() }),
  },
  { weight: 2, arbitrary: fc.record({ do: fc.constant('take' as const), count: fc.nat(6) }) },
  { weight: 2, arbitrary: fc.record({ do: fc.constant('release' as const) }) },
);

describe('ring', () => {
  it('hands over exactly what it took, in order, for any sequence of calls', () => {
    let refused = 0;
    fc.assert(
      fc.property(fc.array(step, { maxLength: 400 }), fc.constantFrom(256, 512, 1024), (steps, capacity) => {
        const handle = createRing({ capacity, reserve: capacity / 4, whenFull: 'drop' });
        const writer = new RingWriter(handle);
        const reader = new RingReader(handle);
        const model: { kind: number; length: number; seed: number }[] = [];
        let dropped = 0;
        let overflows = 0;
        let number = 0;
        for (const one of steps) {
          if (one.do === 'put') {
            number += 1;
            const free = capacity - writer.used;
            const taken = put(writer, number, one.length, number, one.droppable);
            if (taken) {
              model.push({ kind: number, length: one.length, seed: one.length === 0 ? -1 : number & 255 });
              // A droppable record leaves the reserve alone.
              if (one.droppable) expect(capacity - writer.used).toBeGreaterThanOrEqual(capacity / 4);
            } else {
              if (one.length + 16 <= capacity / 2) {
                if (one.droppable) dropped += 1;
                else {
                  overflows += 1;
                  // Refused for want of room only: the record, or the record and the padding ahead of it, did not fit.
                  expect(free).toBeLessThan(2 * (one.length + 16));
                }
              } else overflows += 1;
            }
            expect(writer.used).toBeLessThanOrEqual(capacity);
          } else if (one.do === 'take') {
            for (let i = 0; i < one.count; i += 1) {
              const found = take(reader);
              expect(found).toEqual(model.shift());
              if (found === undefined) break;
            }
          } else reader.release();
        }
        for (let found = take(reader); found !== undefined; found = take(reader)) expect(found).toEqual(model.shift());
        expect(model).toEqual([]);
        reader.release();
        expect(reader.used).toBe(0);
        expect([reader.dropped, reader.overflows]).toEqual([dropped, overflows]);
        refused += dropped + overflows;
      }),
      { numRuns: 300, seed: 7 },
    );
    expect(refused).toBeGreaterThan(100);
  });

  it('keeps its reserve for records that must not be lost', () => {
    const handle = createRing({ capacity: 1024, reserve: 512, whenFull: 'drop' });
    const writer = new RingWriter(handle);
    let rows = 0;
    while (put(writer, 1, 56, 1, true)) rows += 1;
    expect(rows).toBe(8);
    expect(writer.dropped).toBe(1);
    let inputs = 0;
    while (put(writer, 2, 56, 2, false)) inputs += 1;
    expect(inputs).toBe(8);
    expect([writer.dropped, writer.overflows]).toEqual([1, 1]);
  });

  it('goes on past 2^32 bytes', () => {
    const handle = createRing({ capacity: 256, reserve: 0, whenFull: 'drop' });
    // As after 4 GB: both counters just below the wrap.
    const control = new Int32Array(handle.memory, 0, 64);
    control[0] = control[16] = -128;
    const writer = new RingWriter(handle);
    const reader = new RingReader(handle);
    for (let i = 0; i < 100; i += 1) {
      expect(put(writer, i, 40, i, false)).toBe(true);
      expect(take(reader)).toEqual({ kind: i, length: 40, seed: i });
      reader.release();
    }
    expect(reader.used).toBe(0);
  });

  it('counts a record larger than half the ring as an overflow instead of waiting for ever', () => {
    const writer = new RingWriter(createRing({ capacity: 256, whenFull: 'wait' }));
    expect(writer.claim(1, 200, false)).toBe(-1);
    expect(writer.overflows).toBe(1);
  });

  it('gives up when patience runs out, and at once when aborted', () => {
    const handle = createRing({ capacity: 256, whenFull: 'wait', patience: 20 });
    const writer = new RingWriter(handle);
    while (writer.used < 256) put(writer, 1, 24, 1, true);
    expect(put(writer, 1, 24, 1, true)).toBe(false);
    expect([writer.dropped, writer.overflows]).toEqual([0, 1]);
    const patient = new RingWriter({ ...handle, patience: 1e9 });
    patient.abort();
    expect(patient.claim(1, 24, false)).toBe(-1);
    expect(patient.aborted).toBe(true);
  });

  it('refuses sizes that cannot work', () => {
    expect(() => createRing({ capacity: 1000, whenFull: 'drop' })).toThrow(/capacity 1000 bytes: a power of two/);
    expect(() => createRing({ capacity: 1024, reserve: 1024, whenFull: 'drop' })).toThrow(/reserve 1024/);
  });

  for (const whenFull of ['wait', 'drop'] as const) {
    it(`carries records between two threads (${whenFull})`, async () => {
      const handle: RingHandle = createRing({ capacity: 4096, reserve: 1024, whenFull });
      const count = 20_000;
      const worker = new Worker(new URL('./ring-producer.ts', import.meta.url), {
        execArgv: [...typescriptArguments],
        workerData: { handle, count },
      });
      const ended = new Promise<void>((resolve, reject) => worker.once('exit', () => resolve()).once('error', reject));
      const reader = new RingReader(handle);
      let last = -1;
      let got = 0;
      for (;;) {
        const over = reader.closed;
        while (reader.next()) {
          const number = reader.f64[reader.offset >> 3]!;
          expect(number).toBeGreaterThan(last);
          for (let i = 8; i < reader.length; i += 1)
            if (reader.bytes[reader.offset + i] !== (number & 255)) throw new Error(`record ${number} is torn`);
          last = number;
          got += 1;
        }
        reader.release();
        if (over) break;
        if ((got & 63) === 0) await new Promise((resolve) => setImmediate(resolve));
      }
      await ended;
      expect(got + reader.dropped + reader.overflows).toBe(count);
      if (whenFull === 'wait') expect([reader.dropped, reader.overflows, last]).toEqual([0, 0, count - 1]);
    });
  }
});
