import { describe, expect, it } from 'vitest';
import { branch, store } from '../../../plants/define.js';
import { BuildError } from '../../../runtime/contract.js';
import { Plant } from '../../../runtime/plant.js';
import {
  circuitOf,
  command,
  energyNow,
  energyResidual,
  expectSameBits,
  jacobianError,
  plantOf,
  reading,
  stateOf,
  worstImbalance,
} from '../../plants/circuit-checks.js';

const laws = {
  soft: function soft(x: number, width: number): number {
    const scaled = x / width;
    return width * (scaled > 0 ? scaled + Math.log(1 + Math.exp(-scaled)) : Math.log(1 + Math.exp(scaled)));
  },
  cubeRoot: function cubeRoot(x: number): number {
    const a = x > 1 ? 0.6 * x : 1;
    const b = a - (a * a * a - x) / (3 * a * a);
    const c = b - (b * b * b - x) / (3 * b * b);
    const d = c - (c * c * c - x) / (3 * c * c);
    const e = d - (d * d * d - x) / (3 * d * d);
    return e - (e * e * e - x) / (3 * e * e);
  },
  cubeRootSlopes: { x: (_x: number, value: number) => 1 / (3 * value * value) },
  HALF: 0.5,
};

const mass = store({
  kind: 'mass',
  about: 'a body',
  source: 'Newton',
  ports: { shaft: 'shaft' },
  states: { spin: { unit: 'rad/s', about: 'speed', initial: 1 } },
  readings: { rate: { unit: 'rad/s', about: 'speed' } },
  parameters: { inertia: { unit: 'kg m2', about: 'inertia', default: 2 } },
  laws,
  efforts({ shaft, state, reading }) {
    shaft.speed = state.spin;
    reading.rate = state.spin;
  },
  derivatives({ shaft, derivative, parameter }) {
    derivative.spin = shaft.torque / parameter.inertia;
  },
  energy({ parameter, state, law }) {
    return law.HALF * parameter.inertia * state.spin * state.spin;
  },
});

const coupling = branch({
  kind: 'coupling',
  about: 'a spring and damper',
  source: 'Hooke',
  ports: { from: 'shaft', to: 'shaft' },
  states: { twist: { unit: 'rad', about: 'twist', initial: 0.1 } },
  memory: { worst: { unit: 'rad', about: 'largest twist so far' } },
  commands: { slack: { unit: '1', about: 'scales the stiffness', rest: 1 } },
  readings: { torque: { unit: 'N m', about: 'torque' }, root: { unit: '1', about: 'a law with its own slope' } },
  parameters: {
    stiffness: { unit: 'N m/rad', about: 'stiffness', default: 900 },
    damping: { unit: 'N m s/rad', about: 'damping', default: 3 },
  },
  laws,
  flows({ from, to, state, derivative, parameter, command, reading, law }) {
    const slip = from.speed - to.speed;
    const torque = parameter.stiffness * command.slack * state.twist + parameter.damping * slip;
    derivative.twist = slip;
    from.torque -= torque;
    to.torque += torque;
    reading.torque = torque;
    reading.root = law.cubeRoot(law.soft(torque, 5) + 2);
  },
  update({ memory, state }) {
    memory.worst = Math.max(memory.worst, Math.abs(state.twist));
  },
  energy({ parameter, state, command }) {
    return 0.5 * parameter.stiffness * command.slack * state.twist * state.twist;
  },
  loss({ from, to, parameter }) {
    return parameter.damping * (from.speed - to.speed) * (from.speed - to.speed);
  },
  heat: 'leaves',
});

