/**
 * Laws of hydrostatic pump-motors. Pure numbers, SI. `radianDisplacement` D is the displacement per radian, m3/rad
 * (displacement per turn over 2 pi). Losses after Wilson (1946), additive, valid in all four quadrants: leakage from
 * high to low pressure, torque against the rotation. Coefficients are pure numbers.
 */

/** Leakage volume flow, m3/s, Cs D dp / mu; from the side that `difference` counts from. */
export function wilsonLeakage(
  difference: number,
  viscosity: number,
  radianDisplacement: number,
  slipCoefficient: number,
): number {
  return (slipCoefficient * radianDisplacement * difference) / viscosity;
}

/** sqrt(x^2 + width^2): |x| with a rounded corner. */
export function softMagnitude(x: number, width: number): number {
  return Math.sqrt(x * x + width * width);
}

/**
 * Loss torque, N m, with the sign of the speed: Cv D mu w viscous, (Cf D |dp| + T_c) tanh(w/w0) dry. `dryTorque` T_c is
 * what is left without pressure; `smoothSpeed` w0, rad/s. Times speed it is never negative.
 */
export function wilsonTorque(
  difference: number,
  speed: number,
  viscosity: number,
  radianDisplacement: number,
  viscousCoefficient: number,
  frictionCoefficient: number,
  dryTorque: number,
  smoothSpeed: number,
): number {
  const dry = frictionCoefficient * radianDisplacement * softMagnitude(difference, 2e5) + dryTorque;
  return viscousCoefficient * radianDisplacement * viscosity * speed + dry * Math.tanh(speed / smoothSpeed);
}

/**
 * Density of the oil that the cylinders carry, kg/m3: that of the side it comes from, low where `drawing` (displacement
 * times speed, rad/s, counted from high to low) is negative. Smooth over `smoothSpeed`, so that torque is steady at
 * standstill.
 */
export function carriedDensity(densityHigh: number, densityLow: number, drawing: number, smoothSpeed: number): number {
  return densityLow + 0.5 * (densityHigh - densityLow) * (1 + Math.tanh(drawing / smoothSpeed));
}

/**
 * Displacement as a share of the full one that gives `torque` N m without losses, held within -1 to 1. Below `least`,
 * Pa, the difference is counted as `least` (rounded), so that a request at low pressure does not swing the plate for
 * nothing; with a negative difference the plate goes the other way.
 */
export function displacementForTorque(
  torque: number,
  difference: number,
  radianDisplacement: number,
  least: number,
): number {
  const size = difference * difference + least * least;
  return Math.max(-1, Math.min(1, (torque * difference) / (radianDisplacement * size)));
}
