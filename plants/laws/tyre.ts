/**
 * Longitudinal tyre force. Magic Formula after Bakker, Nyborg & Pacejka (SAE 870421, 1987) and Pacejka, Tire and
 * Vehicle Dynamics; friction tyre of Dugoff, Fancher & Segel (SAE 700377, 1970). Forces per unit of vertical load.
 */

/** Force share F/Fz at a slip: D sin(C atan(B k - E (B k - atan B k))). */
export function magicFormula(slip: number, stiffness: number, shape: number, peak: number, curvature: number): number {
  const x = stiffness * slip;
  return peak * Math.sin(shape * Math.atan(x - curvature * (x - Math.atan(x))));
}

/** Slope of F/Fz at zero slip: B C D. */
export function magicFormulaSlope(stiffness: number, shape: number, peak: number): number {
  return stiffness * shape * peak;
}

/** Force share F/Fz of the friction tyre, odd in slip; `slope` is Cx/Fz and `friction` the coefficient. */
export function dugoff(slip: number, slope: number, friction: number): number {
  const x = Math.abs(slip);
  const grip = (friction * (1 + x)) / (2 * slope * Math.max(x, 1e-9));
  const free = (slope * slip) / (1 + x);
  return grip < 1 ? free * (2 - grip) * grip : free;
}

/**
 * Rate of the carcass deflection u, m/s: u' = vs - (u / sigma) sqrt(v^2 + vs^2/9 + vmin^2). Slip is u / sigma; it tends
 * to vs/|v| in rolling, to 3 in spin at standstill, and holds at rest up to a creep of vmin times the slip.
 */
export function relaxationRate(
  deflection: number,
  slipVelocity: number,
  velocity: number,
  length: number,
  least: number,
): number {
  return slipVelocity - (deflection / length) * relaxationSpeed(slipVelocity, velocity, least);
}

/** The speed with which a deflection relaxes over the relaxation length, m/s; never zero. */
export function relaxationSpeed(slipVelocity: number, velocity: number, least: number): number {
  return Math.sqrt(velocity * velocity + (slipVelocity * slipVelocity) / 9 + least * least);
}

/** Share of the standstill damping that acts: 1 at rest, fading with rolling and slip speed over `width`, m/s. */
export function standstillShare(slipVelocity: number, velocity: number, width: number): number {
  const share = 1 / (1 + (slipVelocity * slipVelocity + velocity * velocity) * (1 / (width * width)));
  return share * share;
}
