import { describe, expect, it } from 'vitest';
import type { BusAdversary } from '../../bridge/bus-adversary.js';
import { hashBlock } from '../../runtime/block.js';
import { CanRig, canMap, field, frameMessage } from './can-rig.js';

const map = () =>
  canMap([
    frameMessage(
      'status',
      0x100,
      'sent',
      [field('v', 'x.v', { startBit: 16, length: 16 }, { least: 0, most: 65535 })],
      { protection: { kind: 'e2e-1', settings: { dataId: 7 } } },
    ),
    frameMessage(
      'request',
      0x200,
      'received',
      [field('v', 'y.v', { startBit: 16, length: 16 }, { least: 0, most: 65535 })],
      { timeout: 50, protection: { kind: 'e2e-1', settings: { dataId: 9, mostStep: 14 } } },
    ),
  ]);

const rigWith = (faults: Readonly<Record<string, number>>, seed = 1): CanRig => {
  const rig = new CanRig(map(), { seed });
  for (const [path, value] of Object.entries(faults))
    rig.block[rig.exchange.faults.find((one) => one.path === `bus.${path}`)!.slot] = value;
  return rig;
};

/** One frame each way in every tick; what the bench used of them and what stood on the bus, tick by tick. */
function run(rig: CanRig, ticks: number) {
  const out: { tick: number; bytes: Uint8Array }[] = [];
  for (let tick = 0; tick < ticks; tick += 1) {
    rig.say('request', [tick], tick % 15);
    rig.set('x.v', tick);
    rig.take(tick);
    rig.publish(tick);
    for (const bytes of rig.heard()) out.push({ tick, bytes });
  }
  return {
    out,
    count: (name: string) => rig.block[rig.exchange.links[0]!.slots[name]!]!,
    request: (name: string) => rig.value(`request.${name}`),
  };
}
const carriedBy = (bytes: Uint8Array): number => bytes[10]! | (bytes[11]! << 8);

