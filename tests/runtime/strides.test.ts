import { describe, expect, it } from 'vitest';
import { store } from '../../plants/define.js';
import { buildCircuit, type Circuit } from '../../runtime/circuit/build.js';
import { Plant } from '../../runtime/plant.js';

/** A swing that a brake catches once it has passed a mark; `gradual`: the brake is not declared as the latch it is. */
function swing(scale: number, gradual = false): Circuit {
  const kind = store({
    kind: 'swing',
    about: 'a test circuit',
    source: 'test',
    ports: {},
    states: {
      place: { unit: 'm', about: 'place', initial: 1, scale },
      speed: { unit: 'm/s', about: 'speed', initial: 0, scale },
    },
    memory: {
      caught: { unit: '1', about: '1 once the mark is passed', gradual },
      time: { unit: 's', about: 'time so far', gradual: true },
    },
    readings: {},
    parameters: {},
    heat: 'leaves',
    update({ state, memory, step }) {
      memory.caught = memory.caught > 0.5 || state.place < 0.51 ? 1 : 0;
      memory.time = memory.time + step;
    },
    efforts() {},
    derivatives({ state, memory, derivative }) {
      derivative.place = state.speed;
      derivative.speed = -400 * state.place - (1 + 300 * memory.caught) * state.speed;
    },
    loss({ state, memory }) {
      return (1 + 300 * memory.caught) * state.speed * state.speed;
    },
  });
  return buildCircuit({
    name: 'swing',
    portKinds: {},
    elements: [{ name: 'swing', kind, parameters: {}, connections: {}, start: {} }],
  });
}

interface Trace {
  readonly states: number[][];
  readonly memory: number[][];
  readonly ledger: Float64Array;
  readonly evaluations: number;
}

function trace(circuit: Circuit, longest: number, steps = 200): Trace {
  const plant = Plant.alone(circuit, { step: 1e-3, substeps: 4, longest });
  const step = circuit.step as { ratesAndJacobian(): void };
  const evaluate = step.ratesAndJacobian;
  let evaluations = 0;
  step.ratesAndJacobian = () => {
    evaluations += 1;
    evaluate();
  };
  const states: number[][] = [];
  const memory: number[][] = [];
  for (let i = 0; i < steps; i += 1) {
    plant.step();
    states.push([...plant.y]);
    memory.push([...plant.m]);
  }
  step.ratesAndJacobian = evaluate;
  return { states, memory, ledger: plant.ledger.slice(), evaluations };
}

const furthest = (a: Trace, b: Trace) =>
  Math.max(...a.states.map((one, i) => Math.max(...one.map((value, k) => Math.abs(value - b.states[i]![k]!)))));

describe('strides', () => {
  it('pass most steps in one and stay as near as each stride may err', () => {
    const circuit = swing(10);
    const [long, short] = [trace(circuit, 4), trace(circuit, 1)];
    expect(short.evaluations).toBe(800);
    expect(long.evaluations).toBeLessThan(300);
    expect(furthest(long, short)).toBeGreaterThan(1e-9);
    expect(furthest(long, short)).toBeLessThan(1e-3);
    expect(Math.abs(long.ledger[1]! / short.ledger[1]! - 1)).toBeLessThan(5e-3);
  });

  it('end where a latch changes: it changes in the same substep as without strides', () => {
    const circuit = swing(10);
    const [long, short] = [trace(circuit, 4), trace(circuit, 1)];
    const caught = (one: Trace) => one.memory.map(([latch]) => latch);
    expect(caught(long)).toEqual(caught(short));
    expect(caught(long)).toContain(0);
    expect(caught(long)).toContain(1);
    // and without that care it errs by what the brake does within a step
    const careless = trace(swing(10, true), 4);
    expect(furthest(careless, short)).toBeGreaterThan(20 * furthest(long, short));
  });

  it('count the same time for memory, whatever the strides', () => {
    const circuit = swing(10);
    for (const longest of [1, 2, 3, 4])
      for (const [i, [, time]] of trace(circuit, longest, 50).memory.entries())
        expect(time).toBeCloseTo((i + 1) * 1e-3, 12);
  });

  it('leave nothing behind where they are taken back: the same bits as without', () => {
    // nothing is ever accurate enough at this scale
    const circuit = swing(1e-12);
    const [long, short] = [trace(circuit, 4), trace(circuit, 1)];
    expect(long.evaluations).toBeGreaterThan(short.evaluations);
    expect(long.states).toEqual(short.states);
    expect(long.memory).toEqual(short.memory);
    expect(long.ledger).toEqual(short.ledger);
  });

  it('cost two attempts more than the substeps at worst', () => {
    expect(trace(swing(1e-12), 4, 100).evaluations).toBeLessThanOrEqual(600);
  });
});
