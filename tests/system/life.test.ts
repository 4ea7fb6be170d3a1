import { describe, expect, it } from 'vitest';
import type { ControllerMirror, ControllerModule } from '../../bridge/controller-side.js';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { readScenario } from '../../configs/scenario.js';
import { attachModule } from '../../tools/loop/attach-links.js';
import { createLoopControl, runLoop } from '../../tools/loop/engine.js';

/** A wheel that a controller drives: what it sees in pre-roll, run and after-run, and what becomes of what it says. */
const bench = (life: string, link = '{ is: udp, local: 127.0.0.1:1, remote: 127.0.0.1:2 }', id = '1', other = '2') => `
bench: wheel
step: 1 ms
stores: { wheel: { is: inertia, inertia: 1 kg m2, viscousFriction: 0.1 N m s } }
branches: { drive: { is: torque-source, shaft: wheel } }
links: { wire: ${link} }
messages:
  status:
    direction: sent
    id: ${id}
    every: 5 ms
    bytes: 8
    signals:
      speed: { from: wheel.speed, unit: rad/s, range: -100 .. 100, can: { start: 0, length: 16, signed: on, scale: 0.01 } }
      key: { from: life.key, unit: '1', range: 0 .. 1, can: { start: 16, length: 1 } }
      clear: { from: life.clear, unit: '1', range: 0 .. 1, can: { start: 17, length: 1 } }
  request:
    direction: received
    id: ${other}
    every: 5 ms
    timeout: 20 ms
    bytes: 8
    signals:
      torque: { to: drive.torque, unit: N m, range: -50 .. 50, substitute: 0, can: { start: 0, length: 16, signed: on, scale: 0.01 } }
life: ${life}
controller: { module: controller.js, period: 5 ms }
requirements: { T-1: always abs(drive.torque) < 20 N m }
`;

interface Seen {
  readonly tick: number;
  readonly age: number;
  readonly key: number;
  readonly clear: number;
}

/** Asks for 10 N m with the key on and notes what it sees. */
function run(text: string, steps = '[]', ticks = 200, afterRun?: number) {
  const spec = readBench('bench.yaml', catalogue, memoryFiles({ 'bench.yaml': text }));
  const scenario = `scenario: stand\nlasts: ${ticks} ms\nsteps: ${steps}\n`;
  const { script } = readScenario('s.yaml', spec, memoryFiles({ 's.yaml': scenario }));
  const assembly = assemble(spec, { seed: 1, script });
  const seen: Seen[] = [];
  const restarts: number[] = [];
  let now = Number.NEGATIVE_INFINITY;
  const createController = (mirror: ControllerMirror): ControllerModule => {
    const at = (path: string) => mirror.readIndex(`status.${path}`);
    const [age, key, clear] = [at('age'), at('key'), at('clear')];
    const torque = mirror.writeIndex('request.torque');
    return {
      step(tick, read, write) {
        now = tick;
        seen.push({ tick, age: read[age]!, key: read[key]!, clear: read[clear]! });
        write[torque] = read[key]! > 0.5 ? 10 : 0;
      },
      restart: () => void restarts.push(now),
    };
  };
  const barrier = attachModule(spec, assembly.exchange, { createController }, 5);
  const inputs: { tick: number; link: number }[] = [];
  const hashes = new Map<number, string>();
  const torques = new Map<number, number>();
  const torque = assembly.table.find('drive.torque');
  assembly.tick.journal = {
    row: (tick, signals, hash) => {
      hashes.set(tick, hash.join());
      torques.set(tick, signals[torque]!);
    },
    input: (tick, link) => void inputs.push({ tick, link }),
    event() {},
    snapshot() {},
  };
  const counted: number[] = [];
  const end = runLoop({
    assembly,
    ticks: script.ticks,
    shared: createLoopControl(),
    barriers: [barrier],
    peaks: new Int32Array(0),
    onCount: (count) => void counted.push(count),
    afterRun: afterRun ?? spec.life.afterRun,
  });
  const results = assembly.judge.results(end.ticks, assembly.block);
  return { spec, assembly, seen, restarts, end, inputs, hashes, torques, counted, results };
}

