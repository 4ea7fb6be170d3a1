import type { Circuit } from '../circuit/build.js';
import { places } from '../circuit/build.js';

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
 * Safety net: where the weighted error estimate is above 1 (or not a number), or the least pivot below a tenth of its
 * healthy size, the substep is done again as four quarters; a quarter that fails again is replaced by two linearly
 * implicit Euler half steps. The cost is bounded and the result deterministic; both are counted.
 */
export class Rodas3 {
  /** Substeps done again as quarters since the start. */
  refined = 0;
  /** Quarters replaced by Euler half steps since the start. */
  replaced = 0;
  /** Ledger powers at the beginning of the last substep: supplied, left, brought per stuff. */
  readonly ledgerRates: Float64Array;
  private readonly n: number;
  private readonly d: Float64Array;
  private readonly J: Float64Array;
  private readonly A: Float64Array;
  private readonly k1: Float64Array;
  private readonly k2: Float64Array;
  private readonly k3: Float64Array;
  private readonly k4: Float64Array;
  private readonly b: Float64Array;
  /** A stage's state; after the last stage the new state. */
  private readonly stage: Float64Array;
  private readonly estimate = new Float64Array(1);
  private readonly start: Float64Array;
  private readonly extra: number;

  constructor(
    private readonly circuit: Circuit,
    private readonly settings: { readonly net: boolean } = { net: true },
  ) {
    const n = circuit.states.length;
    const at = places(circuit);
    this.n = n;
    this.extra = at.rateCount - n;
    this.ledgerRates = new Float64Array(this.extra);
    const vector = () => new Float64Array(n);
    this.d = new Float64Array(at.rateCount);
    this.J = new Float64Array(circuit.jacobian.rows.length);
    this.A = new Float64Array(circuit.elimination.size + 1);
    this.k1 = vector();
    this.k2 = vector();
    this.k3 = vector();
    this.k4 = vector();
    this.b = vector();
    this.stage = vector();
    this.start = vector();
  }

  /**
   * One substep of length h, s, in place. `ledger` (supplied, left, brought) gets the integral of the ledger powers by
   * the left rectangle with h; the caller completes the trapezoid (see Plant).
   */
  substep(y: Float64Array, u: Float64Array, m: Float64Array, h: number, onPart: LedgerPart): void {
    const { start, n } = this;
    if (!this.settings.net) {
      this.attempt(y, u, m, h);
      onPart.part(this.d, h);
      this.accept(y);
      return;
    }
    const good = this.attempt(y, u, m, h);
    if (good) {
      onPart.part(this.d, h);
      this.accept(y);
      return;
    }
    this.refined += 1;
    const quarter = h / 4;
    for (let part = 0; part < 4; part += 1) {
      const fine = this.attempt(y, u, m, quarter);
      if (fine) {
        onPart.part(this.d, quarter);
        this.accept(y);
        continue;
      }
      this.replaced += 1;
      // the first half step is y + K1 (M was built for h/2), the second needs a fresh Jacobian
      onPart.part(this.d, quarter / 2);
      for (let i = 0; i < n; i += 1) {
        start[i] = y[i]!;
        y[i] = y[i]! + this.k1[i]!;
      }
      this.euler(y, u, m, quarter / 2, onPart);
      for (let i = 0; i < n; i += 1) {
        if (!Number.isFinite(y[i]!)) {
          for (let j = 0; j < n; j += 1) y[j] = start[j]!;
          this.failed = true;
          return;
        }
      }
    }
  }

  /** Counts back to zero: a new run begins. */
  clear(): void {
    this.refined = 0;
    this.replaced = 0;
    this.failed = false;
  }

  /** True after a step whose last resort gave no number either; the state is the last good one. */
  failed = false;

  private attempt(y: Float64Array, u: Float64Array, m: Float64Array, h: number): boolean {
    const { circuit, d, J, A, k1, k2, k3, k4, b, stage, estimate } = this;
    const { ratesAndJacobian, rates, factor, stageOne, stageTwo, stageThree } = circuit.functions;
    ratesAndJacobian(y, u, m, d, J);
    factor(J, 2 / h, A);
    stageOne(A, d, y, h, k1, k2, stage);
    rates(stage, u, m, b);
    stageTwo(A, b, h, k1, k2, k3, stage);
    rates(stage, u, m, b);
    stageThree(A, b, h, k1, k2, k3, k4, stage, estimate);
    return A[circuit.elimination.size]! >= 0.1 && estimate[0]! <= 1;
  }

  private accept(y: Float64Array): void {
    const { n, stage } = this;
    for (let i = 0; i < n; i += 1) y[i] = stage[i]!;
  }

  private euler(y: Float64Array, u: Float64Array, m: Float64Array, h: number, onPart: LedgerPart): void {
    const { circuit, n, d, J, A, k1 } = this;
    circuit.functions.ratesAndJacobian(y, u, m, d, J);
    circuit.functions.factor(J, 1 / h, A);
    circuit.functions.solve(A, d, k1);
    onPart.part(d, h);
    for (let i = 0; i < n; i += 1) y[i] = y[i]! + k1[i]!;
  }
}

/** Gets the ledger powers (from place n of `d`) at the start of each part of a step and that part's length, s. */
export interface LedgerPart {
  part(d: Float64Array, length: number): void;
}
