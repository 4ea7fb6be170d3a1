import { describe, expect, it } from 'vitest';
import { frameSizes, identifierFlags, makeFrame } from '../../bridge/can-frame.js';
import { kernelFilters } from '../../bridge/can-link.js';
import { interfaceStates, NoteQueue, noteKinds, writeNote } from '../../bridge/can-notes.js';
import { hashBlock } from '../../runtime/block.js';
import { CanRig, canMap, field, frameMessage, sampleCanMap } from './can-rig.js';

const hex = (bytes: Uint8Array): string => Buffer.from(bytes).toString('hex');
const note = (kind: number, state: number, count: number): Uint8Array => {
  const bytes = new Uint8Array(8);
  writeNote(bytes, kind, state, 0, count);
  return bytes;
};
const errorFrame = (classes: number, payload: readonly number[]): Uint8Array => {
  const frame = makeFrame(classes, payload);
  frame[3] |= identifierFlags.error >>> 24;
  return frame;
};

describe('frames out', () => {
  it('are what the map says: identifier, flags, length, payload, protection', () => {
    const rig = new CanRig(sampleCanMap());
    rig.set('highLine.pressure', 345.67e5);
    rig.set('lowLine.pressure', 12.34e5);
    rig.set('propShaft.speed', -2);
    for (let tick = 0; tick < 4; tick += 1) {
      rig.take(tick);
      rig.publish(tick);
    }
    const frames = rig.heard();
    expect(frames.map((frame) => frame.length)).toEqual([16, 16, 16, 16, 72]);
    expect(hex(frames[0].subarray(0, 8))).toBe('2001000008000000');
    // 34567 = 0x8707 at byte 3, 617 = 0x269 at byte 5; profile 5: counter in byte 2
    expect(hex(frames[0].subarray(10, 16))).toBe('000787690200');
    expect(frames.slice(0, 4).map((frame) => frame[10])).toEqual([0, 1, 2, 3]);
    // 29 bits; 12 bytes, FD with bit-rate switch
    expect(hex(frames[4].subarray(0, 20))).toBe('0201ff980c050000fffe00000000000000000000');
    expect(rig.value('pressures.high')).toBeCloseTo(345.67e5, 3);
    expect(rig.value('pressures.sent')).toBe(4);
  });

  it('do not go when a value is outside its range and the message refuses that', () => {
    const [pressures] = sampleCanMap().messages;
    const rig = new CanRig(canMap([{ ...pressures, outOfRange: 'refuse' }]));
    rig.set('highLine.pressure', 460e5);
    rig.take(0);
    rig.publish(0);
    expect(rig.heard()).toEqual([]);
    expect(rig.value('pressures.unsendable')).toBe(1);
    rig.set('highLine.pressure', 440e5);
    rig.publish(1);
    expect(rig.heard()).toHaveLength(1);
  });
});

