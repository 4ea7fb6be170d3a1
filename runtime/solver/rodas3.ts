import type { Circuit } from '../circuit/build.js';

/**
 * RODAS3 (Sandu, Verwer, Blom, Spee, Carmichael, Potra 1997, Atmospheric Environment 31, 3459: four stages, order 3,
 * L-stable, stiffly accurate, gamma = 1/2), fixed substeps, a fresh exact Jacobian in each, in the form that needs no
 * product with J: M = I/(h/2) - J,
 *
 *   M K1 = f(y)
 *   M K2 = f(y) + 4/h K1
 *   M K3 = f(y + 2 K1) + (K1 - K2)/h
 *   M K4 = f(y + 2 K1 + K3) + (K1 - K2 - 8/3 K3)/h
 *   y+   = y + 2 K1 + K3 + K4,   error estimate K4.
 *
 * Strides: a step tries to pass several substeps in one stride. A stride counts only where the estimate stays far below
 * what the net lets pass (see rodas3-code.ts) and no latch of the circuit changes; else it is taken back and halved. What
 * happens quickly is thus computed in the bench's substeps and what goes on calmly in few, at the same accuracy.
 *
 * Safety net: where the weighted error estimate is above 1 (or not a number), or the least pivot below a tenth of its
 * healthy size, the substep is done again as four quarters; a quarter that fails again is replaced by two linearly
 * implicit Euler half steps. The cost is bounded and the result deterministic; both are counted.
 */
export class Rodas3 {
  /** Substeps done again as quarters since the start. */
  refined = 0;
  /** Quarters replaced by Euler half steps since the start. */
  replaced = 0;
  private readonly start: Float64Array;

  constructor(
    private readonly circuit: Circuit,
    private readonly settings: { readonly net: boolean } = { net: true },
  ) {
    this.start = new Float64Array(circuit.states.length);
  }

  /** Tries a stride of length `step.t[0]`, s, from y: the new state stands in `step.s` when it is accurate enough. */
  stride(): boolean {
    const { step } = this.circuit;
    if (!this.attempt()) return false;
    step.strideError();
    return step.e[1]! <= 1;
  }

  /**
   * One substep of length `step.t[0]`, s, on the arrays of `circuit.step`, whose y and s advance in place. `onPart` gets the
   * ledger powers at the start of each part; the caller integrates them by the trapezoid (see Plant).
   */
  substep(onPart: LedgerPart): void {
    const { start, circuit } = this;
    const { y, s, d, k1, t } = circuit.step;
    const n = y.length;
    const good = this.attempt();
    if (good || !this.settings.net) {
      onPart.part(d, t);
      this.accept();
      return;
    }
    this.refined += 1;
    t[0] = t[0]! / 4;
    for (let part = 0; part < 4; part += 1) {
      const fine = this.attempt();
      if (fine) {
        onPart.part(d, t);
        this.accept();
        continue;
      }
      this.replaced += 1;
      // the first half step is y + K1 (M was built for h/2), the second needs a fresh Jacobian
      t[0] = t[0]! / 2;
      onPart.part(d, t);
      for (let i = 0; i < n; i += 1) {
        start[i] = y[i]!;
        y[i] = y[i]! + k1[i]!;
      }
      this.euler(onPart);
      t[0] = 2 * t[0]!;
      for (let i = 0; i < n; i += 1) {
        if (!Number.isFinite(y[i]!)) {
          for (let j = 0; j < n; j += 1) {
            y[j] = start[j]!;
            s[j] = start[j]!;
          }
          this.failed = true;
          t[0] = 4 * t[0]!;
          return;
        }
      }
    }
    t[0] = 4 * t[0]!;
  }

  /** Counts back to zero: a new run begins. */
  clear(): void {
    this.refined = 0;
    this.replaced = 0;
    this.failed = false;
  }

  /** True after a step whose last resort gave no number either; the state is the last good one. */
  failed = false;

  private attempt(): boolean {
    const { step, elimination } = this.circuit;
    step.t[1] = 2 / step.t[0]!;
    step.ratesAndJacobian();
    step.factor();
    step.stageOne();
    step.rates();
    step.stageTwo();
    step.rates();
    step.stageThree();
    return step.J[elimination.size]! >= 0.1 && step.e[0]! <= 1;
  }

  /** y = s. */
  accept(): void {
    const { y, s } = this.circuit.step;
    for (let i = 0; i < y.length; i += 1) y[i] = s[i]!;
  }

  private euler(onPart: LedgerPart): void {
    const { step } = this.circuit;
    const { y, s, k1, t, d } = step;
    t[1] = 1 / t[0]!;
    step.ratesAndJacobian();
    step.factor();
    step.solve();
    onPart.part(d, t);
    for (let i = 0; i < y.length; i += 1) {
      y[i] = y[i]! + k1[i]!;
      s[i] = y[i]!;
    }
  }
}

/** Gets the ledger powers (from place n of `d`) at the start of each part of a step; `length[0]` is that part's length, s. */
export interface LedgerPart {
  part(d: Float64Array, length: Float64Array): void;
}
