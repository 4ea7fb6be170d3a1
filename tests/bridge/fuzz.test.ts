import fc from 'fast-check';
import { expect, it } from 'vitest';
import { crc32 } from '../../bridge/checksums.js';
import { Datagram } from '../../bridge/udp-codec.js';
import { noJournal } from '../../runtime/journal.js';
import { Rig } from './rig.js';
import { sampleMap } from './sample-map.js';

/** Numbers of a xorshift generator (Marsaglia 2003): the same in every run of a seed. */
function generator(seed: number): () => number {
  let state = seed | 1;
  return () => {
    state ^= state << 13;
    state ^= state >>> 17;
    state ^= state << 5;
    return state >>> 0;
  };
}

/**
 * Datagrams with a right header and checksum and random fields, random bytes with a right checksum, flipped bits, wrong
 * lengths and plain noise: whatever comes, no value leaves its range, every datagram is accounted for, nothing throws.
 */
it('survives 200,000 hostile datagrams with every value in its range', () => {
  fc.assert(
    fc.property(fc.integer(), (seed) => {
      const rig = new Rig(sampleMap(), { datagramsPerTick: 50 });
      rig.exchange.setJournal(noJournal);
      const random = generator(seed);
      const received = rig.map.messages.filter((one) => one.direction === 'received');
      const bounds = received.flatMap((one) =>
        one.signals.map((field) => ({ ...field, path: `${one.name}.${field.name}` })),
      );
      const datagram = new Datagram(80);
      for (let tick = 0; tick < 1000; tick += 1) {
        for (let i = 0; i < 50; i += 1) {
          const codec = rig.codec(received[random() & 1].name);
          codec.quantise(new Float64Array(codec.count), 0, new Float64Array(codec.count), 0);
          let length = codec.write(datagram, random() % 40, tick - (random() & 1));
          const kind = random() % 5;
          if (kind === 0) for (let at = 20; at < length - 4; at += 1) datagram.bytes[at] = random();
          if (kind === 1)
            for (let at = 4; at < length - 4; at += 1) if (random() % 4 === 0) datagram.bytes[at] = random();
          if (kind === 2) length = random() % 80;
          if (kind <= 2 && length >= 4) datagram.view.setInt32(length - 4, crc32(datagram.bytes, 0, length - 4), true);
          if (kind === 3) datagram.bytes[random() % length] ^= 1 << (random() & 7);
          if (kind === 4) for (let at = 0; at < length; at += 1) datagram.bytes[at] = random();
          rig.toBench.push(datagram.bytes, length);
        }
        rig.take(tick);
        for (const { path, least, most, unitScale } of bounds) {
          const value = rig.value(path) / unitScale;
          if (!(value >= least && value <= most)) expect.unreachable(`${path} = ${value}`);
        }
      }
      const count = (...paths: string[]): number => paths.reduce((sum, path) => sum + rig.value(path), 0);
      const judged = count(
        'powertrain.malformed',
        'powertrain.wrongChecksum',
        'powertrain.wrongMap',
        'powertrain.wrongLength',
        'powertrain.hellos',
      );
      const placed = received.reduce(
        (sum, { name }) => sum + count(`${name}.received`, `${name}.duplicate`, `${name}.late`),
        0,
      );
      expect(count('powertrain.received')).toBe(50_000);
      expect(judged).toBeGreaterThan(5000);
      expect(count('powertrain.replies')).toBeGreaterThan(100);
      // What is left was refused for its values, or was a `done` that nobody waits for.
      const rest = 50_000 - judged - placed;
      expect(rest).toBeGreaterThanOrEqual(count('requests.outOfRange'));
      expect(rest).toBeLessThan(50_000 / 10 + count('requests.outOfRange'));
    }),
    { numRuns: 4 },
  );
});
