import { describe, expect, it } from 'vitest';
import { CanControllerEndpoint } from '../../../bridge/can-controller.js';
import { makeFrame } from '../../../bridge/can-frame.js';
import { ControllerMirror } from '../../../bridge/controller-side.js';
import { identifierOf } from '../../../bridge/j1939/identifier.js';
import { nameBytes } from '../../../bridge/j1939/name.js';
import { canBench } from '../../support/can-bench.js';

// Identifiers, control bytes and timings after SAE J1939-21 (5.4 request, 5.10 transport protocol), J1939-73 (DM1),
// J1939-81 (address claim).
const life = 'life: { preRoll: 0 ms }\n';
const id = (priority: number, pgn: number, destination: number, source: number): number =>
  identifierOf({ priority, pgn, source, destination });
const frame = (identifier: number, payload: readonly number[]): Uint8Array =>
  makeFrame(identifier, payload, { extended: true });
type Bench = ReturnType<typeof canBench>;
const run = (bench: Bench, ticks: number): { tick: number; identifier: number; data: string }[] => {
  const all: { tick: number; identifier: number; data: string }[] = [];
  for (let i = 0; i < ticks; i += 1) {
    bench.run(1);
    all.push(...bench.heard().map((one) => ({ tick: i, ...one })));
  }
  return all;
};

const longMessages = `${life}
messages:
  component:
    direction: sent
    j1939: { pgn: 65259, source: 0 }
    trigger: on-request
    bytes: 20
    signals:
      first: { from: 1, unit: "1", range: 0 .. 255, can: { start: 0, length: 8 } }
      last: { from: 200, unit: "1", range: 0 .. 255, can: { start: 152, length: 8 } }
  speed:
    direction: sent
    j1939: { pgn: 61444, source: 0, priority: 3 }
    trigger: on-request
    bytes: 8
    signals:
      engineSpeed: { from: 800, unit: rpm, range: 0 .. 8000, can: { start: 24, length: 16, scale: 0.125 } }
  toGearbox:
    direction: sent
    j1939: { pgn: 0xc800, source: 0, destination: 3 }
    every: 1000 ms
    phase: 0 ms
    bytes: 120
    signals:
      first: { from: 7, unit: "1", range: 0 .. 255, can: { start: 0, length: 8 } }
      last: { from: 9, unit: "1", range: 0 .. 255, can: { start: 952, length: 8 } }
  fromGearbox:
    direction: received
    j1939: { pgn: 0xc900, source: 3, destination: 0 }
    every: 1000 ms
    timeout: 5000 ms
    bytes: 120
    signals:
      first: { unit: "1", range: 0 .. 255, substitute: 0, can: { start: 0, length: 8 } }
      last: { unit: "1", range: 0 .. 255, substitute: 0, can: { start: 952, length: 8 } }
  told:
    direction: received
    j1939: { pgn: 65280, source: 3 }
    every: 1000 ms
    timeout: 5000 ms
    bytes: 17
    signals:
      last: { unit: "1", range: 0 .. 255, substitute: 0, can: { start: 128, length: 8 } }
`;

describe('requests', () => {
  it('are answered by the message asked for, by nobody when it is not the one asked, refused when there is none', () => {
    const bench = canBench(longMessages);
    run(bench, 5);
    const ask = (destination: number, pgn: number): { identifier: number; data: string }[] => {
      bench.put(frame(id(6, 0xea00, destination, 0x21), [pgn & 255, (pgn >> 8) & 255, pgn >> 16]));
      return run(bench, 3).filter(({ identifier }) => (identifier & 0xff0000) !== 0xec0000 || pgn === 65259);
    };
    const speed = ask(0, 61444);
    expect(speed.map(({ identifier, data }) => [identifier, data])).toEqual([[0x0cf00400, '0000000019000000']]);
    expect(ask(255, 61444)).toHaveLength(1);
    expect(ask(5, 61444)).toEqual([]);
    expect(ask(255, 65262)).toEqual([]);
    // 65262 = 0xFEEE: not available, to 0x21
    expect(ask(0, 65262).map(({ identifier, data }) => [identifier, data])).toEqual([[0x18e8ff00, '01ffffff21eefe00']]);
    expect(bench.value('bus.requests')).toBe(4);
    const long = ask(0, 65259);
    expect(long.map(({ data }) => data)).toEqual(['20140003ffebfe00']);
  });
});

