/** Laws of flow: orifices, valves, pipes, gas. Pure numbers, SI, absolute pressures; smooth where they are differentiated. */

export const CIRCLE_RATIO = Math.PI;

/** Thermal power, W, that a mass flow from a to b carries, with the heat content c T, J/kg, of the side it comes from. */
export function heatCarried(massFlow: number, contentA: number, contentB: number): number {
  return massFlow * (massFlow > 0 ? contentA : contentB);
}

/**
 * The root of a pressure difference with its sign, sqrt(|dp|) sign(dp), made smooth around zero:
 * dp / (dp^2 + dpc^2)^(1/4). `smoothing` dpc > 0, Pa. Low by 1 % at 5 dpc and by 0.04 % at 25 dpc; no static error.
 */
export function signedRoot(difference: number, smoothing: number): number {
  return difference / Math.sqrt(Math.sqrt(difference * difference + smoothing * smoothing));
}

/**
 * Mass flow from a to b through an orifice, kg/s: Cd A sqrt(2 rho dp), rho of the side it comes from (Merritt 1967).
 * `flowArea` is the effective one, Cd A, m2; densities > 0.
 */
export function orificeMassFlow(
  pressureA: number,
  pressureB: number,
  densityA: number,
  densityB: number,
  flowArea: number,
  smoothing: number,
): number {
  const difference = pressureA - pressureB;
  return flowArea * Math.sqrt(2 * (difference > 0 ? densityA : densityB)) * signedRoot(difference, smoothing);
}

/** Rises from 0 to 1 while `x` goes from 0 to 1, with zero slope at both ends: 3 x^2 - 2 x^3. */
export function smoothStep(x: number): number {
  const held = Math.max(0, Math.min(1, x));
  return held * held * (3 - 2 * held);
}

/** The same with zero curvature at both ends: minimum jerk, 10 x^3 - 15 x^4 + 6 x^5. */
export function minimumJerk(x: number): number {
  const held = Math.max(0, Math.min(1, x));
  return held * held * held * (10 + held * (6 * held - 15));
}

/** max(x, 0) with a rounded corner, (x + sqrt(x^2 + width^2))/2: above by width/2 at 0, by width^2/(4 |x|) far below. */
export function softPlus(x: number, width: number): number {
  const root = Math.sqrt(x * x + width * width);
  return x > 0 ? 0.5 * (x + root) : (0.5 * width * width) / (root - x);
}

/** Share of the area of a spool at `position` that begins to open at `overlap` and is open at 1. */
export function meteredShare(position: number, overlap: number): number {
  return Math.max(0, Math.min(1, (position - overlap) / (1 - overlap)));
}

/** `x` less `half` in size, nothing within it, the corner rounded over `width`; odd and never falling. */
export function deadZone(x: number, half: number, width: number): number {
  const past = Math.max(0, Math.abs(x) - half);
  return (Math.sign(x) * past * past) / (past + width);
}

/**
 * Volume flow, m3/s, at which a viscous and an inertial resistance together, R q + B q |q|, make `difference` Pa. R > 0.
 * The size of the difference is rounded over `smoothing` Pa.
 */
export function filterFlow(difference: number, viscous: number, inertial: number, smoothing: number): number {
  const size = Math.sqrt(difference * difference + smoothing * smoothing);
  return (2 * difference) / (viscous + Math.sqrt(viscous * viscous + 4 * inertial * size));
}

/** Volume flow of a relief valve as a share of its rated flow: 0 at `cracking`, 1 at `fullFlow`, straight between. */
export function reliefShare(pressure: number, cracking: number, fullFlow: number, width: number): number {
  return softPlus(pressure - cracking, width) / (fullFlow - cracking);
}

/**
 * Lift of a relief valve, 1 at its rated point, that passes `share` of the rated flow at `difference`: the passage is an
 * orifice, so the lift is share / sqrt(dp / dp_rated). Below a tenth of the rated difference it is held.
 */
export function reliefLift(share: number, difference: number, ratedDifference: number): number {
  return share / Math.sqrt(Math.max(difference / ratedDifference, 0.1));
}

/**
 * Friction of pipe flow as a number: K = f Re^2 = 2 rho d^3 dp / (mu^2 L). Laminar f = 64/Re up to Re = 2300
 * (Hagen-Poiseuille), Blasius f = 0.3164 Re^-1/4 from 4000, a smooth step between. Odd in `reynolds`.
 */
export function frictionNumber(reynolds: number): number {
  const size = Math.max(Math.abs(reynolds), 1);
  const turbulence = smoothStep((size - 2300) / 1700);
  const blasius = (0.3164 * size) / Math.sqrt(Math.sqrt(size));
  return reynolds * (64 + turbulence * (blasius - 64));
}

