import type { Assembly } from '../../configs/assemble.js';
import type { Circuit } from '../../runtime/circuit/build.js';
import { Plant } from '../../runtime/plant.js';
import type { Barrier } from '../loop/controller-module.js';
import { HardEvents } from './hard-events.js';
import type { Mode } from './modes.js';
import { Stability, type StabilityMargin } from './stability.js';

/** How far the bench's step is from the converged solution, for one signal. */
export interface SignalError {
  readonly path: string;
  /** Largest error, SI. */
  readonly error: number;
  /** What it is a share of: the relief setting of a pressure's side, the largest value of a speed. */
  readonly scale: number;
  readonly share: number;
  /** Seconds into the drive, and in which event. */
  readonly at: number;
  readonly event: string;
  /** How much the reference itself moved when its step was halved, as a share; not a number where that was not done. */
  readonly reference: number;
}

export interface AccuracySheet {
  readonly substeps: number;
  readonly referenceSubsteps: number;
  readonly seconds: number;
  readonly events: readonly string[];
  readonly pressures: readonly SignalError[];
  readonly speeds: readonly SignalError[];
  readonly worstPressure: SignalError | undefined;
  readonly worstSpeed: SignalError | undefined;
  /** Substeps that the safety net refined, and quarters it replaced, per million. */
  readonly refined: number;
  readonly replaced: number;
  /** Overshoot of a pressure's peak above the converged peak, share of its scale. */
  readonly overshoot: { readonly path: string; readonly share: number };
  /** Energy residual as a share of the largest energy that passed through one branch. */
  readonly energyResidual: number;
  readonly oilResidual: number;
  readonly modes: readonly Mode[];
  readonly stability: StabilityMargin;
  /** Cost of one step of the plant, µs, median. */
  readonly stepCost: number;
}

/** Commands of every tick of a drive, frozen: rows of circuit.commands.length values. */
export interface FrozenDrive {
  readonly ticks: number;
  readonly commands: Float64Array;
}

/** Drives the bench's duty once at fast pace, closed loop, and keeps what the plant was told in each tick. */
export function freeze(
  assembly: Assembly,
  barriers: readonly Barrier[],
  ticks: number,
  onTick: (tick: number) => boolean,
): FrozenDrive {
  const { plant, tick: stage, firstTick } = assembly;
  const count = assembly.circuit.commands.length;
  const commands = new Float64Array(ticks * count);
  for (let tick = firstTick; tick < ticks; tick += 1) {
    stage.run(tick);
    for (const barrier of barriers) barrier.end(tick);
    if (tick >= 0) commands.set(plant.u, tick * count);
    if (tick % 1000 === 0 && !onTick(tick)) return { ticks: Math.max(0, tick), commands };
  }
  return { ticks, commands };
}

interface Compared {
  readonly index: number;
  readonly path: string;
  readonly scale: number;
  readonly kind: 'pressure' | 'speed';
  error: number;
  at: number;
  event: string;
  reference: number;
  peak: number;
  truePeak: number;
}

/**
 * Runs the plant with frozen commands at the bench's step and at two much finer ones side by side, and compares every
 * pressure and speed at every tick. Then the hard events that the circuit can have (hard-events.ts). `finer`: the references' substeps over the bench's; the last is the truth, the one before it judges it.
 */