describe('the transport protocol', () => {
  it('announces to everybody: packets at least 50 ms apart, numbered from 1, the rest 0xff', () => {
    const bench = canBench(longMessages);
    run(bench, 5);
    bench.put(frame(id(6, 0xea00, 0, 0x21), [0xeb, 0xfe, 0]));
    const seen = run(bench, 400).filter(({ identifier }) => (identifier & 0xffff) === 0xff00);
    expect(seen.map(({ identifier, data }) => [identifier, data])).toEqual([
      [0x1cecff00, '20140003ffebfe00'],
      [0x1cebff00, '0101000000000000'],
      [0x1cebff00, '0200000000000000'],
      [0x1cebff00, '030000000000c8ff'],
    ]);
    for (let i = 1; i < seen.length; i += 1) {
      const apart = seen[i]!.tick - seen[i - 1]!.tick;
      expect(apart).toBeGreaterThanOrEqual(50);
      expect(apart).toBeLessThanOrEqual(200);
    }
  });

  it('agrees with one destination: window by window, a packet asked for again, the acknowledgement, then silence', () => {
    const bench = canBench(longMessages);
    const first = run(bench, 5);
    expect(first.map(({ identifier, data }) => [identifier, data])).toEqual([[0x1cec0300, '10780012ff00c800']]);
    const answer = (...payload: number[]): { data: string }[] => {
      bench.put(frame(id(7, 0xec00, 0, 3), payload));
      return run(bench, 30);
    };
    const some = answer(17, 5, 1, 255, 255, 0, 0xc8, 0);
    expect(some.map(({ data }) => data.slice(0, 2))).toEqual(['01', '02', '03', '04', '05']);
    expect(some[0]!.data).toBe('0107000000000000');
    // hold on; then again from packet 4
    expect(answer(17, 0, 255, 255, 255, 0, 0xc8, 0)).toEqual([]);
    expect(answer(17, 15, 4, 255, 255, 0, 0xc8, 0).map(({ data }) => Number.parseInt(data.slice(0, 2), 16))).toEqual([
      4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16, 17, 18,
    ]);
    expect(answer(19, 120, 0, 18, 255, 0, 0xc8, 0)).toEqual([]);
    expect(run(bench, 800)).toEqual([]);
  });

  it('gives up after T3 without an answer, and says so', () => {
    const bench = canBench(longMessages);
    const seen = run(bench, 1600).filter(({ identifier }) => identifier === 0x1cec0300);
    expect(seen.map(({ tick, data }) => [tick, data])).toEqual([
      [0, '10780012ff00c800'],
      [1250, 'ff03ffffff00c800'],
    ]);
    expect(bench.value('bus.transportBusy')).toBe(1);
  });

  it('receives: asks for windows of packets, asks again for one that is missing, acknowledges', () => {
    const bench = canBench(longMessages);
    run(bench, 5);
    const say = (...payload: number[]): string[] => {
      bench.put(
        frame(
          id(
            7,
            payload[0]! > 15 && payload.length === 8 && payload[5] === 0 && payload[6] === 0xc9 ? 0xec00 : 0xeb00,
            0,
            3,
          ),
          payload,
        ),
      );
      return run(bench, 1).map(({ data }) => data);
    };
    const packet = (number: number, value = 0): string[] => {
      bench.put(frame(id(7, 0xeb00, 0, 3), [number, value, 0, 0, 0, 0, 0, number === 18 ? 255 : 0]));
      return run(bench, 1).map(({ data }) => data);
    };
    expect(say(16, 120, 0, 18, 255, 0, 0xc9, 0)).toEqual(['111001ffff00c900']);
    expect(packet(1, 42)).toEqual([]);
    // packet 2 is missing
    expect(packet(3)).toEqual(['110f02ffff00c900']);
    for (let number = 2; number < 16; number += 1) expect(packet(number)).toEqual([]);
    expect(packet(16)).toEqual(['110211ffff00c900']);
    expect(packet(17)).toEqual([]);
    // 120 bytes are 17 packets and one byte: the last byte of the message
    expect(packet(18, 99)).toEqual(['13780012ff00c900']);
    expect([bench.value('fromGearbox.first'), bench.value('fromGearbox.last')]).toEqual([42, 99]);
    expect(bench.value('bus.longMessages')).toBe(1);
    expect(bench.value('bus.transportFailures')).toBe(0);
    // a length that the map does not have: resources
    expect(say(16, 60, 0, 9, 255, 0, 0xc9, 0)).toEqual(['ff02ffffff00c900']);
    expect(bench.value('fromGearbox.wrongLength')).toBe(1);
  });

  it('takes what is announced, and drops it when a packet is missing or late', () => {
    const bench = canBench(longMessages);
    run(bench, 5);
    const announce = (): void => {
      bench.put(frame(id(7, 0xec00, 255, 3), [32, 17, 0, 3, 255, 0, 0xff, 0]));
      run(bench, 50);
    };
    const packet = (number: number, wait = 50): void => {
      bench.put(frame(id(7, 0xeb00, 255, 3), [number, 1, 2, 33, 255, 255, 255, 255]));
      run(bench, wait);
    };
    announce();
    packet(1);
    packet(2);
    packet(3);
    expect([bench.value('told.last'), bench.value('told.received')]).toEqual([33, 1]);
    announce();
    packet(1);
    packet(3);
    packet(2);
    expect([bench.value('told.received'), bench.value('bus.transportFailures')]).toEqual([1, 1]);
    announce();
    packet(1, 800);
    packet(2);
    packet(3);
    expect([bench.value('told.received'), bench.value('bus.transportFailures')]).toEqual([1, 2]);
  });

  it('goes between the two ends of a map without a word lost, both ways', () => {
    const bench = canBench(longMessages);
    const links = ['bus'];
    const mirror = new ControllerMirror(bench.spec.map, links);
    const read = { first: 0, last: 0 };
    const endpoint = new CanControllerEndpoint({
      map: bench.spec.map,
      links,
      controller: {
        step: (_tick, from, to) => {
          read.first = from[mirror.readIndex('toGearbox.first')]!;
          read.last = from[mirror.readIndex('toGearbox.last')]!;
          to[mirror.writeIndex('fromGearbox.first')] = 11;
          to[mirror.writeIndex('fromGearbox.last')] = 222;
          to[mirror.writeIndex('told.last')] = 77;
        },
      },
      send: (_link, bytes, size) => bench.put(bytes.slice(0, size)),
    });
    for (let tick = 0; tick < 2500; tick += 1) {
      bench.run(1);
      endpoint.setTick(tick);
      const waiting = bench.heard();
      endpoint.pump(0, {
        poll: (into) => {
          const next = waiting.shift();
          if (next === undefined) return -1;
          into.set(frame(next.identifier, [...Buffer.from(next.data, 'hex')]));
          return 16;
        },
        send: (_bytes, length) => length,
      });
      endpoint.answer(1);
    }
    expect(read).toEqual({ first: 7, last: 9 });
    expect(bench.value('fromGearbox.last')).toBe(222);
    expect(bench.value('told.last')).toBe(77);
    expect(bench.value('fromGearbox.received')).toBeGreaterThanOrEqual(2);
    expect(bench.value('bus.transportFailures')).toBe(0);
    expect(endpoint.refused).toBe(0);
  });
});

