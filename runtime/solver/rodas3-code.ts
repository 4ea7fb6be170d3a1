import type { Elimination } from '../circuit/elimination.js';
import type { Dialect } from '../circuit/emit.js';

/**
 * The stages of one RODAS3 step (see rodas3.ts) as straight-line code around the elimination of its circuit: each vector
 * operation stands where its values are at hand.
 *
 *   stageOne(J, d, y, h, k1, k2, s)            K1 and K2 from d = f(y); s = y + 2 K1
 *   stageTwo(J, b, h, k1, k2, k3, s)           K3 from b = f(s); s = s + K3
 *   stageThree(J, b, h, k1, k2, k3, k4, s, e)  K4 from b = f(s); s = s + K4, the new state; e[0] = the largest weighted
 *                                              error estimate, not a number where any estimate is none
 *   strideError(k4, e)                         e[1] = the largest estimate weighted by what a stride may err
 */
export interface StageCode {
  readonly name: string;
  /** Arrays but for `h`, the length of the step. */
  readonly parameters: readonly string[];
  readonly lines: readonly string[];
}

/**
 * A stride may err by 1/25 of what the safety net lets pass, and by 2e-5 of a state's scale; by 1e-7 where the state is an
 * energy, for these errors add up in the ledger. States that no rate depends on are not asked.
 */
export function strideWeightsOf(
  states: readonly { readonly errorWeight: number; readonly scale: number; readonly unit: string }[],
  columns: readonly number[],
): number[] {
  const used = new Set(columns);
  return states.map(({ errorWeight, scale, unit }, i) =>
    used.has(i) ? (errorWeight > 0 ? 25 * errorWeight : (unit === 'J' ? 1e7 : 5e4) / scale) : 0,
  );
}

export function rodas3Stages(
  elimination: Elimination,
  errorWeights: readonly number[],
  strideWeights: readonly number[],
  dialect: Dialect,
): StageCode[] {
  const { local, number, math } = dialect;
  // pieces of a cut function see only the arrays
  const four = elimination.cut ? `(${number(4)} / h)` : 'f';
  const inverse = elimination.cut ? `(${number(1)} / h)` : 'g';
  const two = number(2);
  const third = number(8 / 3);
  const largest = (place: string, weights: readonly number[]) => [
    `${place} = ${number(0)};`,
    ...weights.flatMap((weight, i) =>
      weight > 0
        ? [
            `${local}e${i} = ${place};`,
            `${local}q${i} = ${math('abs')}(k4[${i}]) * ${number(weight)};`,
            `${place} = e${i} > q${i} ? e${i} : q${i};`,
          ]
        : [],
    ),
  ];
  return [
    {
      name: 'stageOne',
      parameters: ['J', 'd', 'y', 'h', 'k1', 'k2', 's'],
      lines: [
        ...(elimination.cut ? [] : [`${local}f = ${number(4)} / h;`]),
        ...elimination.solveLines(
          dialect,
          'k1',
          (i) => `d[${i}]`,
          (i) => [`s[${i}] = y[${i}] + ${two} * k1[${i}];`],
        ),
        ...elimination.solveLines(dialect, 'k2', (i) => `d[${i}] + ${four} * k1[${i}]`),
      ],
    },
    {
      name: 'stageTwo',
      parameters: ['J', 'b', 'h', 'k1', 'k2', 'k3', 's'],
      lines: [
        ...(elimination.cut ? [] : [`${local}g = ${number(1)} / h;`]),
        ...elimination.solveLines(
          dialect,
          'k3',
          (i) => `b[${i}] + ${inverse} * (k1[${i}] - k2[${i}])`,
          (i) => [`s[${i}] = s[${i}] + k3[${i}];`],
        ),
      ],
    },
    {
      name: 'stageThree',
      parameters: ['J', 'b', 'h', 'k1', 'k2', 'k3', 'k4', 's', 'e'],
      lines: [
        ...(elimination.cut ? [] : [`${local}g = ${number(1)} / h;`]),
        ...elimination.solveLines(
          dialect,
          'k4',
          (i) => `b[${i}] + ${inverse} * (k1[${i}] - k2[${i}] - ${third} * k3[${i}])`,
          (i) => [`s[${i}] = s[${i}] + k4[${i}];`],
        ),
        ...largest('e[0]', errorWeights),
        // an infinite estimate and one that is no number both make this no number
        `e[0] = e[0] + ${number(0)} * ${balancedSum(errorWeights.map((_, i) => `k4[${i}]`))};`,
      ],
    },
    { name: 'strideError', parameters: ['k4', 'e'], lines: largest('e[1]', strideWeights) },
  ];
}

/** Terms added in pairs, so that the additions do not wait for each other. */
function balancedSum(terms: readonly string[]): string {
  if (terms.length === 1) return terms[0]!;
  const middle = terms.length >> 1;
  return `(${balancedSum(terms.slice(0, middle))} + ${balancedSum(terms.slice(middle))})`;
}
