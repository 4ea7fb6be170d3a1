import { GCProfiler } from 'node:v8';
import { expect, it } from 'vitest';
import { ControllerEndpoint } from '../../bridge/controller-side.js';
import { LockstepTransport } from '../../bridge/lockstep.js';
import { noJournal } from '../../runtime/journal.js';
import { Rig } from './rig.js';
import { sampleMap } from './sample-map.js';

/** Collections of garbage while `work` runs, and how many bytes the heap grew. */
function collections(work: () => void): { count: number; growth: number } {
  const profiler = new GCProfiler();
  profiler.start();
  const before = process.memoryUsage().heapUsed;
  work();
  const growth = process.memoryUsage().heapUsed - before;
  return { count: profiler.stop().statistics.length, growth };
}

it('exchanges 200,000 messages in lockstep without a collection of garbage', () => {
  const rig = new Rig(sampleMap());
  rig.exchange.setJournal(noJournal);
  const endpoint = new ControllerEndpoint({
    map: rig.map,
    link: 'powertrain',
    mode: 'lockstep',
    controller: {
      step(tick, read, write) {
        write[0] = read[0] * 0.5 - (tick & 63);
        write[1] = tick & 1;
        write[2] = 3;
      },
    },
    send: (bytes, length) => rig.controller.send(bytes, length),
  });
  rig.transport.turn = () => endpoint.pump(rig.controller);
  const barrier = new LockstepTransport(rig.transport, {
    link: 'powertrain',
    mapChecksum: rig.exchange.checksum,
    now: () => 0,
  });
  rig.exchange.attach('powertrain', barrier);
  const pressure = rig.signals.find('highLine.pressure');
  let tick = 0;
  const run = (ticks: number): void => {
    for (const end = tick + ticks; tick < end; tick += 1) {
      rig.exchange.take(rig.block, rig.values, tick);
      rig.values[pressure] = (100 + (tick & 127)) * 1e5 + 0.25;
      rig.exchange.publish(rig.block, rig.values, tick);
      barrier.end(tick);
    }
  };
  run(30_000);
  collections(() => run(30_000));
  // Two messages in every tick, two in every tenth: 2.2 a tick, and as many words of the barrier.
  const found = collections(() => run(91_000));
  expect(rig.value('requests.received') + rig.value('pressures.sent')).toBeGreaterThan(240_000);
  expect(found).toEqual({ count: 0, growth: expect.any(Number) });
  // Less than one boxed number (16 bytes) in ten ticks: what is left is the engine's own book-keeping.
  expect(found.growth / 91_000).toBeLessThan(1.6);
  // The measure itself: one boxed number in each tick is found.
  const kept: number[] = [];
  const boxed = collections(() => {
    for (let i = 0; i < 91_000; i += 1) kept.push(Object(i + 0.5) as number);
  });
  expect(boxed.count > 0 || boxed.growth / 91_000 > 1.6).toBe(true);
});
