import type { Circuit } from './circuit/build.js';
import { places } from './circuit/build.js';
import { type LedgerPart, Rodas3 } from './solver/rodas3.js';

/**
 * A circuit with its state, memory and commands, advanced by whole steps. All that it remembers stands in three
 * stretches of one block (see BlockLayout); `ledger` holds the running integrals: supplied, left, brought per stuff.
 */
export interface PlantPlaces {
  readonly states: number;
  readonly memory: number;
  readonly commands: number;
  readonly ledger: number;
}

export interface PlantSettings {
  /** s */ readonly step: number;
  /** Substeps of a step. */
  readonly substeps: number;
  /** The safety net; default on. */
  readonly net?: boolean;
  /** Substeps that one stride of the solver may pass; default: all of a step. 1: each by itself. */
  readonly longest?: number;
}

export class Plant implements LedgerPart {
  readonly y: Float64Array;
  readonly m: Float64Array;
  readonly u: Float64Array;
  /** Integrals since the start: energy supplied and left, J; brought per stuff, kg. */
  readonly ledger: Float64Array;
  /** Readings, ledger powers, total energy, holdings, as of the end of the last step: see `places`. */
  readonly observed: Float64Array;
  readonly solver: Rodas3;
  private readonly open: Float64Array;
  /** Length of the part that is open, s: in an array, where a number needs no box. */
  private readonly openLength = new Float64Array(1);
  private readonly count: number;
  private readonly first: number;
  private readonly observedLedger: number;
  private readonly h = new Float64Array(1);
  private readonly longest: number;
  /** Memory whose change ends a stride. */
  private readonly latches: Int32Array;

  constructor(
    readonly circuit: Circuit,
    readonly settings: PlantSettings,
    block: Float64Array,
    at: PlantPlaces,
  ) {
    const place = places(circuit);
    this.count = place.rateCount - circuit.states.length;
    this.first = circuit.states.length;
    this.observedLedger = place.supplied;
    this.y = block.subarray(at.states, at.states + circuit.states.length);
    this.m = block.subarray(at.memory, at.memory + circuit.memory.length);
    this.u = block.subarray(at.commands, at.commands + circuit.commands.length);
    this.ledger = block.subarray(at.ledger, at.ledger + this.count);
    this.observed = new Float64Array(place.observeCount);
    this.open = new Float64Array(this.count);
    this.solver = new Rodas3(circuit, { net: settings.net ?? true });
    this.h[0] = settings.step / settings.substeps;
    this.longest = Math.min(settings.substeps, settings.longest ?? settings.substeps);
    this.latches = Int32Array.from(circuit.memory.flatMap((slot, i) => (slot.gradual ? [] : [i])));
  }

  /** A plant with a block of its own: for checks, tests and references. */
  static alone(circuit: Circuit, settings: PlantSettings): Plant {
    const n = circuit.states.length;
    const k = circuit.memory.length;
    const c = circuit.commands.length;
    const plant = new Plant(circuit, settings, new Float64Array(n + k + c + 2 + circuit.stuffs.length), {
      states: 0,
      memory: n,
      commands: n + k,
      ledger: n + k + c,
    });
    plant.reset();
    return plant;
  }

  /** Puts the start values into the block and observes. */
  reset(): void {
    const { circuit } = this;
    circuit.states.forEach((state, i) => {
      this.y[i] = state.initial;
    });
    circuit.memory.forEach((slot, i) => {
      this.m[i] = slot.initial;
    });
    circuit.commands.forEach((command, i) => {
      this.u[i] = command.rest;
    });
    this.ledger.fill(0);
    this.observe();
  }

  observe(): void {
    this.load();
    this.observeLoaded();
  }

  /** Advances by one step with the commands held, then observes. Allocates nothing. */
  step(): void {
    const { circuit, settings, y, m, solver, h } = this;
    const { step } = circuit;
    this.openLength[0] = 0;
    this.load();
    // memory meets the new commands
    step.t[0] = 0;
    this.update();
    let left = settings.substeps;
    let size = this.longest;
    while (left > 0) {
      if (size > left) size = left;
      step.t[0] = size * h[0]!;
      if (size > 1) {
        if (!this.stride()) {
          size >>= 1;
          continue;
        }
      } else {
        solver.substep(this);
        this.update();
      }
      left -= size;
    }
    for (let i = 0; i < y.length; i += 1) y[i] = step.y[i]!;
    for (let i = 0; i < m.length; i += 1) m[i] = step.m[i]!;
    this.observeLoaded();
    this.close();
  }

  /** One stride of length t[0]; false when it has to be shorter: nothing has changed then. */
  private stride(): boolean {
    const { circuit, solver, latches } = this;
    const { step } = circuit;
    if (!solver.stride()) return false;
    if (circuit.hasMemory) {
      step.update();
      for (let i = 0; i < latches.length; i += 1) if (step.n[latches[i]!] !== step.m[latches[i]!]) return false;
      this.remember();
    }
    this.part(step.d, step.t);
    solver.accept();
    return true;
  }

  private update(): void {
    if (!this.circuit.hasMemory) return;
    this.circuit.step.update();
    this.remember();
  }

  private remember(): void {
    const { m, n } = this.circuit.step;
    for (let i = 0; i < m.length; i += 1) m[i] = n[i]!;
  }

  /** The circuit's functions work on arrays of their own, which all plants of a circuit share. */
  private load(): void {
    const { circuit, y, u, m } = this;
    const { step } = circuit;
    for (let i = 0; i < y.length; i += 1) {
      step.y[i] = y[i]!;
      step.s[i] = y[i]!;
    }
    for (let i = 0; i < u.length; i += 1) step.u[i] = u[i]!;
    for (let i = 0; i < m.length; i += 1) step.m[i] = m[i]!;
  }

  private observeLoaded(): void {
    const { circuit, observed } = this;
    const { step } = circuit;
    step.observe();
    for (let i = 0; i < observed.length; i += 1) observed[i] = step.o[i]!;
  }

  /** Trapezoid over the parts of a step: each part's end is the next part's start; the step's end is observed. */
  part(d: Float64Array, length: Float64Array): void {
    const { count, first, open, openLength, ledger } = this;
    for (let i = 0; i < count; i += 1) {
      const power = d[first + i]!;
      ledger[i] = ledger[i]! + 0.5 * (openLength[0]! * (open[i]! + power));
      open[i] = power;
    }
    openLength[0] = length[0]!;
  }

  private close(): void {
    const { count, open, openLength, ledger, observed, observedLedger } = this;
    for (let i = 0; i < count; i += 1)
      ledger[i] = ledger[i]! + 0.5 * (openLength[0]! * (open[i]! + observed[observedLedger + i]!));
    openLength[0] = 0;
  }
}
