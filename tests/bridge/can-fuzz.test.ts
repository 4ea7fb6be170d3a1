import { expect, it } from 'vitest';
import { frameSizes, identifierFlags } from '../../bridge/can-frame.js';
import { noJournal } from '../../runtime/journal.js';
import { CollectionMeter, collectNow } from '../../runtime/realtime/collection-meter.js';
import { CanRig, sampleCanMap } from './can-rig.js';

/** Numbers of a xorshift generator (Marsaglia 2003): the same in every run of a seed. */
function generator(seed: number): () => number {
  let state = seed | 1;
  return () => {
    state ^= state << 13;
    state ^= state >>> 17;
    state ^= state << 5;
    return state & 0x7fffffff;
  };
}

/**
 * Random frames, frames with the right identifier and random or slightly wrong payloads, wrong lengths and formats, error
 * frames, notes and plain noise: nothing throws, no value leaves its range, every input is accounted for.
 */
it('survives 1,000,000 hostile frames with every value in its range, and allocates nothing', () => {
  const rig = new CanRig(sampleCanMap(), { datagramsPerTick: 1000 });
  rig.exchange.setJournal(noJournal);
  const random = generator(4711);
  const input = new Uint8Array(80);
  const templates = Array.from({ length: 15 }, (_, counter) =>
    rig.frame('requests', [counter * 10 - 70, counter & 1], counter),
  );
  const tuning = rig.frame('tuning', [1, 500, 0]);
  let made = 0;
  const next = (into: Uint8Array): number => {
    if (made % 1000 === 999) {
      made += 1;
      return -1;
    }
    made += 1;
    const kind = random() % 12;
    let size: number = frameSizes.classic;
    const template = kind < 6 ? templates[random() % 15]! : tuning;
    for (let i = 0; i < size; i += 1) input[i] = template[i]!;
    if (kind === 1) input[8 + (random() & 7)] ^= 1 << (random() & 7);
    else if (kind === 2) input[4] = random() & 15;
    else if (kind === 3) size = frameSizes.flexible;
    else if (kind === 7) for (let i = 8; i < 16; i += 1) input[i] = random();
    else if (kind === 8) {
      for (let i = 0; i < 16; i += 1) input[i] = random();
      input[4] = random() % 10;
    } else if (kind === 9) {
      size = random() % 80;
      for (let i = 0; i < size; i += 1) input[i] = random();
    } else if (kind === 10) input[3] |= identifierFlags.error >>> 24;
    else if (kind === 11) {
      size = 8;
      for (let i = 0; i < 8; i += 1) input[i] = random() % 6;
    }
    const kept = Math.min(size, into.length);
    for (let i = 0; i < kept; i += 1) into[i] = input[i]!;
    return size;
  };
  rig.exchange.attach('bus', { poll: next, send: (_bytes, length) => length });
  const received = rig.map.messages.filter((one) => one.direction === 'received');
  const bounds = received.flatMap((one) =>
    one.signals.map((field) => ({ ...field, index: rig.signals.find(`${one.name}.${field.name}`) })),
  );
  let outside = 0;
  let tick = 0;
  const run = (ticks: number): void => {
    for (const end = tick + ticks; tick < end; tick += 1) {
      rig.take(tick);
      for (let i = 0; i < bounds.length; i += 1) {
        const { index, least, most, unitScale } = bounds[i]!;
        const value = rig.values[index]! / unitScale;
        if (!(value >= least && value <= most)) outside += 1;
      }
    }
  };
  run(1000);
  // What runs once a tick needs more ticks than that before the engine has compiled it.
  rig.exchange.attach('bus', { poll: () => -1, send: (_bytes, length) => length });
  run(20_000);
  rig.exchange.attach('bus', { poll: next, send: (_bytes, length) => length });
  // The engine's own book-keeping comes and goes; what a frame costs comes each time: the least of three counts.
  const meter = new CollectionMeter();
  collectNow();
  let growth = Infinity;
  let collections = Infinity;
  for (let part = 0; part < 3; part += 1) {
    meter.start();
    run(334);
    const found = meter.stop();
    growth = Math.min(growth, found.allocated);
    collections = Math.min(collections, found.collections);
  }
  expect(made).toBeGreaterThan(1_000_000);
  expect(outside).toBe(0);
  const of = (names: string, owner: string): number =>
    names.split(' ').reduce((sum, name) => sum + rig.value(`${owner}.${name}`), 0);
  const refused = received.reduce((sum, { name }) => sum + of('wrongChecksum duplicate late', name), 0);
  const frames = rig.value('bus.received');
  const unknownNotes = of('malformed', 'bus');
  expect(unknownNotes).toBeGreaterThan(1000);
  for (const name of ['replies', 'unknown', 'wrongLength', 'errorFrames'])
    expect([name, rig.value(`bus.${name}`) > 1000]).toEqual([name, true]);
  // Received frames: used, unknown, of wrong length, remote, error, refused for counter or checksum, refused for a value;
  // malformed counts notes that say nothing too.
  const placed = of('replies unknown wrongLength remote errorFrames', 'bus') + refused;
  expect(frames - placed).toBeGreaterThanOrEqual(0);
  expect(frames - placed).toBeLessThanOrEqual(unknownNotes + of('outOfRange', 'requests') + of('outOfRange', 'tuning'));
  expect(collections).toBe(0);
  // Less than a boxed number (16 bytes) in a hundred frames.
  expect(growth / (334 * 999)).toBeLessThan(0.16);
});
