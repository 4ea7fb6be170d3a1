import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { crc32 } from '../../bridge/checksums.js';
import { kinds } from '../../bridge/udp-layout.js';
import { hashBlock } from '../../runtime/block.js';
import { noJournal } from '../../runtime/journal.js';
import { Rig } from './rig.js';
import { mapOf, message, sampleMap, signal } from './sample-map.js';

const requests = { torque: 'pumpMotor.torqueRequest', valve: 'isolation.open' };

describe('values', () => {
  it('drives commands in SI, with substitutes until the first message', () => {
    const map = sampleMap();
    const rig = new Rig(
      mapOf(
        ...map.messages.map((one) =>
          one.name === 'gear' ? { ...one, signals: [{ ...one.signals[0], substitute: 3 }, one.signals[1]] } : one,
        ),
      ),
    );
    rig.take(0);
    expect(rig.command('gearbox.request')).toBe(3);
    expect(rig.value('gear.request')).toBe(3);
    expect(rig.command(requests.torque)).toBe(0);
    rig.say('requests', [-123.4, 1], 0);
    rig.say('gear', [-1, 4e9], 0);
    rig.take(1);
    expect(rig.command(requests.torque)).toBeCloseTo(-123.4, 12);
    expect(rig.command(requests.valve)).toBe(1);
    expect(rig.command('gearbox.request')).toBe(-1);
    expect(rig.value('gear.note')).toBe(4e9);
    expect(rig.seen).toEqual([expect.objectContaining({ tick: 1, name: 'controller awake', subject: 'powertrain' })]);
  });

  it('sends in the units of the map and shows what was sent in SI', () => {
    const rig = new Rig(sampleMap());
    rig.set('highLine.pressure', 345.678e5);
    rig.set('lowLine.pressure', 99e5);
    rig.set('tank.temperature', 273.15 + 50.4);
    rig.take(0);
    rig.publish(0);
    const [hello, pressures] = rig.heard();
    expect(hello.kind).toBe(kinds.hello);
    expect(pressures.number).toBe(16);
    const view = new DataView(pressures.bytes.buffer);
    expect(view.getUint16(20, true)).toBe(34568);
    expect(view.getFloat32(24, true)).toBe(50);
    expect(view.getUint8(28)).toBe(90);
    expect(rig.value('pressures.highPressure')).toBeCloseTo(345.68e5, 5);
    expect(rig.value('pressures.lowPressure')).toBe(50e5);
    expect(rig.value('pressures.oilTemperature')).toBeCloseTo(323.15, 10);
    expect(rig.signals.all[rig.signals.find('pressures.highPressure')].unit).toBe('1');
  });

  it('does not send a message with a value that is not finite, and says so', () => {
    const rig = new Rig(sampleMap());
    rig.set('ledger.energy', Number.NaN);
    for (let tick = 0; tick < 3; tick += 1) {
      rig.take(tick);
      rig.publish(tick);
    }
    expect(rig.heard().filter((one) => one.number === 16)).toEqual([]);
    expect(rig.value('pressures.unsendable')).toBe(3);
    expect(rig.seen.find((one) => one.name === 'message not sent')).toMatchObject({
      subject: 'pressures',
      tick: 1,
      a: 1,
    });
  });
});

describe('what a bench cannot have', () => {
  it('is named with its path and the nearest right one, all at once', () => {
    const map = mapOf(
      message('out', 1, 'sent', [signal('a', 'highLine.presure')]),
      message('in', 2, 'received', [signal('a', 'x.open'), signal('b', 'x.open'), signal('c', 'x.nothing')]),
    );
    const rig = (): Rig =>
      new Rig(sampleMap(), {
        map,
        targets: { find: (path) => (path === 'x.open' ? 0 : -1), nearest: () => ['x.open'] },
      });
    expect(rig).toThrow('messages.out.a: there is no such signal, highLine.presure, did you mean highLine.pressure');
    expect(rig).toThrow('messages.in.b: the command has two masters, x.open, driven by messages.in.a already');
    expect(rig).toThrow('messages.in.c: there is no such command, x.nothing, did you mean x.open?');
  });
});

