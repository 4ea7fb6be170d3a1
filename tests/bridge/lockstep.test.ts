import { describe, expect, it } from 'vitest';
import { ControllerEndpoint, type ControllerModule } from '../../bridge/controller-side.js';
import { LockstepError, LockstepTransport } from '../../bridge/lockstep.js';
import { kinds } from '../../bridge/udp-layout.js';
import { Rig } from './rig.js';
import { mapOf, message, sampleMap, signal } from './sample-map.js';

/** Torque = shaft speed in 1/min / 100 minus the high pressure in bar, valve open above 10 bar; writes down what it saw. */
class Controller implements ControllerModule {
  readonly steps: { tick: number; read: number[] }[] = [];
  restarts = 0;
  step(tick: number, read: Float64Array, write: Float64Array): void {
    this.steps.push({ tick, read: [...read] });
    write[0] = read[4] / 100 - read[0];
    write[1] = read[0] > 10 ? 1 : 0;
    write[2] = tick % 7;
    write[3] = Math.max(0, tick);
  }
  restart(): void {
    this.restarts += 1;
  }
}

/** A clock that goes on by a millisecond each time somebody looks at it. */
function counting(): () => number {
  let now = 0;
  return () => (now += 1);
}

function closed(every = 1): {
  rig: Rig;
  barrier: LockstepTransport;
  controller: Controller;
  endpoint: ControllerEndpoint;
  run: (tick: number) => void;
} {
  const rig = new Rig(sampleMap());
  const controller = new Controller();
  const endpoint = new ControllerEndpoint({
    map: rig.map,
    link: 'powertrain',
    controller,
    mode: 'lockstep',
    send: (bytes, length) => rig.controller.send(bytes, length),
  });
  rig.transport.turn = () => endpoint.pump(rig.controller);
  const barrier = new LockstepTransport(rig.transport, {
    link: 'powertrain',
    mapChecksum: rig.exchange.checksum,
    every,
    now: counting(),
  });
  rig.exchange.attach('powertrain', barrier);
  const run = (tick: number): void => {
    rig.take(tick);
    rig.set('highLine.pressure', (5 + tick) * 1e5);
    rig.set('propShaft.speed', (tick * 100 * Math.PI) / 30);
    rig.publish(tick);
    barrier.end(tick);
  };
  return { rig, barrier, controller, endpoint, run };
}

describe('lockstep', () => {
  it('takes in tick k+1 exactly what the controller answers to `end k`', () => {
    const { rig, controller, run } = closed();
    for (let tick = 0; tick < 60; tick += 1) {
      run(tick);
      const speed = tick - 1 < 23 ? 0 : Math.floor((tick - 1 - 3) / 10) * 10 + 3;
      if (tick > 0)
        expect([tick, rig.command('pumpMotor.torqueRequest')]).toEqual([tick, expect.closeTo(speed - (4 + tick), 9)]);
      if (tick > 0) expect(rig.command('isolation.open')).toBe(4 + tick > 10 ? 1 : 0);
    }
    expect(controller.steps.map((one) => one.tick)).toEqual(Array.from({ length: 59 }, (_, tick) => tick));
    expect(rig.value('powertrain.oneStepShare')).toBe(1);
    expect(rig.value('requests.lost') + rig.value('gear.lost') + rig.value('powertrain.floods')).toBe(0);
    // Messages of tick 0, in map order, then done: gear is due in tick 2 first.
    const order = (tick: number): number[] =>
      rig.inputs.filter((one) => one.tick === tick).map((one) => one.bytes[5] * 100 + one.bytes[6]);
    expect(order(0)).toEqual([]);
    expect(order(1)).toEqual([100 + 32, kinds.done * 100]);
    expect(order(3)).toEqual([100 + 32, 100 + 33, kinds.done * 100]);
  });

  it('shows the controller ages in ticks and Infinity before a message came', () => {
    const { controller, run } = closed();
    for (let tick = 0; tick < 40; tick += 1) run(tick);
    const ages = controller.steps.map((one) => one.read.slice(5));
    expect(ages[0]).toEqual([0, Number.POSITIVE_INFINITY]);
    expect(ages[23]).toEqual([0, 0]);
    expect(ages[30]).toEqual([0, 7]);
  });

  it('is a barrier once per period of the controller', () => {
    const { rig, controller, run } = closed(5);
    for (let tick = 0; tick < 21; tick += 1) run(tick);
    expect(controller.steps.map((one) => one.tick)).toEqual([0, 5, 10, 15]);
    expect([...new Set(rig.inputs.map((one) => one.tick))]).toEqual([1, 6, 11, 16]);
    // A message that fell due between two barriers goes out, once, at the later one: gear is due in ticks 2 and 12.
    expect(rig.inputs.filter((one) => one.bytes[6] === 33).map((one) => one.tick)).toEqual([6, 16]);
    expect(rig.value('requests.received')).toBe(4);
  });

  it('derives the run again from the recorded inputs, without barrier and controller', () => {
    const { rig, run } = closed();
    const blocks: Float64Array[] = [];
    for (let tick = 0; tick < 50; tick += 1) {
      run(tick);
      blocks.push(rig.block.slice());
    }
    const again = new Rig(sampleMap());
    for (let tick = 0; tick < 50; tick += 1) {
      for (const one of rig.inputs) if (one.tick === tick) again.toBench.push(one.bytes, one.bytes.length);
      again.take(tick);
      again.set('highLine.pressure', (5 + tick) * 1e5);
      again.set('propShaft.speed', (tick * 100 * Math.PI) / 30);
      again.publish(tick);
      expect([tick, again.block]).toEqual([tick, blocks[tick]]);
    }
  });

  it('ends the run with an error when no answer comes, and the wait leaves no data', () => {
    const { rig, run } = closed();
    run(0);
    run(1);
    run(2);
    rig.transport.turn = () => {};
    const before = rig.inputs.length;
    const block = rig.block.slice();
    expect(() => rig.take(3)).toThrow(LockstepError);
    expect(() => rig.take(3)).toThrow('link powertrain: the controller did not answer `end 2` within 5000 ms');
    expect(rig.inputs.length).toBe(before);
    expect(rig.command('pumpMotor.torqueRequest')).toBe(block[rig.commands.get('pumpMotor.torqueRequest')!]);
  });

  it('is not satisfied by an old `done` nor by talk that goes on without one', () => {
    const { rig, run } = closed();
    run(0);
    let sequence = 0;
    rig.transport.turn = () => {
      rig.control(kinds.done, 7);
      rig.say('requests', [1, 0], (sequence += 1));
    };
    rig.take(1);
    expect(rig.value('powertrain.floods')).toBe(1);
  });

  it('drops hellos that were said before the bench was heard, since their number is chance', () => {
    const { rig, endpoint, run } = closed();
    for (let i = 0; i < 3; i += 1) endpoint.hello();
    run(0);
    run(1);
    expect(rig.value('powertrain.hellos')).toBe(0);
    endpoint.hello();
    run(2);
    expect(rig.value('powertrain.hellos')).toBe(1);
  });

  it('waits for a controller before the first tick', () => {
    const { barrier, endpoint } = closed();
    expect(() => barrier.awaitHello(20)).toThrow('no controller said hello within 20 ms');
    endpoint.hello();
    barrier.awaitHello(20);
  });
});