describe('the life of a bench', () => {
  it('shows the controller the standing plant in the pre-roll, or nothing', () => {
    const plant = run(bench('{ preRoll: 100 ms }'));
    const silent = run(bench('{ preRoll: 100 ms, frames: { preRoll: silence } }'));
    const firstHeard = (seen: readonly Seen[]) => seen.find((one) => Number.isFinite(one.age))!.tick;
    expect(firstHeard(plant.seen)).toBeLessThan(-90);
    expect(firstHeard(silent.seen)).toBe(0);
    // told once that the bench starts, and not before the silence is over
    expect(plant.restarts).toHaveLength(1);
    expect(silent.restarts).toHaveLength(1);
  });

  it('goes on behind the end with the key off, plant and messages alive; nothing of it counts', () => {
    const { end, seen, counted, hashes, torques, inputs, results } = run(
      bench('{ afterRun: 100 ms, frames: { afterRun: plant } }'),
    );
    expect([end.ticks, counted]).toEqual([200, [0, 200]]);
    expect(Math.max(...hashes.keys())).toBe(299);
    // journaled as an input behind those of link and hands, ahead of the first tick of it
    expect(inputs).toContainEqual({ tick: 200, link: 2 });
    expect(seen.filter((one) => one.tick < 200).every((one) => one.key === 1 || one.tick < -190)).toBe(true);
    expect(seen.filter((one) => one.tick > 206).every((one) => one.key === 0 && one.age <= 5)).toBe(true);
    expect([torques.get(199), torques.get(299)]).toEqual([10, 0]);
    expect(results.map((one) => one.verdict)).toEqual(['pass']);
  });

  it('falls silent behind the end unless it is told otherwise', () => {
    const { seen } = run(bench('{ afterRun: 100 ms }'));
    expect(seen.at(-1)!.tick).toBe(295);
    expect(seen.at(-1)!.age).toBeGreaterThan(90);
  });

  it('breaks nothing of the run: the same state at its end with and without an after-run', () => {
    const life = '{ afterRun: 100 ms }';
    const without = run(bench(life), '[]', 200, 0);
    expect(without.hashes.size).toBe(200 + 200);
    expect(run(bench(life)).hashes.get(199)).toBe(without.hashes.get(199));
  });

  it('resets the controller: supply off and on, and a request to clear what it has learnt', () => {
    const { seen, restarts, torques } = run(
      bench(`
  preRoll: 200 ms
  afterRun: 100 ms
  frames: { afterRun: plant }
  reset:
    before:
      - { at: 0 s, set: life.supply, to: off }
      - { at: 50 ms, set: life.supply, to: on }
      - { at: 100 ms, set: life.clear, to: on }
      - { at: 120 ms, set: life.clear, to: off }
    after: [{ at: 50 ms, set: life.clear, to: on }]`),
    );
    // at its start, and when its supply has come
    expect(restarts.length).toBe(2);
    const cleared = seen.filter((one) => one.clear === 1).map((one) => one.tick);
    expect(cleared.filter((tick) => tick < 200)).toEqual([-100, -95, -90, -85]);
    expect(cleared.filter((tick) => tick > 200)).toEqual([250, 255, 260, 265, 270, 275, 280, 285, 290, 295]);
    expect(torques.get(-160)).toBe(0);
    expect(torques.get(-120)).toBe(10);
  });
});

const udp = bench('{ bootWindow: 0 s }');
const can = bench('{ bootWindow: 0 s }', '{ is: can, interface: can9 }', '0x10', '0x11');
describe.each([
  ['UDP', udp],
  ['CAN', can],
])('the controller as a whole, over %s', (_kind, text) => {
  it('falls silent to its substitutes and comes back as it was', () => {
    const { torques, restarts } = run(
      text,
      '[{ at: 50 ms, fault: controller.silent }, { at: 100 ms, clear: controller.silent }]',
    );
    expect([torques.get(49), torques.get(60), torques.get(90), torques.get(120)]).toEqual([10, 10, 0, 10]);
    expect(restarts).toHaveLength(1);
  });

  it('restarts: silent meanwhile, told afterwards that it starts anew', () => {
    const { torques, restarts } = run(
      text,
      '[{ at: 50 ms, fault: controller.restarting }, { at: 100 ms, clear: controller.restarting }]',
    );
    // what it sent before it was told is not taken for its first word
    expect([torques.get(90), torques.get(104), torques.get(108), torques.get(130)]).toEqual([0, 0, 0, 10]);
    expect(restarts).toHaveLength(2);
    expect(restarts[1]!).toBeGreaterThanOrEqual(95);
    expect(restarts[1]!).toBeLessThanOrEqual(105);
  });

  it('loses its supply the same way', () => {
    const { torques, restarts } = run(
      text,
      '[{ at: 50 ms, set: life.supply, to: off }, { at: 100 ms, set: life.supply, to: on }]',
    );
    expect([torques.get(90), torques.get(130)]).toEqual([0, 10]);
    expect(restarts).toHaveLength(2);
  });

  it('freezes: its messages come on time with old values', () => {
    const { torques } = run(
      text,
      '[{ at: 50 ms, fault: controller.frozen }, { at: 60 ms, set: life.key, to: off }, { at: 120 ms, clear: controller.frozen }]',
    );
    expect([torques.get(110), torques.get(150)]).toEqual([10, 0]);
  });
});