describe('addresses', () => {
  const claimed = (address: number): string => `${life}
messages:
  status:
    direction: sent
    j1939: { pgn: 65290, source: ${address} }
    every: 10 ms
    phase: 0 ms
    bytes: 1
    signals:
      v: { from: 1, unit: "1", range: 0 .. 255, can: { start: 0, length: 8 } }
`;
  const units = (address: number): string =>
    `{ hydraulics: { address: ${address}, identity: 5, manufacturer: 9, function: 130, industryGroup: 1 } }`;
  const bench = (address: number): Bench =>
    canBench(
      claimed(address),
      {},
      `links: { bus: { is: can, interface: vcan0, bitRate: 250 kbit/s, units: ${units(address)} } }\n`,
    );
  // identity in bits 0 to 20, manufacturer from bit 21, function from bit 40, industry group from bit 60
  const name = nameBytes({
    identity: 5,
    manufacturer: 9,
    unitInstance: 0,
    functionInstance: 0,
    function: 130,
    vehicleSystem: 0,
    vehicleSystemInstance: 0,
    industryGroup: 1,
  });

  it('are claimed before the first message, with the NAME from its lowest byte on, and again when somebody asks', () => {
    const value = 5n | (9n << 21n) | (130n << 40n) | (1n << 60n);
    expect(Buffer.from(name).readBigUInt64LE()).toBe(value);
    const own = bench(39);
    const seen = run(own, 25);
    expect(seen.map(({ tick, identifier }) => [tick, identifier])).toEqual([
      [0, 0x18eeff27],
      [10, 0x18ff0a27],
      [20, 0x18ff0a27],
    ]);
    expect(seen[0]!.data).toBe(Buffer.from(name).toString('hex'));
    own.put(frame(id(6, 0xea00, 255, 254), [0, 0xee, 0]));
    expect(run(own, 2).map(({ identifier }) => identifier)).toEqual([0x18eeff27]);
  });

  it('from 128 to 247 are used only after 250 ms without an objection', () => {
    const seen = run(bench(130), 300).filter(({ identifier }) => identifier === 0x18ff0a82);
    expect(seen[0]!.tick).toBe(250);
  });

  it('are defended against a greater NAME and lost to a smaller one', () => {
    const own = bench(39);
    run(own, 25);
    own.put(frame(id(6, 0xee00, 255, 39), [6, ...name.subarray(1)]));
    expect(run(own, 2).map(({ identifier }) => identifier)).toEqual([0x18eeff27]);
    expect(own.value('bus.addressesLost')).toBe(0);
    own.put(frame(id(6, 0xee00, 255, 39), [4, ...name.subarray(1)]));
    const after = run(own, 60);
    // cannot claim an address: source 254
    expect(after.map(({ identifier }) => identifier)).toEqual([0x18eefffe]);
    expect(own.value('bus.addressesLost')).toBe(1);
  });
});

