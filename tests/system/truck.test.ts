import { beforeAll, describe, expect, it } from 'vitest';
import * as library from '../../plants/library.js';
import { hashText } from '../../runtime/block.js';
import { buildCircuit, type Circuit, places } from '../../runtime/circuit/build.js';
import type { ElementFunction, ElementKind } from '../../runtime/contract.js';
import { Plant } from '../../runtime/plant.js';
import type { ControllerFactory } from '../../tools/loop/controller-module.js';
import { expectSameBits, jacobianError } from '../plants/circuit-checks.js';
import { runChild } from '../support/child.js';
import { loadTruckController, makeTruck, type Truck } from './truck.js';

/** The reference truck on its duty with the demo controller, closed loop at fast pace. */
let factory: ControllerFactory;
let truck: Truck;
/** The hash after every tick, low and high word. */
let hashes: Int32Array;
/** States, commands and memory at twenty instants. */
const instants: { y: Float64Array; u: Float64Array; m: Float64Array }[] = [];
let worstImbalance = 0;
let worstElement = '';
const tracking = { worst: 0, squares: 0 };
const least = { pressure: Number.POSITIVE_INFINITY, mass: Number.POSITIVE_INFINITY };
let fastestEngine = 0;

beforeAll(async () => {
  factory = await loadTruckController();
  truck = makeTruck(factory);
  const { assembly, ticks } = truck;
  const { circuit, plant } = assembly;
  const count = circuit.spec.elements.length;
  const audit = new Float64Array(2 * count);
  hashes = new Int32Array(2 * ticks);
  const table = assembly.table;
  const at = (path: string) => table.find(path);
  const error = at('driver.speedError');
  const engine = at('engineShaft.speed');
  const pressures = circuit.readings.flatMap((slot, i) =>
    slot.unit === 'Pa' && slot.group === 'reading' && slot.name !== 'difference' ? [i] : [],
  );
  const masses = circuit.states.flatMap((slot, i) => (slot.unit === 'kg' && slot.least === 0 ? [i] : []));
  truck.run(ticks, (tick) => {
    if (tick < 0) return;
    hashes.set(assembly.tick.hash, 2 * tick);
    const missed = assembly.signals[error]!;
    tracking.worst = Math.max(tracking.worst, Math.abs(missed));
    tracking.squares += missed * missed;
    fastestEngine = Math.max(fastestEngine, assembly.signals[engine]!);
    for (const i of pressures) least.pressure = Math.min(least.pressure, plant.observed[i]!);
    for (const i of masses) least.mass = Math.min(least.mass, plant.y[i]!);
    if (tick % Math.floor(ticks / 20) === 100)
      instants.push({ y: plant.y.slice(), u: plant.u.slice(), m: plant.m.slice() });
    if (tick % 25 === 0) {
      circuit.functions.audit(plant.y, plant.u, plant.m, audit);
      for (let i = 0; i < count; i += 1) {
        const share = Math.abs(audit[i]!) / Math.max(audit[count + i]!, 1);
        if (!(share <= worstImbalance)) {
          worstImbalance = share;
          worstElement = `${circuit.spec.elements[i]!.name} at ${tick} ms: ${audit[i]} W of ${audit[count + i]} W`;
        }
      }
    }
  });
});

function at(circuit: Circuit, instant: (typeof instants)[number]): Plant {
  const plant = Plant.alone(circuit, { step: 1e-3, substeps: 4 });
  plant.y.set(instant.y);
  plant.u.set(instant.u);
  plant.m.set(instant.m);
  plant.observe();
  return plant;
}

describe("the truck's circuit along its duty", () => {
  it('has an exact Jacobian, against central differences at twenty states', () => {
    expect(instants.length).toBeGreaterThanOrEqual(20);
    for (const instant of instants) {
      const plant = at(truck.assembly.circuit, instant);
      // off the kinks at which shut valves and stuck clutches stand: a difference across one is the mean of both sides
      plant.circuit.states.forEach((slot, i) => {
        if (slot.unit === 'rad/s') plant.y[i] = plant.y[i]! + 0.01 * (1 + 0.37 * i);
        else if (Math.abs(plant.y[i]!) < 1e-4) plant.y[i] = plant.y[i]! + 1e-4;
      });
      const { error, where } = jacobianError(plant, [1e-5, 1e-6, 1e-7, 1e-8], 0.1);
      expect(error, where).toBeLessThan(1e-3);
    }
  });

  it('gives the same bits fused and unfused', () => {
    for (const instant of instants) expectSameBits(at(truck.assembly.circuit, instant));
  });

  it('gives the same bits when its code is cut into many small functions', () => {
    const { circuit } = truck.assembly;
    const cut = buildCircuit(circuit.spec, { chunkSize: 37 });
    expect(cut.code).toContain('ratesAndJacobian30(');
    expect(circuit.code).not.toContain('ratesAndJacobian30(');
    const { rateCount, observeCount } = places(circuit);
    const sizes = [
      rateCount,
      circuit.jacobian.rows.length,
      observeCount,
      circuit.memory.length,
      2 * circuit.spec.elements.length,
    ];
    const outputs = (one: Circuit, { y, u, m }: (typeof instants)[number]) => {
      const [d, J, observed, memory, audit] = sizes.map((size) => new Float64Array(size)) as [
        Float64Array,
        Float64Array,
        Float64Array,
        Float64Array,
        Float64Array,
      ];
      one.functions.ratesAndJacobian(y, u, m, d, J);
      one.functions.observe(y, u, m, observed);
      one.functions.update(y, u, m, 2.5e-4, memory);
      one.functions.audit(y, u, m, audit);
      const rates = new Float64Array(rateCount);
      one.functions.rates(y, u, m, rates);
      return [d, J, observed, memory, audit, rates].map((array) => Buffer.from(array.buffer));
    };
    for (const instant of instants) {
      const whole = outputs(circuit, instant);
      for (const [i, bytes] of outputs(cut, instant).entries())
        expect(bytes.equals(whole[i]!), `output ${i}`).toBe(true);
    }
  });

  it('balances the energy of every element to 1e-9 of its terms', () => {
    expect(worstImbalance, worstElement).toBeLessThan(1e-9);
  });

  it('keeps every pressure and every mass above zero', () => {
    expect(least.pressure).toBeGreaterThan(0);
    expect(least.mass).toBeGreaterThan(0);
  });
});