describe('frames in', () => {
  it('drive commands, with substitutes before the first and after a time-out', () => {
    const rig = new CanRig(sampleCanMap());
    rig.take(0);
    expect(rig.command('pumpMotor.torqueRequest')).toBe(0);
    expect(rig.command('strategy.limit')).toBe(7);
    rig.say('requests', [-123.4, 1], 9);
    rig.take(1);
    expect(rig.command('pumpMotor.torqueRequest')).toBeCloseTo(-123.4, 9);
    expect(rig.command('isolation.open')).toBe(1);
    for (let tick = 2; tick < 7; tick += 1) rig.take(tick);
    expect(rig.command('pumpMotor.torqueRequest')).toBe(0);
    expect(rig.value('requests.timeOuts')).toBe(1);
    expect(rig.seen.map(({ name, tick }) => [name, tick])).toEqual([
      ['controller awake', 1],
      ['message timed out', 6],
    ]);
  });

  it('keep what a multiplexed frame does not carry', () => {
    const rig = new CanRig(sampleCanMap());
    rig.say('tuning', [1, 1000, 0]);
    rig.take(0);
    expect([rig.command('strategy.gain'), rig.command('strategy.limit')]).toEqual([1000, 7]);
    rig.say('tuning', [3, 0, 55]);
    rig.take(1);
    expect([rig.command('strategy.gain'), rig.command('strategy.limit')]).toEqual([1000, 55]);
    rig.say('tuning', [9, 1, 1]);
    rig.take(2);
    expect([rig.command('strategy.gain'), rig.command('strategy.limit'), rig.value('tuning.page')]).toEqual([
      1000, 55, 9,
    ]);
  });

  const counters: [string, readonly number[], Readonly<Record<string, number>>][] = [
    ['in order, round the end', [13, 14, 0, 1], { received: 4, lost: 0, duplicate: 0, late: 0, restarts: 0 }],
    ['with a gap', [1, 2, 5], { received: 3, lost: 2, duplicate: 0, late: 0, restarts: 0 }],
    ['with a gap over the end', [13, 1], { received: 2, lost: 2, duplicate: 0, late: 0, restarts: 0 }],
    ['with a repetition', [1, 1, 2], { received: 2, lost: 0, duplicate: 1, late: 0, restarts: 0 }],
    ['swapped', [1, 3, 2, 4], { received: 3, lost: 0, duplicate: 0, late: 1, restarts: 0 }],
    ['from a sender that started again', [3, 12, 13, 14], { received: 3, lost: 0, duplicate: 0, late: 0, restarts: 1 }],
  ];
  it.each(counters)('count what the counter says: %s', (_name, sequence, expected) => {
    const rig = new CanRig(sampleCanMap());
    sequence.forEach((counter, tick) => {
      rig.say('requests', [counter, 0], counter);
      rig.take(tick);
    });
    expect(Object.fromEntries(Object.keys(expected).map((name) => [name, rig.value(`requests.${name}`)]))).toEqual(
      expected,
    );
    if (_name === 'from a sender that started again') expect(rig.command('pumpMotor.torqueRequest')).toBe(14);
  });

  it('are not used and counted when checksum, length, format, value or identifier is wrong', () => {
    const rig = new CanRig(sampleCanMap());
    const good = rig.frame('requests', [5, 1], 1);
    const flipped = good.slice();
    flipped[10] ^= 4;
    const short = good.slice();
    short[4] = 7;
    const flexible = new Uint8Array(frameSizes.flexible);
    flexible.set(good);
    const outside = rig.frame('tuning', [1, 0, 0]);
    const impossible = good.slice();
    impossible[4] = 9;
    const remote = makeFrame(0x200, [], { remote: true });
    for (const bytes of [
      flipped,
      short,
      flexible,
      makeFrame(0x7ff, [1]),
      makeFrame(0x200, good.subarray(8), { extended: true }),
      impossible,
      remote,
      good.subarray(0, 15),
      outside,
    ])
      rig.put(bytes);
    rig.take(0);
    const counts = (owner: string, names: readonly string[]): number[] =>
      names.map((name) => rig.value(`${owner}.${name}`));
    expect(counts('requests', ['received', 'wrongChecksum', 'wrongLength'])).toEqual([0, 1, 2]);
    expect(counts('bus', ['received', 'replies', 'wrongLength', 'unknown', 'malformed', 'remote'])).toEqual([
      9, 1, 2, 2, 2, 1,
    ]);
    expect(rig.command('pumpMotor.torqueRequest')).toBe(0);
    expect(rig.seen.map((one) => one.name)).toContain('wrong message checksums');
  });

  it('are refused as a whole when a value is outside its range, or brought into it', () => {
    const spec = (outOfRange: 'refuse' | 'saturate') =>
      canMap([
        frameMessage('m', 1, 'received', [field('a', 'x.a', { length: 8 }, { least: 0, most: 100, substitute: 3 })], {
          outOfRange,
        }),
      ]);
    const refusing = new CanRig(spec('refuse'));
    const saturating = new CanRig(spec('saturate'));
    for (const rig of [refusing, saturating]) {
      rig.put(makeFrame(1, [200, 0, 0, 0, 0, 0, 0, 0]));
      rig.take(0);
    }
    expect([refusing.command('x.a'), saturating.command('x.a')]).toEqual([3, 100]);
    expect([refusing.value('m.outOfRange'), saturating.value('m.outOfRange')]).toEqual([1, 1]);
  });

  it('show period and jitter in seconds', () => {
    const rig = new CanRig(sampleCanMap());
    const at = new Set([5, 15, 25, 38, 45]);
    for (let tick = 0; tick < 50; tick += 1) {
      if (at.has(tick)) rig.say('tuning', [1, tick, 0]);
      rig.take(tick);
    }
    expect(rig.value('tuning.period')).toBeCloseTo(0.007, 12);
    expect(rig.value('tuning.jitter')).toBeCloseTo(0.003, 12);
    expect(rig.value('tuning.age')).toBeCloseTo(0.004, 12);
  });

  it('cannot hold up a tick when they flood it: the rest waits', () => {
    const rig = new CanRig(sampleCanMap(), { datagramsPerTick: 10 });
    for (let i = 0; i < 25; i += 1) rig.put(makeFrame(0x300, [i]));
    rig.take(0);
    expect([rig.value('bus.received'), rig.value('bus.floods'), rig.toBench.waiting]).toEqual([10, 1, 15]);
  });
});