describe('schedule', () => {
  const sentAt = (
    changes: Parameters<typeof message>[4],
    from: number,
    to: number,
    value = (_tick: number) => 0,
  ): number[] => {
    const rig = new Rig(
      mapOf(message('m', 1, 'sent', [signal('a', 'x.a', { type: 'i16', least: -100, most: 100 })], changes)),
      { firstTick: from },
    );
    const ticks: number[] = [];
    for (let tick = from; tick < to; tick += 1) {
      rig.take(tick);
      rig.set('x.a', value(tick));
      rig.publish(tick);
      for (const one of rig.heard()) if (one.kind === kinds.message) ticks.push(one.tick);
    }
    return ticks;
  };

  it('holds phases against the tick number, before and after tick 0', () => {
    expect(sentAt({ every: 10, phase: 3 }, 0, 40)).toEqual([3, 13, 23, 33]);
    expect(sentAt({ every: 10, phase: 3 }, -15, 10)).toEqual([-7, 3]);
    expect(sentAt({ every: 10, phase: 3, startDelay: 20 }, -15, 40)).toEqual([13, 23, 33]);
    expect(sentAt({ every: 1 }, 0, 4)).toEqual([0, 1, 2, 3]);
  });

  it('sends on change: first at once, then when the wire value moves, no closer than the fast cycle', () => {
    const step = (tick: number): number => (tick < 5 ? 0 : tick < 8 ? tick : 20.4);
    expect(sentAt({ trigger: 'on-change', every: 0 }, 0, 30, step)).toEqual([0, 5, 6, 7, 8]);
    expect(sentAt({ trigger: 'on-change', every: 0, fastEvery: 4 }, 0, 30, step)).toEqual([0, 5, 9]);
    expect(sentAt({ trigger: 'on-change', every: 0 }, 0, 30, (tick) => tick / 100)).toEqual([0]);
  });

  it('sends cyclically and faster while values move', () => {
    expect(
      sentAt({ trigger: 'cyclic-and-change', every: 10, fastEvery: 2 }, 0, 30, (tick) =>
        tick > 11 && tick < 18 ? tick : 0,
      ),
    ).toEqual([0, 10, 12, 14, 16, 18, 20]);
  });

  it('is silent when told to be', () => {
    const rig = new Rig(sampleMap());
    rig.exchange.setSilent(rig.block, true);
    rig.publish(1);
    expect(rig.heard()).toEqual([]);
    rig.exchange.setSilent(rig.block, false);
    rig.publish(2);
    // the hello that was kept back, and the message
    expect(rig.heard()).toHaveLength(2);
  });
});

describe('time-outs', () => {
  it('begin in the tick in which the age reaches the time-out and end with the next message', () => {
    const rig = new Rig(sampleMap());
    for (let tick = 0; tick <= 30; tick += 1) {
      if (tick === 3 || tick === 20) rig.say('requests', [50, 1], tick === 3 ? 0 : 1);
      rig.take(tick);
      expect(rig.value('requests.age')).toBeCloseTo((tick < 3 ? tick : tick < 20 ? tick - 3 : tick - 20) * 1e-3, 12);
      const alive = (tick >= 3 && tick < 8) || (tick >= 20 && tick < 25);
      expect([tick, rig.command(requests.torque)]).toEqual([tick, alive ? 50 : 0]);
      expect([tick, rig.value('requests.timedOut')]).toEqual([tick, (tick >= 8 && tick < 20) || tick >= 25 ? 1 : 0]);
    }
    expect(rig.value('requests.timeOuts')).toBe(2);
    const own = rig.seen.filter((one) => one.subject === 'requests');
    expect(own).toEqual([
      { tick: 8, name: 'message timed out', subject: 'requests', a: 0.005, b: 0 },
      { tick: 20, name: 'message came back', subject: 'requests', a: 0.017, b: 0 },
      { tick: 25, name: 'message timed out', subject: 'requests', a: 0.005, b: 0 },
    ]);
  });

  it('do not count in the boot window, though the substitutes do; a silence that lasts counts when it ends', () => {
    const rig = new Rig(sampleMap(), { firstTick: -10, bootWindowTicks: 22 });
    for (let tick = -10; tick < 40; tick += 1) {
      if (tick === -5) rig.say('requests', [50, 1], 0);
      rig.take(tick);
      expect([tick, rig.command(requests.torque)]).toEqual([tick, tick >= -5 && tick < 0 ? 50 : 0]);
      expect([tick, rig.value('requests.timeOuts')]).toEqual([tick, tick >= 12 ? 1 : 0]);
      expect([tick, rig.value('gear.timeOuts')]).toEqual([tick, tick >= 20 ? 1 : 0]);
    }
    rig.exchange.startBootWindow(rig.block, 40);
    rig.say('requests', [50, 1], 1);
    for (let tick = 40; tick < 70; tick += 1) {
      rig.take(tick);
      expect([tick, rig.value('requests.timeOuts')]).toEqual([tick, tick >= 62 ? 2 : 1]);
    }
  });

  it('never begin when the map gives none', () => {
    const rig = new Rig(mapOf(message('m', 1, 'received', [signal('a', 'x.a')], { timeout: 0 })));
    rig.say('m', [7], 0);
    for (let tick = 0; tick < 5000; tick += 1) rig.take(tick);
    expect(rig.command('x.a')).toBe(7);
    expect(rig.value('m.timeOuts')).toBe(0);
  });
});