describe('buildCircuit', () => {
  const make = () =>
    plantOf(
      circuitOf({
        a: { kind: mass },
        b: { kind: mass, parameters: { inertia: 0.5 }, start: { spin: -2 } },
        c: { kind: coupling, ports: { from: 'a', to: ['b', 3] } },
      }),
    );

  it('gives the same bits fused and unfused, an exact Jacobian and a balance that closes pointwise', () => {
    const plant = make();
    command(plant, 'c.slack', 1.7);
    for (let i = 0; i < 50; i += 1) {
      plant.step();
      expectSameBits(plant);
      expect(jacobianError(plant).error).toBeLessThan(1e-6);
      expect(worstImbalance(plant).relative).toBeLessThan(1e-12);
    }
    expect(reading(plant, 'c.torque')).not.toBe(0);
  });

  // the ledger's trapezoid spans a stride: it is coarser than over substeps
  it.each([
    [1, 1e-4],
    [4, 5e-4],
  ])(
    'conserves angular momentum of the geared pair and closes the energy ledger, strides up to %d',
    (longest, share) => {
      const { circuit } = make();
      const plant = Plant.alone(circuit, { step: 1e-3, substeps: 4, longest });
      const start = energyNow(plant);
      const momentum = () => 3 * 2 * stateOf(plant, 'a.spin') + 0.5 * stateOf(plant, 'b.spin');
      const before = momentum();
      for (let i = 0; i < 2000; i += 1) plant.step();
      expect(Math.abs(momentum() - before)).toBeLessThan(1e-11);
      expect(Math.abs(energyResidual(plant, start))).toBeLessThan(share * start);
      expect(plant.ledger[1]).toBeGreaterThan(0.1);
    },
  );

  it('alarms in the balance when a torque is false by 1 %', () => {
    const wrong = branch({
      ...(coupling as object),
      kind: 'false',
      ports: { from: 'shaft', to: 'shaft' },
      flows({ from, to }: any) {
        const torque = 5 * (from.speed - to.speed);
        from.torque -= torque;
        to.torque += 1.01 * torque;
      },
      states: {},
      memory: {},
      commands: {},
      readings: {},
      update: undefined,
      energy: undefined,
      loss: ({ from, to }: any) => 5 * (from.speed - to.speed) * (from.speed - to.speed),
    } as never);
    const plant = plantOf(
      circuitOf({
        a: { kind: mass },
        b: { kind: mass, start: { spin: -2 } },
        c: { kind: wrong, parameters: {}, ports: { from: 'a', to: 'b' } },
      }),
    );
    expect(worstImbalance(plant).relative).toBeGreaterThan(1e-3);
    expect(worstImbalance(plant).element).toContain('c:');
  });

  const broken: [string, object, RegExp][] = [
    [
      'if',
      {
        flows({ from }: any) {
          if (from.speed > 0) from.torque += 1;
        },
      },
      /IfStatement is not in the subset in line \d+ .*const/,
    ],
    [
      'let',
      {
        flows({ from }: any) {
          let x = 1;
          x += 1;
          from.torque += x;
        },
      },
      /`let` is not in the subset/,
    ],
    [
      'power',
      {
        flows({ from }: any) {
          from.torque += from.speed ** 2;
        },
      },
      /operator \*\* is not in the subset/,
    ],
    [
      'unknown member',
      {
        flows({ from }: any) {
          from.torque += from.velocity;
        },
      },
      /`velocity` is not there to read in line \d+ of the function, `from.velocity`, there are: speed/,
    ],
    [
      'unknown law',
      {
        flows({ from, law }: any) {
          from.torque += law.missing(1);
        },
      },
      /no law `missing`/,
    ],
    [
      'setting a flow',
      {
        flows({ from }: any) {
          from.torque = 1;
        },
      },
      /`torque` cannot be written here with =/,
    ],
    [
      'outer name',
      {
        flows({ from }: any) {
          from.torque += outside;
        },
      },
      /unknown name `outside`/,
    ],
    [
      'random',
      {
        flows({ from }: any) {
          from.torque += Math.random();
        },
      },
      /Math.random is not in the subset/,
    ],
  ];
  const outside = 3;
  for (const [name, functions, expected] of broken) {
    it(`refuses ${name} and says where`, () => {
      const kind = branch({ kind: 'odd', about: '', source: '', ports: { from: 'shaft' }, ...functions } as never);
      try {
        circuitOf({ a: { kind: mass }, odd: { kind, ports: { from: 'a' } } });
        expect.fail('built');
      } catch (error) {
        expect(error).toBeInstanceOf(BuildError);
        expect((error as Error).message).toMatch(expected);
        expect((error as Error).message).toContain('odd (odd).flows');
      }
    });
  }
  it('finds all wiring faults at once', () => {
    expect(() => circuitOf({ a: { kind: mass }, c: { kind: coupling, ports: { from: 'nowhere' } } })).toThrow(
      /c.from: no store `nowhere`.*\n.*c.to: port is not connected/,
    );
  });
});