export function measureAccuracy(
  assembly: Assembly,
  drive: FrozenDrive,
  scaleOf: (path: string) => number | undefined,
  onProgress: (share: number) => boolean,
  finer: readonly number[] = [4, 8],
): AccuracySheet {
  const { circuit, spec } = assembly;
  const plants = [1, ...finer].map((times) =>
    Plant.alone(circuit, {
      step: spec.step,
      substeps: times * spec.substeps,
      ...(times === 1 ? {} : { longest: 1 }),
    }),
  );
  const [own, truth] = [plants[0]!, plants[plants.length - 1]!];
  const compared = choose(circuit, scaleOf);
  const count = circuit.commands.length;
  const hard = new HardEvents(circuit);
  const stability = new Stability(circuit, spec.step / spec.substeps);
  const speeds = compared.filter((one) => one.kind === 'speed');
  const largest = new Float64Array(compared.length);
  const costs: number[] = [];
  const start = own.observed.slice();
  const modesFound: Mode[] = [];
  const share = 1 / (1.1 * drive.ticks || 1);
  let done = 0;
  let aborted = false;
  for (let tick = 0; tick < drive.ticks && !aborted; tick += 1) {
    for (const plant of plants) plant.u.set(drive.commands.subarray(tick * count, (tick + 1) * count));
    const began = performance.now();
    own.step();
    costs.push(performance.now() - began);
    for (const plant of plants) if (plant !== own) plant.step();
    compare(compared, plants, tick * spec.step, 'the duty', largest);
    hard.look(own.observed, own.u, truth);
    if (tick % Math.max(1, Math.floor(drive.ticks / 8)) === 0) modesFound.push(...stability.look(truth).slice(0, 12));
    done += 1;
    if (tick % 500 === 0) aborted = !onProgress(done * share);
  }
  const energy = residuals(circuit, own, start, assembly);
  const { solver } = own;
  const refined = (solver.refined / Math.max(1, drive.ticks * spec.substeps)) * 1e6;
  const replaced = (solver.replaced / Math.max(1, drive.ticks * spec.substeps)) * 1e6;
  const events = ['the duty'];
  const found = hard.found();
  for (const event of found) {
    if (aborted) break;
    events.push(event.name);
    for (const plant of plants) {
      plant.reset();
      plant.y.set(event.state);
      plant.m.set(event.memory);
      plant.observe();
    }
    for (let k = 0; k < event.ticks; k += 1) {
      for (const plant of plants) {
        plant.u.set(event.commands);
        event.change(plant.u, k);
        plant.step();
      }
      compare(compared, plants, k * spec.step, event.name, largest);
      if (k % 50 === 0) stability.look(plants[plants.length - 1]!);
    }
    done += (0.1 * drive.ticks) / found.length;
    aborted = !onProgress(done * share);
  }
  costs.sort((a, b) => a - b);
  const finish = (one: Compared): SignalError => {
    const scale = one.kind === 'speed' ? Math.max(largest[compared.indexOf(one)]!, 1e-3) : one.scale;
    return {
      path: one.path,
      error: one.error,
      scale,
      share: one.error / scale,
      at: one.at,
      event: one.event,
      reference: one.reference / scale,
    };
  };
  const byShare = (a: SignalError, b: SignalError) => b.share - a.share;
  const pressures = compared
    .filter((one) => one.kind === 'pressure')
    .map(finish)
    .sort(byShare);
  const speedErrors = speeds.map(finish).sort(byShare);
  const over = compared
    .filter((one) => one.kind === 'pressure')
    .map((one) => ({ path: one.path, share: (one.peak - one.truePeak) / one.scale }))
    .sort((a, b) => b.share - a.share)[0] ?? { path: '', share: 0 };
  return {
    substeps: spec.substeps,
    referenceSubsteps: truth.settings.substeps,
    seconds: drive.ticks * spec.step,
    events,
    pressures,
    speeds: speedErrors,
    worstPressure: pressures[0],
    worstSpeed: speedErrors[0],
    refined,
    replaced,
    overshoot: over,
    energyResidual: energy.energy,
    oilResidual: energy.oil,
    modes: distinct(modesFound),
    stability: stability.margin(),
    stepCost: 1000 * (costs[Math.floor(costs.length / 2)] ?? 0),
  };
}

function choose(circuit: Circuit, scaleOf: (path: string) => number | undefined): Compared[] {
  return circuit.readings.flatMap((reading, index): Compared[] => {
    if (reading.group !== 'reading') return [];
    const base = {
      index,
      path: reading.path,
      error: 0,
      at: 0,
      event: '',
      reference: 0,
      peak: Number.NEGATIVE_INFINITY,
      truePeak: Number.NEGATIVE_INFINITY,
    };
    if (reading.unit === 'Pa') {
      const scale = scaleOf(reading.path);
      return scale === undefined ? [] : [{ ...base, kind: 'pressure', scale }];
    }
    return reading.unit === 'rad/s' || reading.unit === 'm/s' ? [{ ...base, kind: 'speed', scale: 1 }] : [];
  });
}

function compare(
  compared: Compared[],
  plants: readonly Plant[],
  at: number,
  event: string,
  largest: Float64Array,
): void {
  const own = plants[0]!.observed;
  const reference = plants[plants.length - 1]!.observed;
  const before = plants.length > 2 ? plants[plants.length - 2]!.observed : undefined;
  for (let i = 0; i < compared.length; i += 1) {
    const one = compared[i]!;
    const coarse = own[one.index]!;
    const truth = reference[one.index]!;
    const error = Math.abs(coarse - truth);
    if (!(error <= one.error)) {
      one.error = error;
      one.at = at;
      one.event = event;
    }
    one.reference = before ? Math.max(one.reference, Math.abs(before[one.index]! - truth)) : Number.NaN;
    one.peak = Math.max(one.peak, coarse);
    one.truePeak = Math.max(one.truePeak, truth);
    largest[i] = Math.max(largest[i]!, Math.abs(truth));
  }
}

function residuals(
  circuit: Circuit,
  plant: Plant,
  start: Float64Array,
  assembly: Assembly,
): { energy: number; oil: number } {
  const energyAt = circuit.readings.length + 2 + circuit.stuffs.length;
  const residual = plant.observed[energyAt]! - start[energyAt]! - plant.ledger[0]! + plant.ledger[1]!;
  const turnover = assembly.signals[assembly.table.find('ledger.turnover')]!;
  const oil = circuit.stuffs.indexOf('oil');
  const held = oil >= 0 ? start[energyAt + 1 + oil]! : 0;
  return {
    energy: turnover > 0 ? Math.abs(residual) / turnover : 0,
    oil: held > 0 ? Math.abs(plant.observed[energyAt + 1 + oil]! - held - plant.ledger[2 + oil]!) / held : 0,
  };
}

/** The fastest modes met anywhere on the drive, one of each set of carriers. */
function distinct(modes: readonly Mode[]): Mode[] {
  const seen = new Map<string, Mode>();
  for (const mode of modes) {
    const key = `${mode.carriers.map((carrier) => carrier.path).join(' ')}${mode.imaginary > 0}`;
    const other = seen.get(key);
    if (!other || Math.hypot(mode.real, mode.imaginary) > Math.hypot(other.real, other.imaginary)) seen.set(key, mode);
  }
  return [...seen.values()]
    .sort((a, b) => Math.hypot(b.real, b.imaginary) - Math.hypot(a.real, a.imaginary))
    .slice(0, 8);
}
