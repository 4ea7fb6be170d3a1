import type { Elimination } from '../circuit/elimination.js';
import type { Dialect } from '../circuit/emit.js';

/**
 * The stages of one RODAS3 step (see rodas3.ts) as straight-line code around the elimination of its circuit: each vector
 * operation stands where its values are at hand.
 *
 *   stageOne(A, d, y, h, k1, k2, s)            K1 and K2 from d = f(y); s = y + 2 K1
 *   stageTwo(A, b, h, k1, k2, k3, s)           K3 from b = f(s); s = s + K3
 *   stageThree(A, b, h, k1, k2, k3, k4, s, e)  K4 from b = f(s); s = s + K4, the new state; e[0] = the largest weighted
 *                                              error estimate, not a number where any estimate is none
 */
export interface StageCode {
  readonly name: string;
  /** Arrays but for `h`, the length of the step. */
  readonly parameters: readonly string[];
  readonly lines: readonly string[];
}

export function rodas3Stages(elimination: Elimination, errorWeights: readonly number[], dialect: Dialect): StageCode[] {
  const { local, number, math } = dialect;
  const four = `${local}f = 4 / h;`;
  const inverse = `${local}g = 1 / h;`;
  const third = number(8 / 3);
  // pieces of a cut function see only the arrays
  const f = elimination.cut ? '(4 / h)' : 'f';
  const g = elimination.cut ? '(1 / h)' : 'g';
  const k4 = errorWeights.map(() => '');
  const last = elimination.solveLines(
    dialect,
    'k4',
    (i) => `b[${i}] + ${g} * (k1[${i}] - k2[${i}] - ${third} * k3[${i}])`,
    (i, solution) => {
      k4[i] = solution;
      return [`s[${i}] += ${solution};`];
    },
  );
  const estimates = errorWeights.flatMap((weight, i) =>
    weight > 0 ? [`${math('abs')}(${k4[i]!}) * ${number(weight)}`] : [],
  );
  const largest = estimates.reduce((most, estimate) => `${math('max')}(${most}, ${estimate})`, number(0));
  return [
    {
      name: 'stageOne',
      parameters: ['A', 'd', 'y', 'h', 'k1', 'k2', 's'],
      lines: [
        ...(elimination.cut ? [] : [four]),
        ...elimination.solveLines(
          dialect,
          'k1',
          (i) => `d[${i}]`,
          (i, k1) => [`s[${i}] = y[${i}] + 2 * ${k1};`],
        ),
        ...elimination.solveLines(dialect, 'k2', (i) => `d[${i}] + ${f} * k1[${i}]`),
      ],
    },
    {
      name: 'stageTwo',
      parameters: ['A', 'b', 'h', 'k1', 'k2', 'k3', 's'],
      lines: [
        ...(elimination.cut ? [] : [inverse]),
        ...elimination.solveLines(
          dialect,
          'k3',
          (i) => `b[${i}] + ${g} * (k1[${i}] - k2[${i}])`,
          (i, k3) => [`s[${i}] += ${k3};`],
        ),
      ],
    },
    {
      name: 'stageThree',
      parameters: ['A', 'b', 'h', 'k1', 'k2', 'k3', 'k4', 's', 'e'],
      lines: [
        ...(elimination.cut ? [] : [inverse]),
        ...last,
        `e[0] = ${largest};`,
        // an infinite estimate and one that is no number both make this no number
        `e[0] += ${number(0)} * (${balancedSum(k4)});`,
      ],
    },
  ];
}

/** Terms added in pairs, so that the additions do not wait for each other. */
function balancedSum(terms: readonly string[]): string {
  if (terms.length === 1) return terms[0]!;
  const middle = terms.length >> 1;
  return `(${balancedSum(terms.slice(0, middle))} + ${balancedSum(terms.slice(middle))})`;
}
