import { places } from '../../runtime/circuit/build.js';
import type { ElementInstance } from '../../runtime/contract.js';
import { Bench } from '../support/circuit.js';

/** A circuit with its drive, for comparing the product's step with the converged solution. */
export interface HardCircuit {
  readonly elements: () => ElementInstance[];
  readonly seconds: number;
  /** Sets commands before every tick; `time` in s. */
  readonly drive: (set: (path: string, value: number) => void, time: number) => void;
  /** The relief setting, Pa: what errors and peaks of pressure are a share of. */
  readonly reliefSetting: number;
  /** Further readings or states that are compared, each with what its error is a share of. */
  readonly others?: Readonly<Record<string, number>>;
  /** Change by halving the substep, as a share, at which the reference counts as converged. */
  readonly converged?: number;
}

/** Values of one run at the end of each tick. */
export interface Run {
  readonly substeps: number;
  readonly traces: readonly Float64Array[];
  /** Least value of any absolute pressure, and of any mass that cannot be negative. */
  readonly leastPressure: number;
  readonly leastMass: number;
  /** Energy residual at its worst on the way, J, and the largest energy that passed through one branch. */
  readonly residual: number;
  readonly turnover: number;
  /** Oil held now less what was brought less what was held at the start, as a share of that. */
  readonly oilResidual: number;
  readonly refined: number;
  readonly replaced: number;
  readonly failed: boolean;
}

export interface Compared {
  readonly path: string;
  readonly scale: number;
  /** Largest difference to the converged solution at a tick, as a share. */
  readonly error: number;
  readonly at: number;
  /** Largest value beyond the largest of the converged solution, as a share; and the same downwards. */
  readonly overshoot: number;
  readonly undershoot: number;
  /** Alternation from tick to tick here and in the converged solution, as shares. */
  readonly ringing: number;
  readonly trueRinging: number;
}

export interface Comparison {
  readonly run: Run;
  readonly reference: Run;
  /** Change of the reference by halving its substep once more, as a share. */
  readonly halving: number;
  readonly signals: readonly Compared[];
  readonly worst: Compared;
}

/** `longest`: substeps that a stride may pass; a reference takes none. */
export function run(circuit: HardCircuit, substeps: number, paths: readonly string[], longest = substeps): Run {
  const bench = new Bench(circuit.elements(), { substeps, longest });
  const { plant } = bench;
  const at = places(bench.circuit);
  const count = Math.round(circuit.seconds * 1000);
  const traces = paths.map(() => new Float64Array(count));
  const pressures = bench.circuit.readings.filter(isPressure).map((slot) => slot.path);
  const masses = bench.circuit.states.filter((slot) => slot.unit === 'kg' && slot.least === 0).map((slot) => slot.path);
  const through = bench.circuit.readings.flatMap((slot, i) => (slot.name === 'throughput' ? [i] : []));
  const passed = new Float64Array(through.length);
  const held = plant.observed[at.holdings] ?? 0;
  let leastPressure = Number.POSITIVE_INFINITY;
  let leastMass = Number.POSITIVE_INFINITY;
  let residual = 0;
  const set = (path: string, value: number) => bench.set(path, value);
  for (let k = 0; k < count; k += 1) {
    circuit.drive(set, k * 1e-3);
    plant.step();
    paths.forEach((path, i) => {
      traces[i]![k] = bench.get(path);
    });
    for (const path of pressures) leastPressure = Math.min(leastPressure, bench.get(path));
    for (const path of masses) leastMass = Math.min(leastMass, bench.get(path));
    through.forEach((place, i) => {
      passed[i]! += plant.observed[place]! * 1e-3;
    });
    residual = Math.max(residual, Math.abs(bench.energyResidual()));
  }
  const brought = bench.circuit.stuffs.length > 0 ? plant.ledger[2]! : 0;
  return {
    substeps,
    traces,
    leastPressure,
    leastMass,
    residual,
    turnover: Math.max(...passed),
    oilResidual: held > 0 ? Math.abs(plant.observed[at.holdings]! - held - brought) / held : 0,
    refined: plant.solver.refined,
    replaced: plant.solver.replaced,
    failed: plant.solver.failed,
  };
}

function isPressure(slot: { readonly unit: string; readonly group: string; readonly name: string }): boolean {
  return slot.unit === 'Pa' && slot.group === 'reading' && slot.name !== 'difference';
}

/** Runs with the product's four substeps and with ever finer ones until halving changes nothing that counts. */
export function compare(circuit: HardCircuit, substeps = 4): Comparison {
  const bench = new Bench(circuit.elements());
  const pressures = bench.circuit.readings.filter(isPressure).map((slot) => slot.path);
  const paths = [...pressures, ...Object.keys(circuit.others ?? {})];
  const scales = paths.map((path) => circuit.others?.[path] ?? circuit.reliefSetting);
  const product = run(circuit, substeps, paths);
  const enough = circuit.converged ?? 2e-4;
  let reference = run(circuit, 4 * substeps, paths, 1);
  let halving = Number.POSITIVE_INFINITY;
  while (reference.substeps < 2048) {
    const finer = run(circuit, 2 * reference.substeps, paths, 1);
    halving = Math.max(...paths.map((_, i) => distance(finer.traces[i]!, reference.traces[i]!)[0] / scales[i]!));
    reference = finer;
    if (halving < enough) break;
  }
  const signals = paths.map((path, i): Compared => {
    const scale = scales[i]!;
    const mine = product.traces[i]!;
    const truth = reference.traces[i]!;
    const [error, at] = distance(mine, truth);
    return {
      path,
      scale,
      error: error / scale,
      at,
      overshoot: (largest(mine, 1) - largest(truth, 1)) / scale,
      undershoot: (largest(mine, -1) - largest(truth, -1)) / scale,
      ringing: ringing(mine) / scale,
      trueRinging: ringing(truth) / scale,
    };
  });
  const worst = signals.reduce((a, b) => (b.error > a.error ? b : a));
  return { run: product, reference, halving, signals, worst };
}

function distance(a: Float64Array, b: Float64Array): [number, number] {
  let most = 0;
  let at = 0;
  for (let k = 0; k < a.length; k += 1) {
    const size = Math.abs(a[k]! - b[k]!);
    if (!(size <= most)) {
      most = size;
      at = k * 1e-3;
    }
  }
  return [most, at];
}

function largest(trace: Float64Array, sign: number): number {
  let most = Number.NEGATIVE_INFINITY;
  for (let k = 0; k < trace.length; k += 1) most = Math.max(most, sign * trace[k]!);
  return most;
}

/**
 * Ringing between ticks: the largest amplitude that alternates up, down, up, down from tick to tick, taken as the
 * least of four differences in a row with alternating signs.
 */
export function ringing(trace: Float64Array): number {
  let most = 0;
  for (let k = 4; k < trace.length; k += 1) {
    let least = Number.POSITIVE_INFINITY;
    for (let i = 0; i < 4; i += 1) {
      const step = trace[k - i]! - trace[k - i - 1]!;
      const before = trace[k - i - 1]! - trace[k - i - 2]!;
      if (i < 3 && step * before >= 0) least = 0;
      least = Math.min(least, Math.abs(step));
    }
    if (least > most) most = least;
  }
  return most;
}
