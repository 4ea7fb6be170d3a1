import { describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { unfuse } from '../../runtime/circuit/unfused.js';
import type { ElementInstance } from '../../runtime/contract.js';
import { Bench, element } from '../support/circuit.js';

/** Every mechanical element on a small circuit of its own. */
const circuits: Record<string, () => ElementInstance[]> = {
  'inertia, shaft-drag, torque-source': () => [
    element('rotor', library.inertia, { parameters: { inertia: 0.5, viscousFriction: 0.02 }, start: { speed: 80 } }),
    element('drag', library.shaftDrag, {
      parameters: { constantDrag: 2, linearDrag: 0.01, quadraticDrag: 1e-4 },
      to: { shaft: 'rotor.shaft' },
    }),
    element('source', library.torqueSource, { parameters: { constantTorque: 30 }, to: { shaft: 'rotor.shaft' } }),
  ],
  'compliant-shaft with backlash, speed-source': () => [
    element('drive', library.speedSource, { parameters: { constantSpeed: 20 } }),
    element('rotor', library.inertia, { parameters: { inertia: 2 }, start: { speed: 18 } }),
    element('shaft', library.compliantShaft, {
      parameters: { backlash: 0.05, stiffness: 5000 },
      start: { twist: 0.01 },
      to: { a: ['drive.shaft', 0.5], b: 'rotor.shaft' },
    }),
  ],
  'planetary-joint': () => [
    element('planetary', library.planetaryJoint, {
      parameters: { ratio: 2.6, sunInertia: 0.02, ringInertia: 0.15, carrierInertia: 0.3, meshFriction: 1.5 },
      start: { carrierSpeed: 60, ringSpeed: 40 },
    }),
    ...(['sun', 'ring', 'carrier'] as const).map((port) =>
      element(`${port}Source`, library.torqueSource, { to: { shaft: `planetary.${port}` } }),
    ),
  ],
  'axle, differential': () => [
    element('axle', library.axle, { parameters: { ratio: 4.1, inertia: 20, dragTorque: 15 }, start: { speed: 10 } }),
    element('differential', library.differential, {
      parameters: { ratio: 3.9, wheelInertia: 10, inputInertia: 0.1, lockingFriction: 2, wheelFriction: 0.5 },
      start: { speed: 10 },
    }),
    element('tie', library.compliantShaft, {
      parameters: { stiffness: 8000, damping: 40 },
      to: { a: 'axle.input', b: 'differential.input' },
    }),
    element('left', library.torqueSource, { parameters: { constantTorque: 300 }, to: { shaft: 'differential.left' } }),
    element('right', library.torqueSource, {
      parameters: { constantTorque: -500 },
      to: { shaft: 'differential.right' },
    }),
    element('wheel', library.torqueSource, { parameters: { constantTorque: 400 }, to: { shaft: 'axle.wheels' } }),
  ],
  'clutch, service-brake': () => [
    element('a', library.inertia, { parameters: { inertia: 0.8 }, start: { speed: 150 } }),
    element('b', library.inertia, { parameters: { inertia: 2 }, start: { speed: 20 } }),
    element('clutch', library.clutch, {
      parameters: { maximumTorque: 900, staticFactor: 1.15 },
      to: { a: 'a.shaft', b: ['b.shaft', 1.7] },
    }),
    element('brake', library.serviceBrake, { parameters: { maximumTorque: 800 }, to: { shaft: 'b.shaft' } }),
  ],
  'stepped-gearbox, combustion-engine': () => [
    element('crank', library.inertia, { parameters: { inertia: 0.9 }, start: { speed: 80 } }),
    element('engine', library.combustionEngine, {
      parameters: { sweptVolume: 0.0046, dragRise: 300 },
      start: { running: 1 },
      to: { shaft: 'crank.shaft' },
    }),
    element('output', library.inertia, { parameters: { inertia: 30 }, start: { speed: 12 } }),
    element('gearbox', library.steppedGearbox, {
      parameters: { ratio1: 6, ratio2: 3.2, ratio3: 1.8, reverseRatio: 5.5 },
      start: { gear: 1 },
      to: { input: 'crank.shaft', output: 'output.shaft' },
    }),
  ],
  'starter-motor, accessory, torque-converter, retarder, park-brake': () => [
    element('crank', library.inertia, { parameters: { inertia: 0.4 } }),
    element('turbine', library.inertia, { parameters: { inertia: 0.6 }, start: { speed: 5 } }),
    element('starter', library.starterMotor, {
      parameters: { stallTorque: 300, freeSpeed: 45 },
      to: { shaft: 'crank.shaft' },
    }),
    element('pusher', library.torqueSource, { to: { shaft: 'crank.shaft' } }),
    element('alternator', library.accessory, {
      parameters: { constantPower: 900, leastSpeed: 30 },
      to: { shaft: ['crank.shaft', 2.5] },
    }),
    element('converter', library.torqueConverter, {
      parameters: { capacity: 6e-3 },
      to: { pump: 'crank.shaft', turbine: 'turbine.shaft' },
    }),
    element('retarder', library.retarder, {
      parameters: { maximumTorque: 500, maximumPower: 2e4 },
      to: { shaft: 'turbine.shaft' },
    }),
    element('park', library.parkBrake, { parameters: { maximumTorque: 900 }, to: { shaft: 'turbine.shaft' } }),
  ],
  'vehicle, tyre, force-source': () => [
    element('body', library.vehicle, {
      parameters: {
        mass: 7500,
        rollingResistance: 0.008,
        dragArea: 4.5,
        constantLoad: 50,
        linearLoad: 2,
        quadraticLoad: 0.1,
        heightOfCentre: 1.2,
      },
      start: { velocity: 5 },
    }),
    element('wheels', library.axle, { parameters: { inertia: 25 }, start: { speed: 10 } }),
    element('rear', library.tyre, {
      parameters: { radius: 0.48, loadShare: 0.6, axlePosition: 1 },
      to: { wheel: 'wheels.wheels', road: 'body.road' },
    }),
    element('tow', library.forceSource, { parameters: { constantForce: 500 }, to: { road: 'body.road' } }),
    element('drive', library.torqueSource, { parameters: { constantTorque: 1500 }, to: { shaft: 'wheels.input' } }),
  ],
  'tyre by the friction model, velocity-source': () => [
    element('belt', library.velocitySource, { parameters: { constantVelocity: 15, weight: 20000 } }),
    element('wheel', library.inertia, { parameters: { inertia: 10 }, start: { speed: 32 } }),
    element('tyre', library.tyre, {
      parameters: { radius: 0.48, loadShare: 1, model: 1, peakFriction: 0.8 },
      to: { wheel: 'wheel.shaft', road: 'belt.road' },
    }),
  ],
};

/** Commands that make each circuit work hard, as a function of time. */
const drive: Record<string, (bench: Bench, time: number) => void> = {
  'planetary-joint': (bench, time) => {
    bench.set('sunSource.torque', 80 * Math.sin(20 * time));
    bench.set('ringSource.torque', time < 0.4 ? 200 : -200);
    bench.set('carrierSource.torque', -150);
  },
  'clutch, service-brake': (bench, time) => {
    bench.set('clutch.engagement', time < 0.1 ? 0 : time < 0.7 ? 0.9 : 0.1);
    bench.set('brake.demand', time > 0.5 ? 0.8 : 0);
  },
  'stepped-gearbox, combustion-engine': (bench, time) => {
    bench.set('engine.ignition', 1);
    bench.set('engine.torqueRequest', time < 0.3 ? 300 : time < 0.6 ? -200 : 100);
    bench.set('gearbox.gearRequest', time < 0.3 ? 1 : 2);
  },
  'starter-motor, accessory, torque-converter, retarder, park-brake': (bench, time) => {
    bench.set('starter.engage', time < 0.3 ? 1 : 0);
    bench.set('pusher.torque', time < 0.2 ? 0 : time < 0.7 ? 250 : -200);
    bench.set('alternator.powerRequest', time > 0.4 ? 1500 : 0);
    bench.set('retarder.demand', time > 0.6 ? 0.8 : 0);
    bench.set('park.release', time < 0.9 ? 1 : 0);
  },
  'vehicle, tyre, force-source': (bench, time) => {
    bench.set('body.grade', 0.06);
    bench.set('body.headwind', 4);
    bench.set('body.payload', time > 0.3 ? 1500 : 0);
    bench.set('rear.surfaceFriction', time > 0.5 ? 0.2 : 1);
  },
};

/** Reproducible numbers in -1 .. 1 (a linear congruence, Lehmer 1951). */
function lehmer(seed: number): () => number {
  let x = seed;
  return () => {
    x = (x * 48271) % 2147483647;
    return (2 * x) / 2147483647 - 1;
  };
}

/** Commands, states and memory near those of a driven run. */
function* samples(name: string): Generator<{ bench: Bench; y: Float64Array }> {
  const random = lehmer(20260);
  const bench = new Bench(circuits[name]!());
  for (let i = 0; i < 40; i += 1) {
    bench.run(0.025, (time) => drive[name]?.(bench, i * 0.025 + time));
    const y = bench.plant.y.slice();
    for (let k = 0; k < y.length; k += 1) {
      const { initial: _, scale, name: state } = bench.circuit.states[k]!;
      y[k] = y[k]! + (state === 'application' || /eflection$/.test(state) ? 0.02 : 0.05) * scale * random();
    }
    yield { bench, y };
  }
}

describe.each(Object.keys(circuits))('%s', (name) => {
  it('has the Jacobian that central differences give', () => {
    let worst = 0;
    for (const { bench, y } of samples(name)) {
      const { circuit, plant } = bench;
      const n = circuit.states.length;
      const d = new Float64Array(n + 8);
      const values = new Float64Array(circuit.jacobian.rows.length);
      circuit.functions.ratesAndJacobian(y, plant.u, plant.m, d, values);
      const exact = new Float64Array(n * n);
      values.forEach((value, i) => {
        exact[circuit.jacobian.rows[i]! * n + circuit.jacobian.columns[i]!] = value;
      });
      const up = new Float64Array(n + 8);
      const down = new Float64Array(n + 8);
      for (let k = 0; k < n; k += 1) {
        const size = 1e-6 * circuit.states[k]!.scale;
        const moved = y.slice();
        moved[k] = y[k]! + size;
        circuit.functions.rates(moved, plant.u, plant.m, up);
        moved[k] = y[k]! - size;
        circuit.functions.rates(moved, plant.u, plant.m, down);
        for (let i = 0; i < n; i += 1) {
          const slope = (up[i]! - down[i]!) / (2 * size);
          const scale = circuit.states[i]!.scale / circuit.states[k]!.scale;
          const error = Math.abs(slope - exact[i * n + k]!) / (Math.abs(slope) + 10 * scale);
          if (error > 1e-4)
            expect.fail(
              `d ${circuit.states[i]!.path}' / d ${circuit.states[k]!.path}: ${exact[i * n + k]} against ${slope}`,
            );
          worst = Math.max(worst, error);
        }
      }
    }
    expect(worst).toBeLessThan(1e-4);
  });

  it('balances the energy of each element at any state', () => {
    for (const { bench, y } of samples(name)) {
      const { circuit, plant } = bench;
      const count = circuit.spec.elements.length;
      const out = new Float64Array(2 * count);
      circuit.functions.audit(y, plant.u, plant.m, out);
      for (let i = 0; i < count; i += 1) {
        const { name: part } = circuit.spec.elements[i]!;
        expect(Math.abs(out[i]!), part).toBeLessThanOrEqual(1e-10 * out[count + i]! + 1e-9);
      }
    }
  });

  it('never has a negative loss', () => {
    const bench = new Bench(circuits[name]!());
    const losses = bench.circuit.readings.filter((reading) => reading.name === 'loss');
    for (let i = 0; i < 100; i += 1) {
      bench.run(0.01, (time) => drive[name]?.(bench, i * 0.01 + time));
      for (const { path } of losses) expect(bench.get(path), path).toBeGreaterThanOrEqual(-1e-6);
    }
  });

  it('gives the same bits fused and unfused', () => {
    for (const { bench, y } of samples(name)) {
      const { circuit, plant } = bench;
      const fused = new Float64Array(circuit.states.length + 8);
      const plain = new Float64Array(circuit.states.length + 8);
      circuit.functions.rates(y, plant.u, plant.m, fused);
      unfuse(circuit).rates(y, plant.u, plant.m, plain);
      for (let i = 0; i < circuit.states.length; i += 1)
        expect(Object.is(fused[i], plain[i]), `${circuit.states[i]!.path}: ${fused[i]} ${plain[i]}`).toBe(true);
    }
  });

  it('closes the ledger over a driven second', () => {
    const bench = new Bench(circuits[name]!());
    // what was there at the start passes as well
    let throughput = bench.storedEnergy();
    for (let i = 0; i < 1000; i += 1) {
      drive[name]?.(bench, i * 1e-3);
      const before = bench.plant.ledger[0]!;
      bench.plant.step();
      throughput += Math.abs(bench.plant.ledger[0]! - before);
    }
    expect(Math.abs(bench.energyResidual()) / throughput).toBeLessThan(1e-4);
  });
});
