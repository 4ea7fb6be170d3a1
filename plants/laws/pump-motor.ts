/**
 * Laws of hydrostatic pump-motors. Pure numbers, SI. `radianDisplacement` D is the displacement per radian, m3/rad
 * (displacement per turn over 2 pi). Losses are additive and valid in all four quadrants: leakage from high to low
 * pressure, torque against the rotation. `form` chooses them: 0 Wilson (1946); 1 constant efficiencies, as shares of the
 * ideal flow and torque; 2 Willans lines, such shares and constant parts; 3 extended, Wilson with turbulent leakage and
 * hydrodynamic torque (Schloesser 1961) and compression of the dead volume (McCandlish and Dorey 1984); 4 mirrored
 * efficiencies, for comparison only: losses that jump in slope at zero power and vanish at zero displacement; 5 a map,
 * results after ISO 4409 fitted by polynomials that are never negative. Coefficients are pure numbers.
 */

/** Laminar leakage per pressure difference, m3/(s Pa). */
export function leakConductance(
  form: number,
  viscosity: number,
  radianDisplacement: number,
  slipCoefficient: number,
  idleLeakage: number,
  ratedDifference: number,
): number {
  const wilson = (slipCoefficient * radianDisplacement) / viscosity;
  return form === 1 || form === 4 || form === 5 ? 0 : form === 2 ? idleLeakage / ratedDifference : wilson;
}

/** Leakage from high to low beside the laminar one, m3/s, with the sign of the difference. */
export function furtherLeakage(
  form: number,
  difference: number,
  speed: number,
  stroke: number,
  density: number,
  radianDisplacement: number,
  volumetricEfficiency: number,
  turbulentCoefficient: number,
  deadVolumeShare: number,
  bulkModulus: number,
): number {
  const turning = radianDisplacement * softMagnitude(speed, 0.01);
  const direction = difference / softMagnitude(difference, 1e5);
  const share = (1 - volumetricEfficiency) * softMagnitude(stroke, 1e-3) * turning * direction;
  const size = softMagnitude(difference, 2e4);
  const twoThirds = Math.exp((2 / 3) * Math.log(radianDisplacement));
  const turbulent = turbulentCoefficient * twoThirds * Math.sqrt(2 / density) * (difference / Math.sqrt(size));
  const dead = deadVolumeShare + 0.5 * (1 - softMagnitude(stroke, 1e-3));
  const compressed = Math.max(0, dead) * turning * (difference / bulkModulus);
  const drives = stroke * speed * difference > 0 ? 1 / volumetricEfficiency : 1;
  return form === 1 || form === 2 ? share : form === 3 ? turbulent + compressed : form === 4 ? share * drives : 0;
}

/** Loss torque, N m, with the sign of the speed: see `wilsonTorque`; by the other forms from shares and constant parts. */
export function lossTorque(
  form: number,
  difference: number,
  speed: number,
  stroke: number,
  viscosity: number,
  density: number,
  radianDisplacement: number,
  viscousCoefficient: number,
  frictionCoefficient: number,
  dryTorque: number,
  mechanicalEfficiency: number,
  hydrodynamicCoefficient: number,
  smoothSpeed: number,
): number {
  const wilson = wilsonTorque(
    difference,
    speed,
    viscosity,
    radianDisplacement,
    viscousCoefficient,
    frictionCoefficient,
    dryTorque,
    smoothSpeed,
  );
  const ideal = softMagnitude(stroke, 1e-3) * radianDisplacement * softMagnitude(difference, 2e5);
  const share = (1 - mechanicalEfficiency) * ideal + (form === 2 ? dryTorque : 0);
  const fiveThirds = radianDisplacement * Math.exp((2 / 3) * Math.log(radianDisplacement));
  const churning = hydrodynamicCoefficient * density * fiveThirds * speed * Math.abs(speed);
  const drives = stroke * speed * difference > 0 ? 1 : 1 / mechanicalEfficiency;
  return form === 1 || form === 2
    ? share * Math.tanh(speed / smoothSpeed)
    : form === 3
      ? wilson + churning
      : form === 4
        ? share * drives * Math.tanh(speed / smoothSpeed)
        : wilson;
}