describe('a bus that misbehaves', () => {
  it('does nothing until it is told to', () => {
    const { out, count, request } = run(rigWith({}), 300);
    expect(out.map(({ tick, bytes }) => [tick, carriedBy(bytes)])).toEqual(
      Array.from({ length: 300 }, (_, i) => [i, i]),
    );
    expect(request('received')).toBe(300);
    expect(count('sentDropped') + count('receivedDropped')).toBe(0);
  });

  it('drops: what arrives and what was dropped make up what was sent, and the counter shows the gaps', () => {
    const { out, count, request } = run(rigWith({ receivedDrop: 0.2, sentDrop: 0.3 }), 2000);
    expect(out.length + count('sentDropped')).toBe(2000);
    expect(count('sentDropped')).toBeGreaterThan(500);
    expect(count('sentDropped')).toBeLessThan(700);
    expect(request('received') + count('receivedDropped')).toBe(2000);
    // All but those after the last one that came.
    expect(count('receivedDropped') - request('lost')).toBeLessThan(5);
  });

  it('duplicates, and the counter keeps the second from being used', () => {
    const { out, count, request } = run(rigWith({ receivedDuplicate: 0.25, sentDuplicate: 0.25 }), 2000);
    expect(out.length).toBe(2000 + count('sentDuplicated'));
    expect(count('sentDuplicated')).toBeGreaterThan(400);
    expect(request('duplicate')).toBe(count('receivedDuplicated'));
    expect(request('received')).toBe(2000);
  });

  it('reorders: a frame after the one that follows it', () => {
    const { out, count } = run(rigWith({ sentReorder: 0.2 }), 1000);
    const values = out.map(({ bytes }) => carriedBy(bytes));
    const swaps = values.filter((value, i) => i > 0 && value < values[i - 1]!).length;
    expect(swaps).toBe(count('sentReordered') - (values.length < 1000 ? 1 : 0));
    expect(swaps).toBeGreaterThan(100);
    expect([...values].sort((a, b) => a - b)).toEqual(
      Array.from({ length: values.length }, (_, i) => i).map((i) => (values.includes(i) ? i : i + 1)),
    );
  });

  it('corrupts one bit, and the checksum shows every one', () => {
    const { out, count, request } = run(rigWith({ receivedCorrupt: 0.3, sentCorrupt: 0.3 }), 2000);
    expect(request('wrongChecksum')).toBe(count('receivedCorrupted'));
    expect(count('receivedCorrupted')).toBeGreaterThan(500);
    const clean = run(rigWith({}), 2000).out;
    let bits = 0;
    out.forEach(({ bytes }, i) => {
      bytes.forEach((byte, k) => {
        for (let left = byte ^ clean[i]!.bytes[k]!; left > 0; left >>= 1) bits += left & 1;
      });
    });
    expect(bits).toBe(count('sentCorrupted'));
  });

  it('shortens, and the length shows every one', () => {
    const { out, count, request } = run(rigWith({ receivedShorten: 0.5, sentShorten: 1 }), 200);
    expect(out.every(({ bytes }) => bytes[4] === 7)).toBe(true);
    expect(request('wrongLength')).toBe(count('receivedShortened'));
    expect(count('sentShortened')).toBe(200);
  });

  it('delays to the tick', () => {
    const { out, request } = run(rigWith({ sentDelay: 0.007, receivedDelay: 0.004 }), 100);
    expect(out.map(({ tick, bytes }) => tick - carriedBy(bytes))).toEqual(Array.from({ length: 93 }, () => 7));
    expect(request('received')).toBe(96);
    const rig = rigWith({ receivedDelay: 0.004 });
    run(rig, 20);
    expect(rig.command('y.v')).toBe(15);
  });

  it('is silent on one way or both', () => {
    const rig = rigWith({ receivedSilence: 1, sentSilence: 1 });
    const { out, count, request } = run(rig, 100);
    expect([
      out.length,
      count('sentDropped'),
      count('receivedDropped'),
      request('received'),
      request('timeOuts'),
    ]).toEqual([0, 100, 100, 0, 1]);
    // What was recorded is what the bus brought.
    expect(rig.inputs).toHaveLength(100);
  });

  it('does the same again with the same seed and another thing with another, and is derived again from its inputs', () => {
    const faults = {
      receivedDrop: 0.1,
      receivedDuplicate: 0.1,
      receivedReorder: 0.1,
      receivedCorrupt: 0.1,
      sentDrop: 0.1,
      sentReorder: 0.2,
      receivedDelay: 0.003,
    };
    const hash = (rig: CanRig): string => {
      const out = new Int32Array(2);
      hashBlock(new Int32Array(rig.block.buffer), out);
      return out.join(' ');
    };
    const [a, b, other] = [rigWith(faults), rigWith(faults), rigWith(faults, 2)];
    const frames = [a, b, other].map((rig) =>
      run(rig, 500).out.map(({ tick, bytes }) => `${tick} ${Buffer.from(bytes).toString('hex')}`),
    );
    expect(frames[1]).toEqual(frames[0]);
    expect(frames[2]).not.toEqual(frames[0]);
    expect(hash(b)).toBe(hash(a));
    const again = rigWith(faults);
    for (let tick = 0; tick < 500; tick += 1) {
      for (const input of a.inputs) if (input.tick === tick) again.put(input.bytes);
      again.set('x.v', tick);
      again.take(tick);
      again.publish(tick);
    }
    expect(hash(again)).toBe(hash(a));
  });

  it('floods: so many frames a second, exact to the tick, of the highest priority, and counted', () => {
    const { out, count } = run(rigWith({ sentFlood: 2500, receivedFlood: 250 }), 400);
    const flood = out.filter(({ bytes }) => bytes[0] === 0 && bytes[1] === 0);
    expect(flood).toHaveLength(1000);
    expect(count('sentFlooded')).toBe(1000);
    expect(out).toHaveLength(1400);
    expect(new Set(flood.map(({ bytes }) => Buffer.from(bytes).toString('hex'))).size).toBe(1000);
    // two frames and a half in each tick
    for (let tick = 0; tick < 400; tick += 2)
      expect(flood.filter((one) => one.tick === tick || one.tick === tick + 1)).toHaveLength(5);
    expect(count('receivedFlooded')).toBe(100);
    const rig = rigWith({ receivedFlood: 20_000 });
    run(rig, 100);
    expect(rig.value('bus.unknown')).toBe(2000);
    expect(rig.value('request.received')).toBe(100);
  });

  it('reports bus-off: nothing comes and nothing leaves until it is restarted, and every frame is accounted for', () => {
    const rig = rigWith({ reportBusOff: 1 });
    const off = run(rig, 100);
    expect(off.out).toEqual([]);
    expect(['busOffs', 'controllerState', 'sentDropped', 'receivedDropped', 'restarts'].map(off.count)).toEqual([
      1, 3, 100, 100, 0,
    ]);
    expect([rig.value('request.received'), rig.value('request.timeOuts')]).toEqual([0, 1]);
    expect(rig.seen.map(({ name }) => name)).toContain('bus-off');
    rig.block[rig.exchange.faults.find(({ path }) => path === 'bus.reportBusOff')!.slot] = 0;
    const on = run(rig, 100);
    expect(on.out).toHaveLength(100);
    expect([on.count('restarts'), on.count('controllerState'), rig.value('request.received')]).toEqual([1, 0, 100]);
  });

  it('lets single messages go wrong: counters that stand still, wrong checksums, too short', () => {
    const fault = (path: string, value: number): CanRig => {
      const rig = new CanRig(map(), { seed: 3 });
      rig.block[rig.exchange.faults.find((one) => one.path === path)!.slot] = value;
      return rig;
    };
    const counter = fault('request.faultCounter', 0.25);
    const { request } = run(counter, 2000);
    expect(request('duplicate')).toBeGreaterThan(400);
    expect(request('duplicate') + request('received')).toBe(2000);
    const checksum = run(fault('request.faultChecksum', 0.25), 2000);
    expect(checksum.request('wrongChecksum')).toBeGreaterThan(400);
    expect(checksum.request('wrongChecksum') + checksum.request('received')).toBe(2000);
    const length = run(fault('request.faultLength', 0.25), 2000);
    expect(length.request('wrongLength')).toBeGreaterThan(400);
    expect(length.request('wrongLength') + length.request('received')).toBe(2000);
    // on the way out: as its receiver counts them
    const clean = run(rigWith({}), 1000).out;
    const counters = run(fault('status.faultCounter', 0.25), 1000).out.map(({ bytes }) => bytes[9]! & 15);
    const repeats = counters.filter((value, i) => i > 0 && value === counters[i - 1]).length;
    expect(repeats).toBeGreaterThan(200);
    expect(clean.map(({ bytes }) => bytes[9]! & 15).filter((value, i, all) => value === all[i - 1])).toEqual([]);
    const spoilt = run(fault('status.faultChecksum', 0.25), 1000).out.filter(
      ({ bytes }, i) => bytes[8] !== clean[i]!.bytes[8],
    );
    expect(spoilt.length).toBeGreaterThan(200);
    const short = run(fault('status.faultLength', 0.25), 1000).out.filter(({ bytes }) => bytes[4] === 7);
    expect(short.length).toBeGreaterThan(200);
  });

  it('shows the rate of a message, counted over whole seconds', () => {
    const rig = rigWith({});
    for (let tick = 0; tick < 2400; tick += 1) {
      if (tick % 10 === 0 && tick < 1500) rig.say('request', [tick], (tick / 10) % 15);
      rig.take(tick);
      if (tick === 1100) expect(rig.value('request.rate')).toBe(100);
      if (tick === 2100) expect(rig.value('request.rate')).toBe(50);
    }
  });

  it('holds at most sixteen frames: more are dropped and counted', () => {
    const rig = rigWith({ receivedDelay: 0.1 });
    for (let i = 0; i < 40; i += 1) rig.say('request', [i], i % 15);
    rig.take(0);
    expect(rig.value('bus.receivedDropped')).toBe(24);
    const adversary = rig.exchange.links[0]!.adversaries![0] as BusAdversary;
    expect(adversary.acts(rig.block)).toBe(true);
    for (let tick = 1; tick <= 100; tick += 1) rig.take(tick);
    expect(rig.value('request.received')).toBe(16);
  });
});
