import type { Circuit } from './circuit/build.js';
import type { SignalTable } from './signals.js';

/** Energy of one element over a run, J. */
export interface EnergyPart {
  readonly element: string;
  /** Entered here from outside; negative: left. */
  readonly supplied: number;
  /** Stored at the end less stored at the start. */
  readonly stored: number;
  /** Dissipated to the surroundings; what is kept as heat in the circuit counts as stored. */
  readonly lost: number;
}

/**
 * Integrals of what each element supplies and loses, for the picture of energy in a report. Once a tick, so coarser than
 * the ledger, which counts in the solver's substeps. They follow from the signals alone and stand outside the block.
 */
export class EnergyParts {
  private readonly names: string[] = [];
  private readonly energy: number[] = [];
  private readonly supply: number[] = [];
  private readonly loss: number[] = [];
  private readonly started: Float64Array;
  private readonly supplied: Float64Array;
  private readonly lost: Float64Array;

  constructor(
    circuit: Circuit,
    signals: SignalTable,
    private readonly step: number,
  ) {
    for (const { name, kind } of circuit.spec.elements) {
      const energy = signals.find(`${name}.energy`);
      const supply = signals.find(`${name}.supply`);
      const loss = kind.heat === 'leaves' ? signals.find(`${name}.loss`) : -1;
      if (energy < 0 && supply < 0 && loss < 0) continue;
      this.names.push(name);
      this.energy.push(energy);
      this.supply.push(supply);
      this.loss.push(loss);
    }
    this.started = new Float64Array(this.names.length);
    this.supplied = new Float64Array(this.names.length);
    this.lost = new Float64Array(this.names.length);
  }

  begin(signals: Float64Array): void {
    this.supplied.fill(0);
    this.lost.fill(0);
    for (let i = 0; i < this.energy.length; i += 1)
      this.started[i] = this.energy[i]! < 0 ? 0 : signals[this.energy[i]!]!;
  }

  run(signals: Float64Array): void {
    for (let i = 0; i < this.energy.length; i += 1) {
      if (this.supply[i]! >= 0) this.supplied[i] = this.supplied[i]! + signals[this.supply[i]!]! * this.step;
      if (this.loss[i]! >= 0) this.lost[i] = this.lost[i]! + signals[this.loss[i]!]! * this.step;
    }
  }

  /** Up to the tick whose signals these are. Not for the tick. */
  list(signals: Float64Array): EnergyPart[] {
    return this.names.map((element, i) => ({
      element,
      supplied: this.supplied[i]!,
      stored: this.energy[i]! < 0 ? 0 : signals[this.energy[i]!]! - this.started[i]!,
      lost: this.lost[i]!,
    }));
  }
}