describe('sequence', () => {
  const received = (sequences: readonly number[], each = (rig: Rig) => rig.take(1)): Rig => {
    const rig = new Rig(sampleMap());
    sequences.forEach((sequence, i) => {
      rig.say('requests', [i, 0], sequence);
      each(rig);
    });
    return rig;
  };
  const counts = (rig: Rig): Record<string, number> =>
    Object.fromEntries(
      ['received', 'lost', 'duplicate', 'late', 'restarts'].map((name) => [name, rig.value(`requests.${name}`)]),
    );

  it.each([
    ['in order', [0, 1, 2], { received: 3, lost: 0, duplicate: 0, late: 0, restarts: 0 }],
    ['from any start', [70, 71], { received: 2, lost: 0, duplicate: 0, late: 0, restarts: 0 }],
    [
      'over the end of 32 bits',
      [0xfffffffe, 0xffffffff, 0, 1],
      { received: 4, lost: 0, duplicate: 0, late: 0, restarts: 0 },
    ],
    ['with a gap', [0, 1, 5, 6], { received: 4, lost: 3, duplicate: 0, late: 0, restarts: 0 }],
    ['with a duplicate', [0, 1, 1, 2, 0], { received: 3, lost: 0, duplicate: 2, late: 0, restarts: 0 }],
    ['out of order', [0, 2, 1, 1, 3], { received: 3, lost: 0, duplicate: 1, late: 1, restarts: 0 }],
    [
      'with a gap wider than the window',
      [0, 100, 101, 60],
      { received: 3, lost: 99, duplicate: 0, late: 1, restarts: 0 },
    ],
    [
      'with a new start of the sender',
      [5000, 5001, 0, 1],
      { received: 4, lost: 0, duplicate: 0, late: 0, restarts: 1 },
    ],
    ['with a jump far ahead', [0, 1, 900000, 900001], { received: 4, lost: 0, duplicate: 0, late: 0, restarts: 1 }],
  ] as const)('%s', (_what, sequences, expected) => expect(counts(received(sequences))).toEqual(expected));

  it('uses no value that is a duplicate or late', () => {
    expect(received([0, 2, 1]).command(requests.torque)).toBe(1);
    expect(received([0, 1, 1]).command(requests.torque)).toBe(1);
  });

  it('takes a new start as it comes after a hello, and after a time-out', () => {
    const rig = received([40, 41]);
    rig.control(kinds.hello);
    rig.say('requests', [9, 0], 0);
    rig.take(2);
    expect(rig.command(requests.torque)).toBe(9);
    expect(rig.value('powertrain.hellos')).toBe(1);
    expect(rig.value('requests.restarts')).toBe(0);
    const other = received([400, 401]);
    for (let tick = 2; tick < 10; tick += 1) other.take(tick);
    other.say('requests', [9, 0], 10);
    other.take(10);
    expect(other.command(requests.torque)).toBe(9);
    expect(other.value('requests.restarts')).toBe(1);
  });

  it('counts as an independent account of it does, for random losses, duplicates and swaps', () => {
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 9 }), { maxLength: 200 }), (fates) => {
        const line: number[] = [0];
        let lost = 0;
        let duplicate = 0;
        let late = 0;
        fates.forEach((fate, i) => {
          const sequence = 2 * i + 1;
          if (fate === 0) {
            lost += 1;
            line.push(sequence + 1);
          } else if (fate === 1) {
            duplicate += 1;
            line.push(sequence, sequence, sequence + 1);
          } else if (fate === 2) {
            late += 1;
            line.push(sequence + 1, sequence);
          } else line.push(sequence, sequence + 1);
        });
        const rig = received(line);
        expect(counts(rig)).toEqual({
          received: 1 + 2 * fates.length - lost - late,
          lost,
          duplicate,
          late,
          restarts: 0,
        });
      }),
      { numRuns: 60 },
    );
  });
});