describe('trouble codes', () => {
  const codes = (direction: 'sent' | 'received'): string => `${life}
messages:
  troubles:
    direction: ${direction}
    j1939: { pgn: 65226, source: 0 }
    every: 1000 ms
    ${direction === 'sent' ? 'phase: 0 ms' : 'timeout: 3000 ms'}
    signals:
      amber: { ${direction === 'sent' ? 'from: 1' : 'substitute: 0'}, unit: "1", range: 0 .. 3, lamp: warning }
      red: { ${direction === 'sent' ? 'from: 0' : 'substitute: 0'}, unit: "1", range: 0 .. 3, lamp: stop }
      oilHot: { ${direction === 'sent' ? 'from: life.key' : 'substitute: 0'}, unit: "1", range: 0 .. 126, trouble: { spn: 110, fmi: 0 } }
      sensorShort: { ${direction === 'sent' ? 'from: life.relay * 5' : 'substitute: 0'}, unit: "1", range: 0 .. 126, trouble: { spn: 520192, fmi: 4 } }
`;

  it('go as one frame with none or one active, and in packets with more', () => {
    const bench = canBench(codes('sent'));
    bench.command('life.key', 0);
    // amber lamp on (bits 3-4 of the first byte: 0x04), no code: zeros, then 0xffff
    expect(run(bench, 1000).map(({ identifier, data }) => [identifier, data])).toEqual([
      [0x18feca00, '04ff00000000ffff'],
    ]);
    bench.command('life.key', 1);
    // SPN 110, FMI 0, seen once
    expect(run(bench, 1000).map(({ data }) => data)).toEqual(['04ff6e000001ffff']);
    bench.command('life.relay', 1);
    // SPN 520192 = 0x7F000: low 0x00, middle 0xF0, upper 3 bits 7 above FMI 4; seen 5 times
    expect(run(bench, 1000).map(({ data }) => data)).toEqual([
      '200a0002ffcafe00',
      '0104ff6e00000100',
      '02f0e405ffffffff',
    ]);
  });

  it('come as signals, whichever way they came, codes of others beside them', () => {
    const bench = canBench(codes('received'));
    run(bench, 2);
    const now = (): number[] => ['amber', 'red', 'oilHot', 'sensorShort'].map((one) => bench.value(`troubles.${one}`));
    bench.put(frame(0x18feca00, [0x10, 0xff, 110, 0, 0, 3, 255, 255]));
    run(bench, 1);
    expect(now()).toEqual([0, 1, 3, 0]);
    bench.put(frame(id(7, 0xec00, 255, 0), [32, 14, 0, 2, 255, 0xca, 0xfe, 0]));
    run(bench, 60);
    bench.put(frame(id(7, 0xeb00, 255, 0), [1, 0x04, 0xff, 1, 2, 3, 4, 0x00]));
    run(bench, 60);
    bench.put(frame(id(7, 0xeb00, 255, 0), [2, 0xf0, 0xe4, 5, 9, 9, 9, 9]));
    run(bench, 1);
    expect(now()).toEqual([1, 0, 0, 5]);
    expect(bench.value('troubles.received')).toBe(2);
  });
});
