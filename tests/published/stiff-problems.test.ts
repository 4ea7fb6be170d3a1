import { Solver } from 'odex';
import { describe, expect, it } from 'vitest';
import { integrate, problem } from '../runtime/circuit/problem.js';

/** Standard stiff problems through the product's builder and solver. Sources: Hairer & Wanner, Solving Ordinary
 * Differential Equations II; the IVP Test Set (Mazzia & Magherini, release 2.4) for the reference values. */

const kaps = () =>
  problem({ a: 1, b: 1 }, ({ state, derivative }) => {
    derivative.a = -(1000 + 2) * state.a + 1000 * state.b * state.b;
    derivative.b = state.a - state.b - state.b * state.b;
  });
const robertson = () =>
  problem({ a: 1, b: 0, c: 0 }, ({ state, derivative }) => {
    const slow = 0.04 * state.a;
    const back = 1e4 * state.b * state.c;
    const fast = 3e7 * state.b * state.b;
    derivative.a = back - slow;
    derivative.b = slow - back - fast;
    derivative.c = fast;
  });

describe('stability function of RODAS3 (Sandu et al. 1997), R(z) on the real axis', () => {
  for (const [z, expected] of [
    [-1, 0.3621399],
    [-10, -0.1201131],
    [-100, -0.0246209],
  ] as const) {
    it(`R(${z})`, () => {
      const circuit =
        z === -1
          ? problem({ a: 1 }, ({ state, derivative }) => {
              derivative.a = -1 * state.a;
            })
          : z === -10
            ? problem({ a: 1 }, ({ state, derivative }) => {
                derivative.a = -10 * state.a;
              })
            : problem({ a: 1 }, ({ state, derivative }) => {
                derivative.a = -100 * state.a;
              });
      expect(integrate(circuit, 1, 1)[0]).toBeCloseTo(expected, 6);
    });
  }
});

describe('Kaps problem, mu = 1000 (Kaps & Wanner 1981), exact solution e^-2t, e^-t', () => {
  const errors = (steps: number) => {
    const y = integrate(kaps(), 1, steps);
    return [Math.abs(y[0]! - Math.exp(-2)), Math.abs(y[1]! - Math.exp(-1))] as const;
  };
  it('keeps order 3 in the slow component and the errors computed independently', () => {
    const [a40, b40] = errors(40);
    const [, b80] = errors(80);
    const [a160, b160] = errors(160);
    expect(a40 / 1.7864e-6).toBeCloseTo(1, 2);
    expect(b40 / 1.1701e-7).toBeCloseTo(1, 2);
    expect(a160 / 1.9755e-7).toBeCloseTo(1, 2);
    expect(Math.log2(b40 / b80)).toBeGreaterThan(2.9);
    expect(Math.log2(b80 / b160)).toBeGreaterThan(2.9);
  });
});

describe('Robertson (1966), reference values of the IVP Test Set', () => {
  it('t = 0.4 and t = 40', () => {
    const early = integrate(robertson(), 0.4, 400);
    expect(early[0]! / 0.985172114).toBeCloseTo(1, 7);
    expect(early[1]! / 3.38639538e-5).toBeCloseTo(1, 6);
    const late = integrate(robertson(), 40, 40_000);
    expect(late[0]! / 0.715827069).toBeCloseTo(1, 7);
    expect(late[1]! / 9.18553476e-6).toBeCloseTo(1, 6);
    expect(late[0]! + late[1]! + late[2]!).toBeCloseTo(1, 12);
  });
});

describe('HIRES (Schäfer 1975), IVP Test Set reference at t = 321.8122', () => {
  it('all eight components', () => {
    const circuit = problem(
      { y1: 1, y2: 0, y3: 0, y4: 0, y5: 0, y6: 0, y7: 0, y8: 0.0057 },
      ({ state, derivative }) => {
        const product = 280 * state.y6 * state.y8;
        derivative.y1 = -1.71 * state.y1 + 0.43 * state.y2 + 8.32 * state.y3 + 0.0007;
        derivative.y2 = 1.71 * state.y1 - 8.75 * state.y2;
        derivative.y3 = -10.03 * state.y3 + 0.43 * state.y4 + 0.035 * state.y5;
        derivative.y4 = 8.32 * state.y2 + 1.71 * state.y3 - 1.12 * state.y4;
        derivative.y5 = -1.745 * state.y5 + 0.43 * state.y6 + 0.43 * state.y7;
        derivative.y6 = -product + 0.69 * state.y4 + 1.71 * state.y5 - 0.43 * state.y6 + 0.69 * state.y7;
        derivative.y7 = product - 1.81 * state.y7;
        derivative.y8 = -product + 1.81 * state.y7;
      },
    );
    const reference = [
      0.7371312573325668e-3, 0.1442485726316185e-3, 0.5888729740967575e-4, 0.1175651343283149e-2, 0.2386356198831331e-2,
      0.6238968252742796e-2, 0.2849998395185769e-2, 0.2850001604814231e-2,
    ];
    const y = integrate(circuit, 321.8122, 32_000);
    reference.forEach((value, i) => {
      expect(Math.abs(y[i]! / value - 1)).toBeLessThan(1e-5);
    });
  });
});

describe('van der Pol (Hairer & Wanner), t = 2', () => {
  it('eps = 1e-6: falls onto the IVP Test Set value as the fixed step shrinks', () => {
    const circuit = problem({ a: 2, b: 0 }, ({ state, derivative }) => {
      derivative.a = state.b;
      derivative.b = 1e6 * ((1 - state.a * state.a) * state.b - state.a);
    });
    const error = (steps: number) => Math.abs(integrate(circuit, 2, steps)[0]! - 1.706167732170483);
    const coarse = error(4_000_000);
    const fine = error(8_000_000);
    expect(coarse).toBeLessThan(0.1);
    expect(fine).toBeLessThan(coarse / 3);
  });
  it('eps = 1e-3: agrees with a general extrapolation code (odex 2.0.4, tolerance 1e-11)', () => {
    const circuit = problem({ a: 2, b: 0 }, ({ state, derivative }) => {
      derivative.a = state.b;
      derivative.b = 1e3 * ((1 - state.a * state.a) * state.b - state.a);
    });
    const solver = new Solver(2);
    solver.absoluteTolerance = 1e-11;
    solver.relativeTolerance = 1e-11;
    solver.maxSteps = 1_000_000;
    const equations = (_t: number, y: readonly number[]) => [y[1]!, 1e3 * ((1 - y[0]! * y[0]!) * y[1]! - y[0]!)];
    const reference = solver.solve(equations, 0, [2, 0], 2).y;
    const y = integrate(circuit, 2, 100_000);
    expect(Math.abs(y[0]! - reference[0]!)).toBeLessThan(1e-6);
    expect(Math.abs(y[1]! - reference[1]!)).toBeLessThan(1e-6);
  });
});
