import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import type { ElementFunction, ElementInstance, ElementKind } from '../../runtime/contract.js';
import { Bench, element } from '../support/circuit.js';

/**
 * The ledger must mean something: a torque or force that is 1 % wrong at one port of an element, with its loss law as
 * it is, shows as a residual of that element and of the run.
 */
function falsified(kind: ElementKind, right: string, wrong: string): ElementKind {
  const source = kind.flows!.toString();
  if (source.split(right).length !== 2) throw new Error(`${kind.kind} does not say \`${right}\` once`);
  const { flows } = new Function(`return { ${source.replace(right, wrong)} }`)() as { flows: ElementFunction };
  return { ...kind, flows };
}

function driveline(change: (name: string, kind: ElementKind) => ElementKind): ElementInstance[] {
  const of = (name: string, kind: ElementKind, given: Parameters<typeof element>[2]) =>
    element(name, change(name, kind), given);
  return [
    of('body', library.vehicle, { parameters: { mass: 7500, rollingResistance: 0.008 }, start: { velocity: 8 } }),
    of('crank', library.inertia, { parameters: { inertia: 0.9 }, start: { speed: 150 } }),
    of('input', library.inertia, { parameters: { inertia: 0.1 }, start: { speed: 143.5 } }),
    of('output', library.inertia, { parameters: { inertia: 0.2 }, start: { speed: 68.33 } }),
    of('wheels', library.axle, { parameters: { ratio: 4.1, inertia: 24 }, start: { speed: 16.667 } }),
    of('engine', library.combustionEngine, {
      parameters: { sweptVolume: 0.0046 },
      start: { running: 1 },
      to: { shaft: 'crank.shaft' },
    }),
    of('clutch', library.clutch, {
      parameters: { maximumTorque: 900 },
      start: { application: 0.3 },
      to: { a: 'crank.shaft', b: 'input.shaft' },
    }),
    of('gearbox', library.steppedGearbox, {
      parameters: { ratio1: 6.2, ratio2: 3.6, ratio3: 2.1 },
      start: { gear: 3 },
      to: { input: 'input.shaft', output: 'output.shaft' },
    }),
    of('shaft', library.compliantShaft, {
      parameters: { stiffness: 3000 },
      to: { a: 'output.shaft', b: 'wheels.input' },
    }),
    of('tyres', library.tyre, {
      parameters: { radius: 0.48, loadShare: 1 },
      to: { wheel: 'wheels.wheels', road: 'body.road' },
    }),
    of('brake', library.serviceBrake, { parameters: { maximumTorque: 16000 }, to: { shaft: 'wheels.wheels' } }),
  ];
}

/** Worst residual on the way (wrongs of driving and of braking cancel in the end) over the energy turned over, and the worst imbalance of each element over the sum of its terms. */
function audited(change: (name: string, kind: ElementKind) => ElementKind) {
  const bench = new Bench(driveline(change));
  const { circuit, plant } = bench;
  const count = circuit.spec.elements.length;
  const out = new Float64Array(2 * count);
  const worst = new Map<string, number>();
  let residual = 0;
  bench.set('engine.ignition', 1);
  bench.set('gearbox.gearRequest', 3);
  bench.run(3, (time) => {
    bench.set('engine.torqueRequest', time < 2 ? 400 : 0);
    bench.set('clutch.engagement', time < 2 ? Math.min(1, 0.3 + time) : 0.2);
    bench.set('brake.demand', time < 2 ? 0 : 0.4);
    residual = Math.max(residual, Math.abs(bench.energyResidual()));
    circuit.functions.audit(plant.y, plant.u, plant.m, out);
    circuit.spec.elements.forEach(({ name }, i) => {
      if (out[count + i]! > 100) worst.set(name, Math.max(worst.get(name) ?? 0, Math.abs(out[i]!) / out[count + i]!));
    });
  });
  return { residual: residual / (plant.ledger[0]! + plant.ledger[1]!), worst };
}

describe('a falsified torque', () => {
  it('is not there: every element balances and the ledger closes', () => {
    const { residual, worst } = audited((_, kind) => kind);
    for (const [name, share] of worst) expect(share, name).toBeLessThan(1e-9);
    expect(residual).toBeLessThan(1e-5);
  });

  it.each([
    ['engine', 'shaft.torque += torque', 'shaft.torque += 1.01 * torque'],
    ['clutch', 'b.torque += torque', 'b.torque += 1.01 * torque'],
    ['gearbox', 'output.torque += memory.ratio * torque', 'output.torque += 1.01 * memory.ratio * torque'],
    ['shaft', 'a.torque -= torque', 'a.torque -= 1.01 * torque'],
    ['tyres', 'road.force += force', 'road.force += 1.01 * force'],
    ['brake', 'shaft.torque -= torque', 'shaft.torque -= 1.01 * torque'],
  ])('of %s shows', (name, right, wrong) => {
    const { residual, worst } = audited((which, kind) => (which === name ? falsified(kind, right, wrong) : kind));
    expect(worst.get(name)).toBeGreaterThan(2e-3);
    for (const [other, share] of worst) if (other !== name) expect(share, other).toBeLessThan(1e-9);
    expect(residual).toBeGreaterThan(1e-4);
  });
});
