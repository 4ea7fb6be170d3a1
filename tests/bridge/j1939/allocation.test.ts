import { expect, it } from 'vitest';
import { makeFrame } from '../../../bridge/can-frame.js';
import { identifierOf } from '../../../bridge/j1939/identifier.js';
import { noJournal } from '../../../runtime/journal.js';
import { CollectionMeter, collectNow } from '../../../runtime/realtime/collection-meter.js';
import { canBench } from '../../support/can-bench.js';

const text = `life: { preRoll: 0 ms }
messages:
  long:
    direction: sent
    j1939: { pgn: 65281, source: 0 }
    trigger: on-request
    bytes: 30
    signals: { v: { from: highLine.pressure, unit: bar(a), range: 0 .. 600, can: { start: 200, length: 16, scale: 0.01 } } }
  told:
    direction: received
    j1939: { pgn: 65280, source: 3 }
    every: 12 ms
    timeout: 5000 ms
    bytes: 17
    signals: { last: { unit: "1", range: 0 .. 255, substitute: 0, can: { start: 128, length: 8 } } }
  troubles:
    direction: sent
    j1939: { pgn: 65226, source: 0 }
    every: 1000 ms
    signals:
      hot: { from: 1, unit: "1", range: 0 .. 126, trouble: { spn: 110, fmi: 0 } }
      low: { from: 2, unit: "1", range: 0 .. 126, trouble: { spn: 111, fmi: 1 } }
`;

it('requests, announcements and trouble codes go by without a collection of garbage', () => {
  const { assembly, spec } = canBench(
    text,
    {},
    `links: { bus: { is: can, interface: vcan0, units: { a: { address: 0 } } } }\n`,
  );
  const { exchange, block, signals } = assembly;
  exchange.setJournal(noJournal);
  expect(spec.map.messages).toHaveLength(3);
  const id = (pgn: number, destination: number, source: number): number =>
    identifierOf({ priority: 7, pgn, destination, source });
  const frame = (identifier: number, payload: number[]): Uint8Array =>
    makeFrame(identifier, payload, { extended: true });
  // in every 12 ticks an announcement and its three packets, a request, a claim by a greater NAME, a request of nothing:
  // so often that the engine has compiled all of it before it is measured
  const at = new Map<number, Uint8Array>([
    [0, frame(id(0xec00, 255, 3), [32, 17, 0, 3, 255, 0, 0xff, 0])],
    [1, frame(id(0xeb00, 255, 3), [1, 1, 2, 3, 4, 5, 6, 7])],
    [2, frame(id(0xeb00, 255, 3), [2, 1, 2, 3, 4, 5, 6, 7])],
    [3, frame(id(0xeb00, 255, 3), [3, 1, 2, 44, 255, 255, 255, 255])],
    [5, frame(id(0xea00, 0, 9), [0x01, 0xff, 0])],
    [7, frame(id(0xee00, 255, 0), [255, 255, 255, 255, 255, 255, 255, 255])],
    [9, frame(id(0xea00, 0, 9), [0x99, 0xff, 0])],
  ]);
  const due: (Uint8Array | undefined)[] = Array.from({ length: 12 }, (_, i) => at.get(i));
  let tick = 0;
  let open = false;
  let sent = 0;
  exchange.attach('bus', {
    poll: (into) => {
      const next = open ? due[tick % 12] : undefined;
      open = false;
      if (next === undefined) return -1;
      for (let i = 0; i < 16; i += 1) into[i] = next[i]!;
      return 16;
    },
    send: (_bytes, length) => {
      sent += 1;
      return length;
    },
  });
  const run = (ticks: number): void => {
    for (const end = tick + ticks; tick < end; tick += 1) {
      open = true;
      exchange.take(block, signals, tick);
      exchange.publish(block, signals, tick);
    }
  };
  run(90_000);
  // the engine's own book-keeping comes and goes; what a tick costs comes each time: the least of two counts
  const meter = new CollectionMeter();
  collectNow();
  meter.start();
  run(60_000);
  const first = meter.stop();
  meter.start();
  run(60_000);
  const second = meter.stop();
  expect(Math.min(first.collections, second.collections)).toBe(0);
  expect(Math.min(first.allocated, second.allocated) / 60_000).toBeLessThan(1.6);
  expect(signals[assembly.table.find('told.received')]).toBe(17_500);
  // a claim and a refusal each time, packets beside them
  expect(sent).toBeGreaterThan(17_500 * 2);
});