describe('bad datagrams', () => {
  it('are counted by kind, reported once a second, and never used', () => {
    const rig = new Rig(sampleMap());
    rig.say('requests', [10, 1], 0);
    rig.take(0);
    const bad = (tick: number): void => {
      rig.say('requests', [99, 0], 1, 0, (d) => d.view.setUint8(0, 0));
      rig.say('requests', [99, 0], 1, 0, (d) => d.view.setUint8(20, 0));
      rig.say('speeds', [99], 1);
      rig.control(kinds.end);
      rig.toBench.push(new Uint8Array(3), 3);
      rig.toBench.push(new Uint8Array(2000), 2000);
      rig.toBench.push(new Uint8Array(0), 0);
      rig.take(tick);
    };
    bad(1);
    bad(2);
    const counts = Object.fromEntries(
      ['received', 'malformed', 'wrongChecksum', 'wrongMap', 'wrongLength'].map((name) => [
        name,
        rig.value(`powertrain.${name}`),
      ]),
    );
    expect(counts).toEqual({ received: 15, malformed: 8, wrongChecksum: 2, wrongMap: 0, wrongLength: 4 });
    expect(rig.command(requests.torque)).toBe(10);
    expect(rig.value('requests.lost')).toBe(0);
    for (let tick = 3; tick < 1100; tick += 1) rig.take(tick);
    const reports = rig.seen.filter((one) => one.name === 'malformed datagrams');
    expect(reports).toEqual([
      { tick: 1, name: 'malformed datagrams', subject: 'powertrain', a: 4, b: 4 },
      { tick: 1001, name: 'malformed datagrams', subject: 'powertrain', a: 4, b: 8 },
    ]);
  });

  it('of another map are told apart', () => {
    const rig = new Rig(sampleMap());
    const other = new Rig(mapOf(message('other', 32, 'received', [signal('a', 'x.a', { type: 'f64' })])));
    other.say('other', [1], 0);
    const bytes = new Uint8Array(100);
    rig.toBench.push(bytes, other.toBench.shift(bytes));
    rig.take(0);
    expect(rig.value('powertrain.wrongMap')).toBe(1);
    expect(rig.seen[0].name).toBe('wrong message map');
  });

  it('with a value out of range are refused or brought into range, as the map says', () => {
    const rig = new Rig(sampleMap());
    rig.say('requests', [10, 1], 0);
    rig.say('gear', [2, 0], 0);
    rig.take(0);
    const resign = (name: string, change: (view: DataView) => void): void => {
      rig.say(name, new Array(rig.codec(name).count).fill(0), 1, 0, (datagram) => {
        change(datagram.view);
        const end = rig.codec(name).length - 4;
        datagram.view.setInt32(end, crc32(datagram.bytes, 0, end), true);
      });
    };
    resign('requests', (view) => view.setInt16(20, 9000, true));
    resign('gear', (view) => view.setInt8(20, 100));
    rig.take(1);
    expect(rig.command(requests.torque)).toBe(10);
    expect(rig.command('gearbox.request')).toBe(6);
    expect([rig.value('requests.outOfRange'), rig.value('gear.outOfRange')]).toEqual([1, 1]);
    expect([rig.value('requests.age'), rig.value('gear.age')]).toEqual([0.001, 0]);
    expect(rig.value('requests.lost')).toBe(0);
  });

  it('in a flood wait for later ticks, and every one is an input of the tick that took it', () => {
    const rig = new Rig(sampleMap(), { datagramsPerTick: 5 });
    for (let i = 0; i < 12; i += 1) rig.say('requests', [i, 0], i);
    for (let tick = 0; tick < 4; tick += 1) rig.take(tick);
    expect(rig.inputs.map((one) => one.tick)).toEqual([0, 0, 0, 0, 0, 1, 1, 1, 1, 1, 2, 2]);
    expect(rig.value('powertrain.floods')).toBe(2);
    expect(rig.command(requests.torque)).toBe(11);
    expect(rig.seen.find((one) => one.name === 'link flooded')).toMatchObject({ tick: 0, a: 1 });
  });
});

