import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import type { Circuit } from '../../runtime/circuit/build.js';
import { places } from '../../runtime/circuit/build.js';

/** One natural mode of the linearised circuit. */
export interface Mode {
  /** Eigenvalue, 1/s and rad/s. */
  readonly real: number;
  readonly imaginary: number;
  /** 1/|real|, s. */
  readonly timeConstant: number;
  /** Hz; 0 for a mode that does not swing. */
  readonly frequency: number;
  readonly damping: number;
  /** The states that carry it, largest share first. */
  readonly carriers: readonly { readonly path: string; readonly share: number }[];
}

/** Modes of the circuit at one state, fastest first. Eigenvalues of the exact Jacobian by ml-matrix after balancing (Osborne 1960). */
export function modesAt(circuit: Circuit, y: Float64Array, u: Float64Array, m: Float64Array): Mode[] {
  const n = circuit.states.length;
  if (n === 0) return [];
  const J = new Float64Array(circuit.jacobian.rows.length);
  circuit.functions.ratesAndJacobian(y, u, m, new Float64Array(places(circuit).rateCount), J);
  const dense = Array.from({ length: n }, () => new Array<number>(n).fill(0));
  circuit.jacobian.rows.forEach((row, i) => {
    const value = J[i]!;
    dense[row]![circuit.jacobian.columns[i]!] = Number.isFinite(value) ? value : 0;
  });
  balance(dense);
  const decomposition = new EigenvalueDecomposition(new Matrix(dense));
  const real = decomposition.realEigenvalues;
  const imaginary = decomposition.imaginaryEigenvalues;
  const vectors = decomposition.eigenvectorMatrix;
  const modes: Mode[] = [];
  for (let k = 0; k < n; k += 1) {
    if (imaginary[k]! < 0) continue;
    const shares = circuit.states.map((state, i) => {
      const a = vectors.get(i, k);
      const b = imaginary[k]! > 0 && k + 1 < n ? vectors.get(i, k + 1) : 0;
      return { path: state.path, share: a * a + b * b };
    });
    const total = shares.reduce((sum, one) => sum + one.share, 0) || 1;
    const size = Math.hypot(real[k]!, imaginary[k]!);
    modes.push({
      real: real[k]!,
      imaginary: imaginary[k]!,
      timeConstant: 1 / Math.max(Math.abs(real[k]!), 1e-12),
      frequency: imaginary[k]! / (2 * Math.PI),
      damping: size > 0 ? -real[k]! / size : 1,
      carriers: shares
        .map((one) => ({ path: one.path, share: one.share / total }))
        .sort((a, b) => b.share - a.share)
        .slice(0, 3)
        .filter((one) => one.share > 0.05),
    });
  }
  return modes.sort((a, b) => Math.hypot(b.real, b.imaginary) - Math.hypot(a.real, a.imaginary));
}

/** Scales rows and columns by powers of two until their sizes agree: the eigenvalues stay, rounding gets small. */
function balance(a: number[][]): void {
  const n = a.length;
  for (let round = 0; round < 30; round += 1) {
    let settled = true;
    for (let i = 0; i < n; i += 1) {
      let row = 0;
      let column = 0;
      for (let j = 0; j < n; j += 1) {
        if (j === i) continue;
        row += Math.abs(a[i]![j]!);
        column += Math.abs(a[j]![i]!);
      }
      if (row === 0 || column === 0) continue;
      const factor = 2 ** Math.round(0.5 * Math.log2(row / column));
      if (factor === 1) continue;
      settled = false;
      for (let j = 0; j < n; j += 1) {
        a[i]![j]! /= factor;
        a[j]![i]! *= factor;
      }
    }
    if (settled) return;
  }
}