describe('states of bus and interface', () => {
  it('follow the error frames of the controller', () => {
    const rig = new CanRig(sampleCanMap());
    const state = (): number[] =>
      ['controllerState', 'warnings', 'passives', 'busOffs', 'restarts', 'transmitErrors', 'receiveErrors'].map(
        (name) => rig.value(`bus.${name}`),
      );
    const steps: [Uint8Array, number[]][] = [
      [errorFrame(0x204, [0, 0x08, 0, 0, 0, 0, 97, 2]), [1, 1, 0, 0, 0, 97, 2]],
      [errorFrame(0x204, [0, 0x20, 0, 0, 0, 0, 129, 3]), [2, 1, 1, 0, 0, 129, 3]],
      [errorFrame(0x40, [0, 0, 0, 0, 0, 0, 0, 0]), [3, 1, 1, 1, 0, 129, 3]],
      [errorFrame(0x100, [0, 0, 0, 0, 0, 0, 0, 0]), [0, 1, 1, 1, 1, 129, 3]],
      [errorFrame(0x88, [0, 0, 1, 2, 0, 0, 0, 0]), [0, 1, 1, 1, 1, 129, 3]],
    ];
    steps.forEach(([frame, expected], tick) => {
      rig.put(frame);
      rig.take(tick);
      expect(state()).toEqual(expected);
    });
    expect(rig.value('bus.errorFrames')).toBe(5);
    expect(rig.seen.map((one) => one.name)).toEqual([
      'error frames',
      'bus errors',
      'error passive',
      'bus-off',
      'bus restarted',
    ]);
  });

  it('follow the notes of the transport and are recorded as inputs', () => {
    const rig = new CanRig(sampleCanMap());
    const notes = [
      note(noteKinds.interface, interfaceStates.down, 1),
      note(noteKinds.unsent, 0, 3),
      note(noteKinds.interface, interfaceStates.gone, 1),
      note(noteKinds.interface, interfaceStates.up, 1),
      note(noteKinds.dropped, 0, 995),
      note(noteKinds.queueFull, 0, 2),
    ];
    const states: number[] = [];
    notes.forEach((bytes, tick) => {
      rig.put(bytes);
      rig.take(tick);
      states.push(rig.value('bus.interfaceState'));
    });
    expect(states).toEqual([1, 1, 2, 0, 0, 0]);
    expect(
      ['downs', 'deletions', 'ups', 'unsent', 'dropped', 'queueFull', 'received'].map((name) =>
        rig.value(`bus.${name}`),
      ),
    ).toEqual([1, 1, 1, 3, 995, 2, 0]);
    expect(rig.inputs.map((one) => one.bytes)).toEqual(notes);
    expect(rig.seen.find((one) => one.name === 'frames dropped')).toMatchObject({ a: 995, b: 995 });
    rig.put(note(9, 0, 1));
    rig.take(6);
    expect(rig.value('bus.malformed')).toBe(1);
  });

  it('are told once, counts summed up', () => {
    const queue = new NoteQueue();
    const into = new Uint8Array(8);
    queue.dropped += 5;
    queue.dropped += 70_000;
    queue.interface(interfaceStates.down);
    queue.interface(interfaceStates.up);
    const told: string[] = [];
    while (queue.take(into) >= 0) told.push(hex(into));
    expect(told).toEqual(['0100000001000000', '0200000075110100']);
  });
});