describe('one-step replies', () => {
  it('are the used messages that echo the tick just before', () => {
    const rig = new Rig(sampleMap());
    rig.say('requests', [0, 0], 0, -1);
    rig.take(0);
    rig.say('requests', [0, 0], 1, 0);
    rig.say('requests', [0, 0], 1, 0);
    rig.take(1);
    rig.say('requests', [0, 0], 2, 0);
    rig.say('gear', [0, 0], 0, 1);
    rig.take(2);
    expect([rig.value('powertrain.replies'), rig.value('powertrain.oneStepReplies')]).toEqual([4, 3]);
    expect(rig.value('powertrain.oneStepShare')).toBe(0.75);
    rig.exchange.clearCounts(rig.block);
    rig.take(3);
    expect(rig.value('powertrain.replies')).toBe(0);
    expect(rig.value('requests.received')).toBe(0);
    expect(rig.value('requests.age')).toBe(0.001);
  });
});

describe('determinism', () => {
  it('does not hang on whether a journal listens', () => {
    const rigs = [new Rig(sampleMap()), new Rig(sampleMap())];
    rigs[1].exchange.setJournal(noJournal);
    for (const rig of rigs)
      for (let tick = 0; tick < 20; tick += 1) {
        rig.say('requests', [1, 0], tick % 7);
        rig.say('requests', [1, 0], tick, 0, (d) => d.view.setUint8(20, 7));
        rig.take(tick);
        rig.publish(tick);
      }
    expect(rigs[1].block).toEqual(rigs[0].block);
    expect(rigs[0].seen.length).toBeGreaterThan(2);
  });

  it('gives the same bytes of the block, tick by tick, from the recorded inputs alone', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.integer({ min: 0, max: 11 }), fc.integer({ min: -800, max: 800 })), {
          minLength: 50,
          maxLength: 150,
        }),
        (script) => {
          const first = new Rig(sampleMap());
          const hashes: string[] = [];
          const hash = (rig: Rig): string => {
            const out = new Int32Array(2);
            hashBlock(new Int32Array(rig.block.buffer), out);
            return `${out[0]} ${out[1]}`;
          };
          const run = (rig: Rig, tick: number): string => {
            rig.set('highLine.pressure', tick * 1e5);
            rig.take(tick);
            rig.publish(tick);
            return hash(rig);
          };
          let sequence = 0;
          script.forEach(([fate, value], tick) => {
            if (fate > 2)
              first.say('requests', [value, 0], (sequence += fate === 3 ? 3 : fate === 4 ? 0 : 1), tick - 1);
            if (fate === 5)
              first.say('gear', [value % 7, tick], tick, tick - 1, (d) => d.view.setUint8(20, value & 0xff));
            if (fate === 6)
              first.toBench.push(
                Uint8Array.from({ length: value & 0x7f }, (_, i) => i * value),
                value & 0x7f,
              );
            if (fate === 7) first.control(kinds.hello);
            hashes.push(run(first, tick));
          });
          const again = new Rig(sampleMap());
          let next = 0;
          script.forEach((_, tick) => {
            for (; next < first.inputs.length && first.inputs[next].tick === tick; next += 1)
              again.toBench.push(first.inputs[next].bytes, first.inputs[next].bytes.length);
            expect([tick, run(again, tick)]).toEqual([tick, hashes[tick]]);
          });
          expect(again.inputs).toEqual(first.inputs);
          expect(again.seen).toEqual(first.seen);
          expect(again.heard()).toEqual(first.heard());
        },
      ),
      { numRuns: 40 },
    );
  });
});