describe('controller endpoint, live', () => {
  const map = mapOf(
    message('fast', 1, 'sent', [signal('a', 'x.a')]),
    message('slow', 2, 'sent', [signal('b', 'x.b')], { every: 10 }),
    message('alsoFast', 3, 'sent', [signal('c', 'x.c')]),
    message('answer', 4, 'received', [signal('y', 'x.y', { substitute: 5 })]),
    message('rarely', 5, 'received', [signal('z', 'x.z')], { every: 10, phase: 4 }),
  );
  const live = (): { rig: Rig; endpoint: ControllerEndpoint; controller: Controller } => {
    const rig = new Rig(map);
    const controller = new Controller();
    controller.step = (tick, read, write) => {
      controller.steps.push({ tick, read: [...read] });
      write[0] = read[0] + read[2];
    };
    const endpoint = new ControllerEndpoint({
      map,
      link: 'powertrain',
      controller,
      mode: 'live',
      send: (bytes, length) => rig.controller.send(bytes, length),
    });
    return { rig, endpoint, controller };
  };

  it('answers the last message of the shortest cycle at once, once a tick', () => {
    const { rig, endpoint, controller } = live();
    for (let tick = 0; tick < 25; tick += 1) {
      rig.take(tick);
      if (tick > 0) expect(rig.command('x.y')).toBe(3 * (tick - 1));
      rig.set('x.a', tick);
      rig.set('x.c', 2 * tick);
      rig.publish(tick);
      endpoint.pump(rig.controller);
    }
    expect(controller.steps.map((one) => one.tick)).toEqual(Array.from({ length: 25 }, (_, tick) => tick));
    expect(rig.value('powertrain.oneStepShare')).toBe(1);
    expect(rig.value('rarely.received')).toBe(2);
  });

  it('goes on by its own clock when the bench falls silent, and begins anew when the bench does', () => {
    const { rig, endpoint, controller } = live();
    for (let tick = 0; tick < 6; tick += 1) {
      rig.publish(tick);
      endpoint.pump(rig.controller);
    }
    for (let i = 0; i < 3; i += 1) endpoint.elapse(10);
    expect(controller.steps.slice(-3).map((one) => [one.tick, ...one.read.slice(3)])).toEqual([
      [15, 10, 15, 10],
      [25, 20, 25, 20],
      [35, 30, 35, 30],
    ]);
    rig.take(6);
    expect(rig.value('rarely.received')).toBe(4);
    expect(rig.value('answer.received')).toBe(9);
    expect(controller.restarts).toBe(1);
    const fresh = new Rig(map);
    fresh.publish(0);
    endpoint.pump(fresh.controller);
    expect(controller.restarts).toBe(2);
    expect(controller.steps.at(-1)).toEqual({ tick: 0, read: [0, 0, 0, 0, 0, 0] });
  });

  it('names what the bench does not send', () => {
    const { endpoint } = live();
    expect(endpoint.mirror.readIndex('slow.b')).toBe(1);
    expect(endpoint.mirror.readIndex('alsoFast.age')).toBe(5);
    expect(endpoint.mirror.writeIndex('rarely.z')).toBe(1);
    expect(() => endpoint.mirror.readIndex('slow.bb')).toThrow('the bench sends no slow.bb; near: slow.b');
  });
});
