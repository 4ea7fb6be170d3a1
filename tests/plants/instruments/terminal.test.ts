import { expect, it } from 'vitest';
import { makeFrame } from '../../../bridge/can-frame.js';
import { DatagramQueue, MemoryTransport } from '../../../bridge/memory-transport.js';
import { Datagram, UdpCodec } from '../../../bridge/udp-codec.js';
import { assemble } from '../../../configs/assemble.js';
import { readBench } from '../../../configs/bench.js';
import { catalogue } from '../../../configs/catalogue.js';

const file = new URL('../../../configs/hand-bench/bench-io.yaml', import.meta.url).pathname;

function bench() {
  const spec = readBench(file, catalogue);
  const assembly = assemble(spec, { seed: 1 });
  const [to, from] = [new DatagramQueue(4096, 72), new DatagramQueue(4096, 72)];
  const codec = new UdpCodec(spec.map.messages.find(({ name }) => name === 'boxIn')!, assembly.exchange.checksum);
  const box = new DatagramQueue(64, 256);
  assembly.exchange.attach('box', new MemoryTransport(box, new DatagramQueue(4096, 256)));
  let sequence = 0;
  assembly.exchange.attach('module', new MemoryTransport(to, from));
  let tick = assembly.firstTick;
  return {
    put: (frame: Uint8Array) => to.push(frame, frame.length),
    run: (ticks: number) => {
      for (let i = 0; i < ticks; i += 1) assembly.tick.run(tick++);
    },
    /** A datagram of the I/O box: current of the displacement, valves shut. */
    say: (milliamperes: number) => {
      const datagram = new Datagram(codec.length);
      codec.quantise(Float64Array.of(milliamperes, 0, 0), 0, new Float64Array(3), 0);
      const length = codec.write(datagram, sequence++, 0);
      box.push(datagram.bytes, length);
    },
    /** Payloads of the last frame of each identifier. */
    heard: () => {
      const last = new Map<number, Buffer>();
      const into = new Uint8Array(72);
      for (let size = from.shift(into); size >= 0; size = from.shift(into))
        last.set(into[0]! | (into[1]! << 8), Buffer.from(into.slice(8, 8 + into[4]!)));
      return last;
    },
    value: (path: string) => {
      const index = assembly.table.find(path);
      if (index < 0) throw new Error(`no signal ${path}`);
      return assembly.signals[index]!;
    },
    command: (path: string, value: number) => {
      const slot = assembly.target(path);
      if (slot < 0) throw new Error(`no command ${path}`);
      assembly.block[slot] = value;
    },
  };
}

it('says a pressure as a voltage, a level as a current, a speed as a frequency', () => {
  const one = bench();
  one.run(400);
  // 0.5 .. 4.5 V over 0 .. 400 bar(g)
  const gauge = (one.value('highPressureSensor.value') - 101325) / 1e5;
  expect(gauge).toBeGreaterThan(100);
  expect(one.value('boxOut.highPressure')).toBeCloseTo(0.5 + gauge / 100, 4);
  // 4 .. 20 mA over the level
  expect(one.value('boxOut.level')).toBeCloseTo(0.004 + 0.016 * one.value('levelSensor.value'), 6);
  expect(one.value('boxOut.speed')).toBeCloseTo((one.value('speedSensor.value') * 30) / Math.PI, 3);
  expect(one.value('boxOut.key')).toBe(1);
});

it.each([
  ['shortToGround', 0],
  ['shortToSupply', 5],
  ['broken', 0],
])('%s of a wire is a voltage: %d V', (fault, volts) => {
  const one = bench();
  one.run(300);
  one.command(`highPressureWire.${fault}`, 1);
  one.run(10);
  expect(one.value('boxOut.highPressure')).toBe(volts);
  // CiA 301, predefined connection set: RPDO 2 of node 5; steps of 1 mV
  expect(one.heard().get(0x305)!.readInt16LE(0)).toBe(1000 * volts);
  one.command(`highPressureWire.${fault}`, 0);
  one.run(10);
  expect(one.value('boxOut.highPressure')).toBeGreaterThan(2);
});

it('speaks to a CiA 401 module by the predefined connection set, and hears its inputs and its heartbeat', () => {
  const one = bench();
  one.run(300);
  const heard = one.heard();
  // NMT: start remote node (1), node 5; RPDO 1 and 2
  expect([...heard.keys()].sort((a, b) => a - b)).toEqual([0x000, 0x205, 0x305]);
  expect([...heard.get(0)!]).toEqual([1, 5]);
  expect([...heard.get(0x205)!]).toEqual([3]);
  const analogue = heard.get(0x305)!;
  expect(analogue.readInt16LE(0)).toBe(Math.round(one.value('analogueOutputs.highPressure') * 1000));
  // 1 uA
  expect(analogue.readInt16LE(2)).toBe(Math.round(one.value('analogueOutputs.level') * 1e6));
  // TPDO 2: 12 mA; heartbeat: operational
  one.put(makeFrame(0x285, [0xe0, 0x2e, 0, 0, 0, 0, 0, 0]));
  one.put(makeFrame(0x705, [5]));
  one.run(1);
  expect(one.value('analogueInputs.displacement')).toBeCloseTo(0.012, 9);
  expect(one.value('heartbeat.state')).toBe(5);
});

it('a request by current: half way at 12 mA, at rest with a broken wire', () => {
  const one = bench();
  one.run(250);
  // nothing came: 0 mA is a broken wire
  expect(one.value('displacementWire.value')).toBe(0);
  for (const [milliamperes, request] of [
    [12, 0],
    [20, 1],
    [4, -1],
    [8, -0.5],
    [24, 1],
    [1, 0],
  ] as const) {
    one.say(milliamperes);
    one.run(2);
    expect([milliamperes, one.value('displacementWire.value')]).toEqual([milliamperes, expect.closeTo(request, 6)]);
  }
});
