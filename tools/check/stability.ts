import type { Circuit } from '../../runtime/circuit/build.js';
import type { Plant } from '../../runtime/plant.js';
import { type Mode, modesAt } from './modes.js';

export interface StabilityMargin {
  /** Largest real part of an eigenvalue met, 1/s: above zero something grew by itself, as a vehicle does downhill. */
  readonly growth: number;
  /** The states that carry it. */
  readonly growing: readonly string[];
  /** Largest |R(lambda h)| of the method among modes that decay within a substep: below 1, they cannot ring up. */
  readonly amplification: number;
}

/** Gathers eigenvalues along a drive and says how far the circuit and the method are from growing. */
export class Stability {
  private growth = Number.NEGATIVE_INFINITY;
  private growing: readonly string[] = [];
  private amplification = 0;

  constructor(
    private readonly circuit: Circuit,
    private readonly substep: number,
  ) {}

  look(plant: Plant): Mode[] {
    const modes = modesAt(this.circuit, plant.y, plant.u, plant.m);
    for (const mode of modes) {
      if (mode.real > this.growth) {
        this.growth = mode.real;
        this.growing = mode.carriers.map((carrier) => carrier.path);
      }
      if (-mode.real * this.substep > 1)
        this.amplification = Math.max(
          this.amplification,
          amplification(mode.real * this.substep, mode.imaginary * this.substep),
        );
    }
    return modes;
  }

  margin(): StabilityMargin {
    return {
      growth: Number.isFinite(this.growth) ? this.growth : 0,
      growing: this.growth > 0 ? this.growing : [],
      amplification: this.amplification,
    };
  }
}

/** |R(z)| of RODAS3 for z = x + i y, by its stages on y' = lambda y (see runtime/solver/rodas3.ts). */
export function amplification(x: number, y: number): number {
  type Complex = readonly [number, number];
  const add = (...terms: Complex[]): Complex => [
    terms.reduce((sum, term) => sum + term[0], 0),
    terms.reduce((sum, term) => sum + term[1], 0),
  ];
  const times = (factor: number, a: Complex): Complex => [factor * a[0], factor * a[1]];
  const product = (a: Complex, b: Complex): Complex => [a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]];
  const z: Complex = [x, y];
  const size = (2 - x) ** 2 + y ** 2;
  // 1 / (2 - z)
  const inverse: Complex = [(2 - x) / size, y / size];
  const one: Complex = [1, 0];
  const k1 = product(inverse, z);
  const k2 = product(inverse, add(z, times(4, k1)));
  const k3 = product(inverse, add(product(z, add(one, times(2, k1))), k1, times(-1, k2)));
  const k4 = product(inverse, add(product(z, add(one, times(2, k1), k3)), k1, times(-1, k2), times(-8 / 3, k3)));
  return Math.hypot(...add(one, times(2, k1), k3, k4));
}
