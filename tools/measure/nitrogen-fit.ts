import { Matrix, solve } from 'ml-matrix';
import { CRITICAL_TEMPERATURE, MOLAR_GAS_CONSTANT, MOLAR_MASS, nitrogen } from '../../plants/laws/nitrogen.js';

/**
 * Fits the residual Helmholtz energy of nitrogen, a/(R T) = sum x^i sum c_ij s^j with x = rho / 300 kg/m3, s = 300 K / T,
 * i from 1 to 6, j from 0 to 5, to the reference equation (Span et al. 2000), and prints the constants of
 * plants/laws/gas.ts. Least squares of relative errors of pressure, its two slopes and the heat capacity.
 *
 *   node dist/tools/measure/nitrogen-fit.js
 */
const R = MOLAR_GAS_CONSTANT / MOLAR_MASS;
const range = { coldest: 230, hottest: 500, densest: 470, highest: 62e6 };

function idealHeatCapacity(temperature: number): number {
  const y = 3364.011 / temperature;
  const e = Math.exp(-y);
  const t = temperature / CRITICAL_TEMPERATURE;
  const small = 2 * -0.0001934819 * t + 6 * -1.247742e-5 * t * t + 12 * 6.678326e-8 * t * t * t;
  return 2.5 - small + 1.012941 * e * (y / (1 - e)) ** 2;
}

const rows: number[][] = [];
const values: number[][] = [];
for (let a = 0; a < 25; a += 1) {
  for (let b = 1; b <= 24; b += 1) {
    const middle = (1 / range.coldest + 1 / range.hottest) / 2;
    const half = (1 / range.coldest - 1 / range.hottest) / 2;
    const temperature = 1 / (middle + half * Math.cos((Math.PI * (a + 0.5)) / 25));
    const density = range.densest * (0.5 - 0.5 * Math.cos((Math.PI * (b - 0.5)) / 24));
    const state = nitrogen(density, temperature);
    if (state.pressure > range.highest) continue;
    const x = density / 300;
    const s = 300 / temperature;
    const z = state.pressure / (density * R * temperature);
    const byTemperature = state.pressureByTemperature / (R * density);
    const byDensity = state.pressureByDensity / (R * temperature);
    const weights = [1 / z, 0.3, 0.3 / byTemperature, 0.3 / byDensity];
    const row: number[][] = [[], [], [], []];
    for (let i = 1; i <= 6; i += 1) {
      for (let j = 0; j <= 5; j += 1) {
        const f = x ** i * s ** j;
        [i, -j * (j - 1), i * (1 - j), i * (i + 1)].forEach((factor, k) => {
          row[k]!.push(weights[k]! * factor * f);
        });
      }
    }
    rows.push(...row);
    const residuals = [
      z - 1,
      state.heatCapacity / R - idealHeatCapacity(temperature),
      byTemperature - 1,
      byDensity - 1,
    ];
    values.push(...residuals.map((value, k) => [weights[k]! * value]));
  }
}
const found = solve(new Matrix(rows), new Matrix(values), true).to1DArray();
for (let i = 1; i <= 6; i += 1)
  for (let j = 0; j <= 5; j += 1)
    process.stdout.write(`export const FIT_${i}${j} = ${Number(found[6 * (i - 1) + j]!.toPrecision(13))};\n`);
