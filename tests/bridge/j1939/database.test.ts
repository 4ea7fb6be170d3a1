import { expect, it } from 'vitest';
import { kernelFilters } from '../../../bridge/can-link.js';
import { benchText } from '../../../bridge/dbc/bench-text.js';
import { databaseOf } from '../../../bridge/dbc/from-map.js';
import { readDatabase } from '../../../bridge/dbc/read.js';
import { messagesOf } from '../../../bridge/dbc/to-map.js';
import { writeDatabase } from '../../../bridge/dbc/write.js';
import { canBench } from '../../support/can-bench.js';

const text = `life: { preRoll: 0 ms }
messages:
  speed:
    direction: sent
    j1939: { pgn: 61444, source: 0, priority: 3 }
    every: 10 ms
    phase: 0 ms
    bytes: 8
    signals:
      engineSpeed: { from: 800, unit: rpm, range: 0 .. 8000, can: { start: 24, length: 16, scale: 0.125 } }
  component:
    direction: sent
    j1939: { pgn: 65259, source: 0 }
    trigger: on-request
    bytes: 20
    signals:
      last: { from: 200, unit: "1", range: 0 .. 255, can: { start: 152, length: 8 } }
  torque:
    direction: received
    j1939: { pgn: 0xc900, source: 3, destination: 0 }
    every: 20 ms
    timeout: 100 ms
    bytes: 8
    signals:
      torque: { unit: N m, range: -100 .. 100, substitute: 0, can: { start: 0, length: 16, signed: on } }
  troubles:
    about: what is wrong
    direction: sent
    j1939: { pgn: 65226, source: 0 }
    every: 1000 ms
    phase: 0 ms
    signals:
      amber: { from: 1, unit: "1", range: 0 .. 3, lamp: warning }
      oilHot: { from: life.key, unit: "1", range: 0 .. 126, trouble: { spn: 110, fmi: 0 } }
`;

it('parameter groups go to a database and come back as such, long ones and those on request too', () => {
  const { map } = canBench(text).spec;
  const written = writeDatabase(databaseOf(map, 'bus', { step: 1e-3 }));
  const { messages } = messagesOf(readDatabase(written).database, {
    link: 'bus',
    controller: 'Controller',
    step: 1e-3,
  });
  const short = messages.map(({ name, identifier, j1939, anyPriority, bytes, trigger, flexibleDataRate }) => ({
    name,
    identifier,
    j1939,
    anyPriority,
    bytes,
    trigger,
    flexibleDataRate,
  }));
  expect(short).toEqual(
    map.messages.map(({ name, identifier, j1939, anyPriority, bytes, trigger, flexibleDataRate }) => ({
      name,
      identifier,
      j1939,
      anyPriority,
      bytes,
      trigger,
      flexibleDataRate,
    })),
  );
  expect(messages[3]!.about).toBe('what is wrong; trouble codes: oilHot SPN 110 FMI 0');
  // J1939-73: the amber lamp stands in bits 3 and 4 of the first byte
  expect(messages[3]!.signals.map(({ name, can }) => [name, can!.startBit, can!.length])).toEqual([['amber', 2, 2]]);
  const bench = benchText(messages, 1e-3);
  expect(bench).toContain('j1939: { pgn: 51456, source: 3, priority: 6, destination: 0 }');
  expect(bench).toContain('trigger: on-request');
  const again = canBench(`life: { preRoll: 0 ms }\n${bench.replaceAll('from: fill.in', 'from: 1')}`).spec.map.messages;
  expect(again.map(({ identifier, bytes }) => [identifier, bytes])).toEqual(
    messages.map(({ identifier, bytes }) => [identifier, bytes]),
  );
});

it('the kernel lets the protocol through, whatever its priority, destination and source', () => {
  const filters = kernelFilters(canBench(text).spec.map.messages, 'bus');
  const passes = (identifier: number): boolean =>
    filters.some((filter) => (((identifier | 0x80000000) ^ filter.identifier) & filter.mask) === 0);
  for (const identifier of [0x18ea00f9, 0x18eaffff, 0x1cec0003, 0x1cebff03, 0x18eeff27, 0x18e8ff00, 0x0cc90003])
    expect([identifier, passes(identifier)]).toEqual([identifier, true]);
  for (const identifier of [0x18feca00, 0x0cf00400, 0x1ccb0003, 0x19ea00f9])
    expect([identifier, passes(identifier)]).toEqual([identifier, false]);
});
