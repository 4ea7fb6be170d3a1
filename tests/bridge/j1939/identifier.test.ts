import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { makeFrame } from '../../../bridge/can-frame.js';
import { kernelFilters } from '../../../bridge/can-link.js';
import { identifierOf, partsOf } from '../../../bridge/j1939/identifier.js';
import { readBench } from '../../../configs/bench.js';
import { memoryFiles } from '../../../configs/files.js';
import { catalogue } from '../../configs/catalogue.js';
import { smallBench } from '../../configs/small-bench.js';
import { CanRig, canMap, field, frameMessage } from '../can-rig.js';

describe('identifiers of SAE J1939', () => {
  it.each([
    // Electronic engine controller 1 and the request for a group: identifiers that every J1939 trace shows.
    [{ priority: 3, pgn: 61444, source: 0 }, 0x0cf00400],
    [{ priority: 6, pgn: 65265, source: 0 }, 0x18fef100],
    [{ priority: 6, pgn: 59904, source: 0xf9, destination: 0 }, 0x18ea00f9],
    [{ priority: 6, pgn: 60928, source: 0x80, destination: 255 }, 0x18eeff80],
    [{ priority: 7, pgn: 60416, source: 3, destination: 0xff }, 0x1cecff03],
  ])('%o is %d', (parts, identifier) => {
    expect(identifierOf(parts)).toBe(identifier);
    expect(partsOf(identifier)).toEqual(parts);
  });

  it('go both ways', () => {
    fc.assert(
      fc.property(fc.nat(0x1fffffff), (identifier) => {
        expect(identifierOf(partsOf(identifier))).toBe(identifier);
      }),
    );
  });
});

describe('a parameter group in a map', () => {
  const can = `${smallBench.slice(0, smallBench.indexOf('links:'))}links:
  bus: { is: can, interface: can0 }
messages:
  engine:
    direction: received
    j1939: { pgn: 61444, source: 0, priority: 3 }
    every: 10 ms
    timeout: 50 ms
    bytes: 8
    signals:
      speed: { unit: rpm, range: 0 .. 8031, substitute: 0, can: { start: 24, length: 16, scale: 0.125 } }
  requests:
    direction: received
    id: 0x201
    every: 10 ms
    timeout: 50 ms
    bytes: 8
    signals:
      valve: { unit: '%', range: 0 .. 100, substitute: 0 %, can: { start: 0, length: 8 } }
`;
  const read = (text: string) =>
    readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text })).map.messages[0]!;

  it('stands in place of the identifier', () => {
    expect(read(can)).toMatchObject({ identifier: 0x0cf00400, extended: true, anyPriority: true });
    expect(read(can.replace('pgn: 61444', 'pgn: 59904, destination: 3'))).toMatchObject({ identifier: 0x0cea0300 });
  });

  it.each([
    ['source: 0, priority: 3', 'priority: 3', 'messages.engine.j1939.source: missing'],
    ['priority: 3', 'priority: 8', 'messages.engine.j1939.priority: too large'],
    [
      'priority: 3',
      'destination: 3',
      'messages.engine.j1939.destination: a destination for a group that goes to everybody',
    ],
    ['pgn: 61444', 'pgn: 59905', 'messages.engine.j1939.pgn: the low byte of a group with a destination is 0'],
    ['every:', 'id: 5\n    every:', 'messages.engine.id: an identifier and a parameter group'],
  ])('and is refused when %s is written %s', (from, to, expected) => {
    expect(() => read(can.replace(from, to))).toThrow(expected);
  });

  it('is received with any priority, and let through by the kernel so', () => {
    const map = canMap([
      frameMessage('engine', 0x0cf00400, 'received', [field('speed', 'x.speed', { startBit: 24, length: 16 })], {
        extended: true,
        anyPriority: true,
      }),
      frameMessage('other', 0x18fef100, 'received', [field('v', 'x.v', {})], { extended: true }),
    ]);
    const rig = new CanRig(map);
    for (const identifier of [0x0cf00400, 0x18f00400, 0x0cf00401, 0x18fef100, 0x0cfef100])
      rig.put(makeFrame(identifier, [0, 0, 0, 7, 0, 0, 0, 0], { extended: true }));
    rig.take(0);
    expect([rig.value('engine.received'), rig.value('other.received'), rig.value('bus.unknown')]).toEqual([2, 1, 2]);
    const [engine, other] = kernelFilters(map.messages, 'bus');
    const passes = (identifier: number): boolean[] =>
      [engine, other].map(
        (filter) => ((identifier | 0x80000000) & filter!.mask) === (filter!.identifier & filter!.mask),
      );
    expect([0x0cf00400, 0x18f00400, 0x18fef100, 0x0cfef100].map(passes)).toEqual([
      [true, false],
      [true, false],
      [false, true],
      [false, false],
    ]);
  });
});