describe('the duty', () => {
  it('closes its ledger: energy to 1e-4 of what passed through the pump-motor, oil to 1e-12', () => {
    const { assembly } = truck;
    const through = assembly.table.find('pumpMotor.throughput');
    expect(through).toBeGreaterThanOrEqual(0);
    const { energy, stuffs } = assembly.ledger.shares(assembly.block, assembly.signals);
    // the largest turnover is that of the pump-motor or of what stands in line with it
    expect(truck.value('ledger.turnover')).toBeGreaterThan(5e5);
    expect(energy).toBeLessThan(1e-5);
    expect(stuffs['oil']).toBeLessThan(1e-12);
    expect(assembly.plant.solver.replaced).toBe(0);
  });

  it('comes near the relief valve and never opens it', () => {
    const warnings = truck.assembly.warnings();
    expect(warnings.some((warning) => warning.path === 'highLine.pressure' && warning.level === 'near relief')).toBe(
      true,
    );
    expect(warnings.filter((warning) => warning.level !== 'near relief')).toEqual([]);
  });

  it('follows the trace within 2.5 m/s, 0.7 m/s in the mean square', () => {
    expect(tracking.worst).toBeLessThan(2.5);
    expect(Math.sqrt(tracking.squares / truck.ticks)).toBeLessThan(0.7);
    expect(truck.value('body.distance')).toBeGreaterThan(380);
  });

  it('shifts without the engine running up, and stands still at the end', () => {
    expect(fastestEngine).toBeLessThan(245);
    expect(Math.abs(truck.value('body.velocity'))).toBeLessThan(1e-3);
    expect(truck.value('body.distance')).toBeLessThan(460);
  });
});

describe('determinism', () => {
  /** First tick in which the hash differs from that of the run above, or -1. */
  const firstDifference = (other: Truck, ticks: number): number => {
    let found = -1;
    other.run(ticks, (tick) => {
      if (found >= 0 || tick < 0) return;
      if (other.assembly.tick.hash[0] !== hashes[2 * tick] || other.assembly.tick.hash[1] !== hashes[2 * tick + 1])
        found = tick;
    });
    return found;
  };

  it('gives the same hash after every tick of the duty a second time', () => {
    expect(firstDifference(makeTruck(factory), truck.ticks)).toBe(-1);
    expect(new Set(Array.from({ length: 1000 }, (_, i) => hashText(hashes[2 * i]!, hashes[2 * i + 1]!))).size).toBe(
      1000,
    );
  });

  it('gives another hash with another seed', () => {
    expect(firstDifference(makeTruck(factory, { seed: 2 }), 10)).toBe(0);
  });

  it('gives another hash from the tick on in which one bit of one received datagram differs', () => {
    const changeAt = 4000;
    let counted = 0;
    const other = makeTruck(factory, {
      between: (inner) => ({
        send: (bytes, length) => inner.send(bytes, length),
        poll: (into) => {
          const length = inner.poll(into);
          // a request, not a word of the barrier: the lowest bit of its last byte of payload
          if (length > 40) counted += 1;
          if (length > 40 && counted === changeAt) into[length - 5] = into[length - 5]! ^ 1;
          return length;
        },
      }),
    });
    const first = firstDifference(other, 20_000);
    expect(counted).toBeGreaterThan(changeAt);
    expect(first).toBeGreaterThan(1000);
    expect(first).toBeLessThan(15_000);
  });
});

describe('a pump-motor whose torque is 1 % wrong', () => {
  it('drives the energy residual beyond the budget of the bench', () => {
    const source = library.pumpMotor.flows!.toString();
    expect(source.split('shaft.torque += torque').length).toBe(2);
    const { flows } = new Function(
      `return { ${source.replace('shaft.torque += torque', 'shaft.torque += 1.01 * torque')} }`,
    )() as { flows: ElementFunction };
    const wrong = makeTruck(factory, {
      kind: (name, kind): ElementKind => (name === 'pumpMotor' ? { ...kind, flows } : kind),
    });
    let worst = 0;
    const { assembly, spec } = wrong;
    wrong.run(21_000, (tick) => {
      if (tick > 5000 && tick % 100 === 0)
        worst = Math.max(worst, assembly.ledger.shares(assembly.block, assembly.signals).energy);
    });
    expect(assembly.ledger.shares(assembly.block, assembly.signals).energy).toBeGreaterThan(
      spec.budgets.energyResidual,
    );
    expect(worst).toBeGreaterThan(spec.budgets.energyResidual);
  });
});

describe('the tick', () => {
  it('runs 60,000 times without a collection of garbage on default heap settings', async () => {
    const child = await runChild(new URL('./ticking-truck.ts', import.meta.url), ['60000']);
    expect(child.errors).toBe('');
    const { collections, allocated, distance } = JSON.parse(child.output);
    expect(distance).toBeGreaterThan(300);
    expect(collections).toBe(0);
    // less than half a boxed number in a tick
    expect(allocated / 60_000).toBeLessThan(8);
  });
});