/** dK/dRe of `frictionNumber`. */
export function frictionSlope(reynolds: number): number {
  const size = Math.max(Math.abs(reynolds), 1);
  const along = Math.max(0, Math.min(1, (size - 2300) / 1700));
  const turbulence = along * along * (3 - 2 * along);
  const blasius = (0.3164 * size) / Math.sqrt(Math.sqrt(size));
  return 64 + turbulence * (1.75 * blasius - 64) + ((6 * along * (1 - along)) / 1700) * size * (blasius - 64);
}

/** One Newton step of the inverse. */
export function frictionNewton(reynolds: number, friction: number): number {
  return reynolds - (frictionNumber(reynolds) - friction) / frictionSlope(reynolds);
}

/** The Reynolds number that a friction number `friction` (>= 0 or < 0) drives: inverse of `frictionNumber`. */
export function reynoldsOfFriction(friction: number): number {
  const size = Math.max(Math.abs(friction), 1);
  const laminar = size / 64;
  const turbulent = Math.exp((4 / 7) * Math.log(size / 0.3164));
  const between = 2300 * Math.exp(0.3778 * Math.log(size / 147200));
  const start = size < 147200 ? laminar : size > 636800 ? turbulent : between;
  const first = frictionNewton(start, size);
  const second = frictionNewton(first, size);
  const third = frictionNewton(second, size);
  return Math.abs(friction) < 1 ? friction / 64 : friction < 0 ? -third : third;
}

/** Its exact slope. */
export const reynoldsOfFrictionSlopes = {
  friction: (_friction: number, value: number) => 1 / frictionSlope(value),
};

/** Pressure loss, Pa, of a straight round pipe at `massFlow` kg/s (Darcy and Weisbach). */
export function pipeLoss(
  massFlow: number,
  density: number,
  viscosity: number,
  length: number,
  diameter: number,
): number {
  const reynolds = (4 * massFlow) / (CIRCLE_RATIO * diameter * viscosity);
  return (frictionNumber(reynolds) * viscosity * viscosity * length) / (2 * density * diameter * diameter * diameter);
}

/** Mass flow, kg/s, of the same pipe at a pressure difference in Pa. */
export function pipeMassFlow(
  difference: number,
  density: number,
  viscosity: number,
  length: number,
  diameter: number,
): number {
  const friction = (2 * density * diameter * diameter * diameter * difference) / (viscosity * viscosity * length);
  return 0.25 * CIRCLE_RATIO * diameter * viscosity * reynoldsOfFriction(friction);
}

/**
 * Share of a moving column that is oil: 1 while the store that it draws from has three tenths of the reference density
 * or more, to 0 as that runs empty. Densities relative to the reference, `speed` in m/s from a to b.
 */
export function columnShare(densityA: number, densityB: number, speed: number): number {
  const a = smoothStep(densityA * (1 / 0.3));
  const b = smoothStep(densityB * (1 / 0.3));
  const x = speed * 20;
  return b + 0.5 * (a - b) * (1 + x / Math.sqrt(1 + x * x));
}

/** Critical pressure ratio of a perfect gas, (2/(k+1))^(k/(k-1)). */
export function criticalRatio(heatRatio: number): number {
  return Math.exp((heatRatio / (heatRatio - 1)) * Math.log(2 / (heatRatio + 1)));
}

/**
 * Mass flow of a perfect gas through a nozzle from a higher to a lower pressure, kg/s; choked below the critical ratio
 * (de Saint-Venant and Wantzel). Near equal pressures, above a ratio of 1 - `band`, it goes to zero on a straight line.
 * `flowArea` Cd A, m2.
 */
export function gasMassFlow(
  upstreamPressure: number,
  downstreamPressure: number,
  upstreamTemperature: number,
  gasConstant: number,
  heatRatio: number,
  flowArea: number,
  band: number,
): number {
  const ratio = Math.max(downstreamPressure / upstreamPressure, criticalRatio(heatRatio));
  const held = Math.min(ratio, 1 - band);
  const drop = Math.exp((2 / heatRatio) * Math.log(held)) - Math.exp(((heatRatio + 1) / heatRatio) * Math.log(held));
  const linear = ratio > 1 - band ? Math.max(0, 1 - ratio) / band : 1;
  return (
    linear *
    flowArea *
    upstreamPressure *
    Math.sqrt(((2 * heatRatio) / (heatRatio - 1) / (gasConstant * upstreamTemperature)) * drop)
  );
}
