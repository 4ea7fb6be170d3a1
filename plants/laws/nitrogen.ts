/**
 * Nitrogen by the reference equation of Span, Lemmon, Jacobsen, Wagner and Yokozeki, J. Phys. Chem. Ref. Data 29 (2000)
 * 1361: the reduced Helmholtz energy a(delta, tau) with its derivatives, evaluated plainly. For checks and for building
 * tables; not an element law (it loops). Valid 63.151 K to 1000 K, up to 2200 MPa. SI, specific to mass.
 */

export const CRITICAL_TEMPERATURE = 126.192;
export const CRITICAL_MOLAR_DENSITY = 11183.901464580624;
export const MOLAR_MASS = 0.02801348;
export const MOLAR_GAS_CONSTANT = 8.31451;

const gasConstant = MOLAR_GAS_CONSTANT / MOLAR_MASS;
const criticalDensity = CRITICAL_MOLAR_DENSITY * MOLAR_MASS;

/** Ideal part: a1, a2, then (k, a) of a tau^k, then a6 and a7 of a6 ln(1 - exp(-a7 tau)). */
const a1 = -12.76952708;
const a2 = -0.00784163;
const idealPowers = [
  [-1, -0.0001934819],
  [-2, -1.247742e-5],
  [-3, 6.678326e-8],
] as const;
const a6 = 1.012941;
const a7 = 3364.011 / CRITICAL_TEMPERATURE;

/** n, d, t, l of n delta^d tau^t exp(-delta^l), the exponential only where l > 0. */
const polynomial = [
  [0.924803575275, 1, 0.25, 0],
  [-0.492448489428, 1, 0.875, 0],
  [0.661883336938, 2, 0.5, 0],
  [-1.92902649201, 2, 0.875, 0],
  [-0.0622469309629, 3, 0.375, 0],
  [0.349943957581, 3, 0.75, 0],
  [0.564857472498, 1, 0.5, 1],
  [-1.61720005987, 1, 0.75, 1],
  [-0.481395031883, 1, 2, 1],
  [0.421150636384, 3, 1.25, 1],
  [-0.0161962230825, 3, 3.5, 1],
  [0.172100994165, 4, 1, 1],
  [0.00735448924933, 6, 0.5, 1],
  [0.0168077305479, 6, 3, 1],
  [-0.00107626664179, 7, 0, 1],
  [-0.0137318088513, 7, 2.75, 1],
  [0.000635466899859, 8, 0.75, 1],
  [0.00304432279419, 8, 2.5, 1],
  [-0.0435762336045, 1, 4, 2],
  [-0.0723174889316, 2, 6, 2],
  [0.0389644315272, 3, 6, 2],
  [-0.021220136391, 4, 3, 2],
  [0.00408822981509, 5, 3, 2],
  [-5.51990017984e-5, 8, 6, 2],
  [-0.0462016716479, 4, 16, 3],
  [-0.00300311716011, 5, 11, 3],
  [0.0368825891208, 5, 15, 3],
  [-0.0025585684622, 8, 12, 3],
  [0.00896915264558, 3, 12, 4],
  [-0.0044151337035, 5, 7, 4],
  [0.00133722924858, 6, 4, 4],
  [0.000264832491957, 9, 16, 4],
] as const;

/** n, d, t, eta, beta, gamma of n delta^d tau^t exp(-eta (delta - 1)^2 - beta (tau - gamma)^2). */
const gaussian = [
  [19.6688194015, 1, 0, 20, 325, 1.16],
  [-20.911560073, 1, 1, 20, 325, 1.16],
  [0.0167788306989, 3, 2, 15, 300, 1.13],
  [2627.67566274, 2, 3, 25, 275, 1.25],
] as const;

/** What the equation says at one density and temperature. */
export interface NitrogenState {
  /** Pa */ readonly pressure: number;
  /** J/kg, from the equation's own zero */ readonly energy: number;
  /** J/(kg K), from the equation's own zero */ readonly entropy: number;
  /** J/(kg K) */ readonly heatCapacity: number;
  /** J/(kg K) */ readonly heatCapacityAtPressure: number;
  /** m/s */ readonly soundSpeed: number;
  /** Pa/K at constant density */ readonly pressureByTemperature: number;
  /** J/kg at constant temperature */ readonly pressureByDensity: number;
}