describe('several links', () => {
  it('keep their messages apart, a UDP link beside them', () => {
    const map = canMap(
      [
        frameMessage('a', 0x10, 'received', [field('v', 'x.a', {})], { link: 'powertrain' }),
        frameMessage('b', 0x10, 'received', [field('v', 'x.b', {})], { link: 'vehicle' }),
        frameMessage('c', 0x10, 'received', [field('v', 'x.c', {})], { link: 'office' }),
      ],
      [
        { name: 'powertrain', kind: 'can', interface: 'vcan0' },
        { name: 'vehicle', kind: 'can', interface: 'vcan1' },
        { name: 'office', kind: 'udp' },
      ],
    );
    const rig = new CanRig(map);
    rig.put(makeFrame(0x10, [5, 0, 0, 0, 0, 0, 0, 0]));
    rig.take(0);
    expect([rig.command('x.a'), rig.command('x.b'), rig.command('x.c')]).toEqual([5, 0, 0]);
    expect(rig.inputs[0].link).toBe(0);
    expect([rig.value('powertrain.replies'), rig.value('vehicle.replies'), rig.value('office.malformed')]).toEqual([
      1, 0, 0,
    ]);
    expect(kernelFilters(map.messages, 'powertrain')).toEqual([{ identifier: 0x10, mask: 0xc00007ff | 0 }]);
  });
});

it('derives a run again from its inputs to the last bit', () => {
  const map = sampleCanMap();
  const first = new CanRig(map);
  const hashes: string[] = [];
  const hash = (rig: CanRig): string => {
    const out = new Int32Array(2);
    hashBlock(new Int32Array(rig.block.buffer), out);
    return out.join(' ');
  };
  let state = 99;
  const random = (): number => {
    state = (Math.imul(state, 1103515245) + 12345) >>> 0;
    return state >>> 8;
  };
  for (let tick = 0; tick < 400; tick += 1) {
    if (random() % 3 > 0) first.say('requests', [(random() % 1000) - 500, 1], tick % 15);
    if (random() % 50 === 0) first.put(note(noteKinds.interface, random() % 3, 1));
    if (random() % 20 === 0) first.put(makeFrame(random() % 2048, [random() & 255]));
    first.take(tick);
    first.publish(tick);
    hashes.push(hash(first));
  }
  const again = new CanRig(map);
  for (let tick = 0; tick < 400; tick += 1) {
    for (const input of first.inputs) if (input.tick === tick) again.put(input.bytes);
    again.take(tick);
    again.publish(tick);
    expect(hash(again)).toBe(hashes[tick]);
  }
});

describe('what a CAN map cannot have', () => {
  const make =
    (changes: Parameters<typeof frameMessage>[4], signals = [field('v', 'x.a', { startBit: 0, length: 4 })]) =>
    (): CanRig =>
      new CanRig(canMap([frameMessage('m', 0x10, 'received', signals, changes)]));
  it.each([
    [
      'a length that no frame has',
      make({ bytes: 11, flexibleDataRate: true }),
      'no CAN frame has this length, 11 bytes, one of 0, 1, 2',
    ],
    ['too long for classic', make({ bytes: 12 }), 'no CAN frame has this length, 12 bytes'],
    ['an identifier of 12 bits', make({ identifier: 0x800 }), 'the identifier does not fit, 2048, 0 to 2047'],
    ['bit-rate switch on a classic frame', make({ bitRateSwitch: true }), 'a classic frame has no bit-rate switch'],
    [
      'an unknown protection',
      make({ protection: { kind: 'e2e-3', settings: {} } }),
      'unknown protection, e2e-3, known: counter, crc',
    ],
    [
      'a profile without its identifier',
      make({ protection: { kind: 'e2e-5', settings: {} } }),
      'dataId is missing, nothing, a whole number 0 to 65535',
    ],
    [
      'a signal under the checksum',
      make({ protection: { kind: 'e2e-5', settings: { dataId: 1 } } }),
      'v lies on the bits of the protection, bit 0, e2e-5',
    ],
    [
      'a check beyond the payload',
      make({ bytes: 1, protection: { kind: 'crc', settings: { crc: 'crc32', byte: 0 } } }),
      'counter or check beyond the payload, bit 31',
    ],
  ])('%s', (_name, build, text) => {
    expect(build).toThrow(text);
  });
});
