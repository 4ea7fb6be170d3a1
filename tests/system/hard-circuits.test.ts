import { describe, expect, it } from 'vitest';
import { expectSameBits, jacobianError } from '../plants/circuit-checks.js';
import { Bench } from '../support/circuit.js';
import { bar } from '../support/oil.js';
import { type Comparison, compare, ringing } from './converged.js';
import { clutchOnGrade, hardCircuits, outOfBalance } from './hard-circuits.js';

/**
 * The circuits that break solvers, through the product's elements, builder and solver at 1 ms and four substeps, against
 * the same circuit refined until halving the substep changes nothing that counts (at most 0.05 % of the scale).
 */
describe.each(hardCircuits)('%s', (_name, circuit) => {
  let result: Comparison;
  it('has a converged solution to be measured against', () => {
    result = compare(circuit);
    expect(result.halving).toBeLessThan(5e-4);
    expect(result.reference.substeps).toBeGreaterThanOrEqual(32);
    expect(result.reference.failed).toBe(false);
    expect(result.reference.residual / result.reference.turnover).toBeLessThan(1e-4);
  });

  it('stays close to it, with no peak beyond its peaks by more than 1 % of the relief setting', () => {
    for (const signal of result.signals) {
      expect(signal.error, `${signal.path} at ${signal.at} s`).toBeLessThan(0.01);
      expect(signal.overshoot, signal.path).toBeLessThan(0.01);
      expect(signal.undershoot, signal.path).toBeLessThan(0.01);
    }
  });

  it('does not ring between ticks where it does not', () => {
    for (const signal of result.signals) expect(signal.ringing, signal.path).toBeLessThan(signal.trueRinging + 2e-4);
  });

  it('has no negative pressure and no negative mass', () => {
    expect(result.run.failed).toBe(false);
    expect(result.run.leastPressure).toBeGreaterThan(0);
    expect(result.run.leastMass).toBeGreaterThanOrEqual(0);
  });

  it('closes its ledger', () => {
    expect(result.run.turnover).toBeGreaterThan(100);
    expect(result.run.residual / result.run.turnover).toBeLessThan(1e-3);
    expect(result.run.oilResidual).toBeLessThan(1e-12);
  });

  it('has an exact Jacobian and the same bits fused and unfused all along', () => {
    const { plant } = new Bench(circuit.elements(), { longest: 1 });
    const at = new Map(plant.circuit.commands.map((slot, i) => [slot.path, i]));
    const every = Math.round((circuit.seconds * 1000) / 12);
    for (let k = 0; k < circuit.seconds * 1000; k += 1) {
      circuit.drive((path, value) => {
        plant.u[at.get(path)!] = value;
      }, k * 1e-3);
      plant.step();
      if (k % every !== 0) continue;
      expectSameBits(plant);
      // off the kinks at which a closed valve stands: a difference across one is the mean of both sides
      const y = plant.y.slice();
      for (let i = 0; i < y.length; i += 1) if (Math.abs(y[i]!) < 1e-4) plant.y[i] = y[i]! + 1e-4;
      const { error, where } = jacobianError(plant, [1e-6, 1e-7, 1e-8]);
      plant.y.set(y);
      // near balance a difference crosses the change of the side whose heat is carried
      expect(error, where).toBeLessThan(1e-2);
    }
  });
});

describe('a clutch that sticks on a grade', () => {
  it('lets a 7.5 t truck creep by less than a millimetre in a minute on 10 %', () => {
    const bench = new Bench(clutchOnGrade.elements());
    bench.set('body.grade', 0.1);
    bench.set('clutch.engagement', 1);
    // until it has stopped rocking
    bench.run(8);
    const from = bench.get('body.distance');
    bench.run(60);
    expect(Math.abs(bench.get('body.distance') - from)).toBeLessThan(1e-4);
    expect(bench.get('clutch.torque') / bench.get('clutch.capacity')).toBeLessThan(-0.4);
  });

  it('slips while it lets go, and takes hold again', () => {
    const bench = new Bench(clutchOnGrade.elements());
    const slip: number[] = [];
    bench.run(2.5, (time) => {
      clutchOnGrade.drive((path, value) => bench.set(path, value), time);
      if (time > 0.7) slip.push(Math.abs(bench.get('clutch.slip')));
    });
    expect(Math.max(...slip)).toBeGreaterThan(1);
    expect(slip.at(-1)).toBeLessThan(1e-3);
  });
});

describe('the measure of ringing', () => {
  it('sees an alternation of one tick and not a slow wave, a ramp or a single kink', () => {
    const trace = (f: (k: number) => number) => Float64Array.from({ length: 200 }, (_, k) => f(k));
    expect(ringing(trace((k) => (k > 100 && k < 110 ? (-1) ** k : 0)))).toBeCloseTo(2, 12);
    expect(ringing(trace((k) => Math.sin(0.2 * k)))).toBe(0);
    expect(ringing(trace((k) => k * k))).toBe(0);
    expect(ringing(trace((k) => Math.abs(k - 100)))).toBe(0);
  });
});

describe('a circuit that starts out of balance', () => {
  /** Of the farther volume: ringing and largest pressure after the first tick, bar. */
  const settle = (net: boolean, substeps: number) => {
    const bench = new Bench(outOfBalance(), { net, substeps });
    const trace: number[] = [];
    bench.set('valve.open', 1);
    bench.run(0.1, () => trace.push(bench.get('far.pressure') / bar));
    return {
      ringing: ringing(Float64Array.from(trace)),
      most: Math.max(...trace.slice(1)),
      refined: bench.plant.solver.refined,
    };
  };
  it('settles at once, as it does with sixty-four substeps', () => {
    const product = settle(true, 4);
    const truth = settle(true, 64);
    expect(product.ringing).toBeLessThan(0.01);
    expect(product.most).toBeLessThan(truth.most + 0.1);
    expect(product.refined).toBeLessThanOrEqual(4);
  });
  it('would not do so without the safety net', () => {
    expect(settle(false, 1).ringing).toBeGreaterThan(10);
    expect(settle(false, 4).most).toBeGreaterThan(300);
  });
});