/** Evaluates the equation at `density` kg/m3 and `temperature` K. */
export function nitrogen(density: number, temperature: number): NitrogenState {
  const delta = density / criticalDensity;
  const tau = CRITICAL_TEMPERATURE / temperature;
  const decay = Math.exp(-a7 * tau);
  let ideal = Math.log(delta) + a1 + a2 * tau + 2.5 * Math.log(tau) + a6 * Math.log(1 - decay);
  let idealT = a2 + 2.5 / tau + (a6 * a7 * decay) / (1 - decay);
  let idealTT = -2.5 / (tau * tau) - (a6 * a7 * a7 * decay) / (1 - decay) ** 2;
  for (const [k, a] of idealPowers) {
    ideal += a * tau ** k;
    idealT += a * k * tau ** (k - 1);
    idealTT += a * k * (k - 1) * tau ** (k - 2);
  }
  let r = 0;
  let rD = 0;
  let rDD = 0;
  let rT = 0;
  let rTT = 0;
  let rDT = 0;
  // each term f has delta f_delta = f D, tau f_tau = f T, and second derivatives from those of D and T
  const add = (f: number, D: number, DD: number, T: number, TT: number) => {
    r += f;
    rD += f * D;
    rDD += f * DD;
    rT += f * T;
    rTT += f * TT;
    rDT += f * D * T;
  };
  for (const [n, d, t, l] of polynomial) {
    const power = l > 0 ? delta ** l : 0;
    const D = d - l * power;
    add(n * delta ** d * tau ** t * Math.exp(-power), D, D * (D - 1) - l * l * power, t, t * (t - 1));
  }
  for (const [n, d, t, eta, beta, gamma] of gaussian) {
    const x = delta - 1;
    const y = tau - gamma;
    const f = n * delta ** d * tau ** t * Math.exp(-eta * x * x - beta * y * y);
    const D = d - 2 * eta * delta * x;
    const T = t - 2 * beta * tau * y;
    add(f, D, D * D - d - 2 * eta * delta * delta, T, T * T - t - 2 * beta * tau * tau);
  }
  // the sums above carry the factors delta and tau: rD is delta alphar_delta and so on
  const compressibility = 1 + rD;
  const byDensity = gasConstant * temperature * (1 + 2 * rD + rDD);
  const byTemperature = gasConstant * density * (1 + rD - rDT);
  const heatCapacity = -gasConstant * (tau * tau * idealTT + rTT);
  const heatCapacityAtPressure =
    heatCapacity + (temperature * byTemperature * byTemperature) / (density * density * byDensity);
  const tauSlope = tau * idealT + rT;
  return {
    pressure: density * gasConstant * temperature * compressibility,
    energy: gasConstant * temperature * tauSlope,
    entropy: gasConstant * (tauSlope - ideal - r),
    heatCapacity,
    heatCapacityAtPressure,
    soundSpeed: Math.sqrt((byDensity * heatCapacityAtPressure) / heatCapacity),
    pressureByTemperature: byTemperature,
    pressureByDensity: byDensity,
  };
}

/** Density, kg/m3, at `pressure` Pa and `temperature` K above the critical one, by Newton with a bracket. */
export function nitrogenDensity(pressure: number, temperature: number): number {
  let low = 0;
  let high = 1200;
  let density = Math.min(800, pressure / (gasConstant * temperature));
  for (let i = 0; i < 200; i += 1) {
    const state = nitrogen(density, temperature);
    if (state.pressure > pressure) high = density;
    else low = density;
    let next = density - (state.pressure - pressure) / state.pressureByDensity;
    if (!(next > low && next < high)) next = 0.5 * (low + high);
    if (Math.abs(next - density) <= 1e-14 * density) return next;
    density = next;
  }
  return density;
}