/**
 * Leakage of a map, m3/s, with the sign of the difference: D w_rated (dp/dp_rated) times a polynomial of displacement,
 * difference and speed, each relative, that is held at zero or above.
 */
export function mappedLeakage(
  difference: number,
  speed: number,
  stroke: number,
  radianDisplacement: number,
  constant: number,
  byDisplacement: number,
  byDifference: number,
  bySpeed: number,
  byBoth: number,
  ratedDifference: number,
  ratedSpeed: number,
): number {
  const relative = softMagnitude(speed, 0.01) / ratedSpeed;
  const displaced = softMagnitude(stroke, 1e-3);
  const pressed = softMagnitude(difference, 1e5) / ratedDifference;
  const surface =
    constant + byDisplacement * displaced + byDifference * pressed + (bySpeed + byBoth * displaced) * relative;
  return radianDisplacement * ratedSpeed * (difference / ratedDifference) * Math.max(0, surface);
}

/**
 * Loss torque of a map, N m, with the sign of the speed: D dp_rated times a polynomial of speed, difference and
 * displacement, each relative, that is held at zero or above.
 */
export function mappedTorque(
  difference: number,
  speed: number,
  stroke: number,
  radianDisplacement: number,
  constant: number,
  bySpeed: number,
  bySquare: number,
  byDifference: number,
  byDisplacement: number,
  byBoth: number,
  ratedDifference: number,
  ratedSpeed: number,
  smoothSpeed: number,
): number {
  const relative = Math.abs(speed) / ratedSpeed;
  const pressed = softMagnitude(difference, 2e5) / ratedDifference;
  const surface =
    constant +
    relative * (bySpeed + bySquare * relative) +
    pressed * (byDifference + byDisplacement * softMagnitude(stroke, 1e-3) + byBoth * relative);
  return radianDisplacement * ratedDifference * Math.max(0, surface) * smoothSign(speed * (1 / smoothSpeed));
}

/** Leakage volume flow, m3/s, Cs D dp / mu; from the side that `difference` counts from. */
export function wilsonLeakage(
  difference: number,
  viscosity: number,
  radianDisplacement: number,
  slipCoefficient: number,
): number {
  return (slipCoefficient * radianDisplacement * difference) / viscosity;
}

/** -1 to 1, x/sqrt(1 + x^2): the sign of x with its step made smooth. */
export function smoothSign(x: number): number {
  return x / Math.sqrt(1 + x * x);
}

/** Its exact slope. */
export const smoothSignSlopes = {
  x: (x: number, _value: number) => 1 / ((1 + x * x) * Math.sqrt(1 + x * x)),
};

/** sqrt(x^2 + width^2): |x| with a rounded corner. */
export function softMagnitude(x: number, width: number): number {
  return Math.sqrt(x * x + width * width);
}

/**
 * Loss torque, N m, with the sign of the speed: Cv D mu w viscous, (Cf D |dp| + T_c) x/sqrt(1 + x^2) with x = w/w0 dry. `dryTorque` T_c is
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
  return viscousCoefficient * radianDisplacement * viscosity * speed + dry * smoothSign(speed * (1 / smoothSpeed));
}

/**
 * Density of the oil that the cylinders carry, kg/m3: that of the side it comes from, low where `drawing` (displacement
 * times speed, rad/s, counted from high to low) is negative. Smooth over `smoothSpeed`, so that torque is steady at
 * standstill.
 */
export function carriedDensity(densityHigh: number, densityLow: number, drawing: number, smoothSpeed: number): number {
  return densityLow + 0.5 * (densityHigh - densityLow) * (1 + smoothSign(drawing * (1 / smoothSpeed)));
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

/** Displacement as a share that a valve current asks for: nothing up to `dead`, full at `full`, straight between. */
export function displacementForCurrent(current: number, dead: number, full: number): number {
  const share = Math.max(0, Math.min(1, (Math.abs(current) - dead) / (full - dead)));
  return Math.sign(current) * share;
}

/** Share of the rate limit that a control pressure gives: its root over the rated one, 1 from there; rated 0: always 1. */
export function controlShare(pressure: number, rated: number): number {
  const share = Math.max(1e-4, Math.min(1, pressure / Math.max(rated, 1)));
  return rated > 0 ? Math.sqrt(share) : 1;
}
