import { rodas3Stages } from '../solver/rodas3-code.js';
import type { Circuit } from './build.js';
import { places } from './build.js';
import { cLanguage, type Output, printChunks } from './emit.js';

/**
 * The same circuit as a C11 file: every function that a step is made of, from the same graph, and the step itself with
 * its safety net (see solver/rodas3.ts). It needs nothing but the mathematics library. Compiled without contraction of
 * products and sums it gives what the JavaScript gives but for the last bits of exp, log and the like.
 *
 *   oilspring_rates(y, u, m, d)                 d = dy/dt
 *   oilspring_rates_and_jacobian(y, u, m, d, J) d with the ledger rates behind it, J in the order of its comment
 *   oilspring_update(y, u, m, h, n)             n = memory after a substep of length h that has led to y
 *   oilspring_observe(y, u, m, out)             readings, ledger rates, energy, holdings
 *   oilspring_factor(J, c), oilspring_solve(J, b, x)   (c I - J) x = b, in place
 *   oilspring_step(y, u, m, h, substeps, counts)       advances y and m by substeps of h, each by itself: no strides;
 *                                                      counts[0], [1]: refined, replaced
 */
export function printC(circuit: Circuit): string {
  const { graph, outputs, elimination, jacobian, states, memory, commands, readings } = circuit;
  const at = places(circuit);
  const parts: string[] = [];
  const constants = new Set(['y', 'u', 'm', 'b']);
  const scalars = new Set(['h', 'c']);
  const parameter = (name: string, writes: string) =>
    scalars.has(name)
      ? `double ${name}`
      : `${constants.has(name) && name !== writes ? 'const ' : ''}double *restrict ${name}`;
  const write = (name: string, parameters: readonly string[], lines: readonly string[], writes = '') =>
    parts.push(
      `void ${name}(${parameters.map((one) => parameter(one, writes)).join(', ')}) {\n${lines.map((line) => `  ${line}`).join('\n')}\n}`,
    );
  const evaluation = (name: string, parameters: readonly string[], list: readonly Output[]) => {
    const { chunks, spills } = printChunks(graph, list, cLanguage, largestFunction);
    if (chunks.length === 1) return write(name, parameters, chunks[0]!.lines);
    parts.push(`static double ${name}_w[${Math.max(1, spills)}];`);
    for (const [i, chunk] of chunks.entries()) write(`${name}_${i}`, [...parameters, 'w'], chunk.lines);
    write(
      name,
      parameters,
      chunks.map((_, i) => `${name}_${i}(${parameters.join(', ')}, ${name}_w);`),
    );
  };
  evaluation('oilspring_rates', ['y', 'u', 'm', 'd'], outputs.rates);
  evaluation('oilspring_rates_and_jacobian', ['y', 'u', 'm', 'd', 'J'], outputs.ratesAndJacobian);
  evaluation(
    'oilspring_update',
    ['y', 'u', 'm', 'h', 'n'],
    outputs.update.map((output) => ({ ...output, array: 'n' })),
  );
  evaluation('oilspring_observe', ['y', 'u', 'm', 'out'], outputs.observe);
  write('oilspring_factor', ['J', 'c'], elimination.factorLines(cLanguage));
  write(
    'oilspring_solve',
    ['J', 'b', 'x'],
    elimination.solveLines(cLanguage, 'x', (state) => `b[${state}]`),
  );
  const stages = rodas3Stages(
    elimination,
    states.map((state) => state.errorWeight),
    circuit.strideWeights,
    cLanguage,
  );
  for (const stage of stages) write(stage.name, stage.parameters, stage.lines);
  const names = (title: string, list: readonly { readonly path: string; readonly unit: string }[]) =>
    list.map((one, i) => ` *   ${title}[${i}] ${one.path}, ${one.unit}`).join('\n');
  return `/*
 * ${circuit.name.replaceAll('*/', '')}, printed by oilspring.
 *
${names('y', states)}
${names('u', commands)}
${names('m', memory)}
${names('out', readings)}
 */
#include <math.h>
#include <string.h>

#define OILSPRING_STATES ${states.length}
#define OILSPRING_COMMANDS ${commands.length}
#define OILSPRING_MEMORY ${memory.length}
#define OILSPRING_RATES ${at.rateCount}
#define OILSPRING_JACOBIAN ${jacobian.rows.length}
#define OILSPRING_FACTORS ${elimination.size}
#define OILSPRING_OBSERVED ${at.observeCount}

static inline double oilspring_sign(double x) { return x > 0 ? 1 : x < 0 ? -1 : x; }
static inline double oilspring_max(double a, double b) { return a > b || a != a ? a : b; }
static inline double oilspring_min(double a, double b) { return a < b || a != a ? a : b; }

/* Row and column of each value of the Jacobian. */
const int oilspring_rows[] = {${jacobian.rows.join(', ') || '0'}};
const int oilspring_columns[] = {${jacobian.columns.join(', ') || '0'}};

${parts.join('\n\n')}

static double d[OILSPRING_RATES], J[OILSPRING_FACTORS + 1], s[OILSPRING_STATES], b[OILSPRING_STATES], e[2];
static double k1[OILSPRING_STATES], k2[OILSPRING_STATES], k3[OILSPRING_STATES], k4[OILSPRING_STATES];
static double next[OILSPRING_MEMORY + 1];

/* One attempt at a step of length h from y: the new state in s; 0 when its error or its pivots are not good enough. */
static int attempt(const double *y, const double *u, const double *m, double h) {
  oilspring_rates_and_jacobian(y, u, m, d, J);
  oilspring_factor(J, 2 / h);
  stageOne(J, d, y, h, k1, k2, s);
  oilspring_rates(s, u, m, b);
  stageTwo(J, b, h, k1, k2, k3, s);
  oilspring_rates(s, u, m, b);
  stageThree(J, b, h, k1, k2, k3, k4, s, e);
  return J[OILSPRING_FACTORS] >= 0.1 && e[0] <= 1;
}

static void remember(const double *y, const double *u, double *m, double h) {
  oilspring_update(y, u, m, h, next);
  memcpy(m, next, OILSPRING_MEMORY * sizeof(double));
}

void oilspring_step(double *y, const double *u, double *m, double h, int substeps, long *counts) {
  remember(y, u, m, 0);
  for (int k = 0; k < substeps; k += 1, remember(y, u, m, h)) {
    if (attempt(y, u, m, h)) {
      memcpy(y, s, sizeof s);
      continue;
    }
    counts[0] += 1;
    for (int part = 0; part < 4; part += 1) {
      if (attempt(y, u, m, h / 4)) {
        memcpy(y, s, sizeof s);
        continue;
      }
      counts[1] += 1;
      for (int i = 0; i < OILSPRING_STATES; i += 1) y[i] += k1[i];
      oilspring_rates_and_jacobian(y, u, m, d, J);
      oilspring_factor(J, 1 / (h / 8));
      oilspring_solve(J, d, k1);
      for (int i = 0; i < OILSPRING_STATES; i += 1) y[i] += k1[i];
    }
  }
}
`;
}

/** Operations in one C function, at most: compilers take longer than in proportion. */
const largestFunction = 5000;
