/**
 * Dry friction that sticks and slips: the bristle model of Dahl (1968) with the damping and the Stribeck level of
 * Canudas de Wit, Olsson, Astrom & Lischinsky (IEEE Trans. Autom. Control 40 (1995) 419), in normalised form.
 *
 * The deflection z is a pure number, |z| <= level; `angle` is the slip after which friction is fully built up. At rest
 * z holds any torque below capacity * level without creep. The damping acts on z' and so vanishes in steady slip.
 */

/** Level of friction at a slip: 1 when sliding, `staticFactor` at rest, falling off over `width` (same unit as slip). */
export function stribeckLevel(slip: number, staticFactor: number, width: number): number {
  return staticFactor === 1 ? 1 : 1 + (staticFactor - 1) * Math.exp(-slip * slip * (1 / (width * width)));
}

/** Rate of the deflection, 1/s: z' = (w - |w| z / level) / angle. */
export function bristleRate(slip: number, deflection: number, level: number, angle: number): number {
  return (slip - (Math.abs(slip) * deflection) / level) * (1 / angle);
}

/** Torque against the slip, N m (or force, N): capacity (z + damping angle z'), `damping` in s/rad (s/m). */
export function bristleTorque(
  capacity: number,
  slip: number,
  deflection: number,
  level: number,
  damping: number,
): number {
  return capacity * (deflection + damping * (slip - (Math.abs(slip) * deflection) / level));
}

/** Elastic energy in the bristles, J. */
export function bristleEnergy(capacity: number, deflection: number, angle: number): number {
  return 0.5 * capacity * angle * deflection * deflection;
}

/** Power that slip dissipates, W: torque * slip less the rate of the elastic energy; not negative while |z| <= level. */
export function bristleLoss(
  capacity: number,
  slip: number,
  deflection: number,
  level: number,
  damping: number,
): number {
  const sliding = Math.abs(slip) / level;
  return capacity * (sliding * deflection * deflection + damping * slip * (slip - sliding * deflection));
}

/** Sliding friction without stick: `torque` smoothed over `width` around zero speed. */
export function slidingTorque(torque: number, speed: number, width: number): number {
  return torque * frictionSign(speed * (1 / width));
}

/** -1 to 1, x/sqrt(1 + x^2): the sign of x with its step made smooth. */
export function frictionSign(x: number): number {
  return x / Math.sqrt(1 + x * x);
}

/** Its exact slope. */
export const frictionSignSlopes = {
  x: (x: number, _value: number) => 1 / ((1 + x * x) * Math.sqrt(1 + x * x)),
};

/** Torque that grows from `loose` to `firm` as a slip comes to rest within about `width`. */
export function settlingTorque(slip: number, width: number, loose: number, firm: number): number {
  const share = 1 / (1 + slip * slip * (1 / (width * width)));
  return loose + (firm - loose) * (share * share);
}

/**
 * Torque of a retarder, N m, with the sign of the speed: share of the full torque, rising over `fullSpeed`, bounded
 * smoothly by the power that can be taken away.
 */
export function retarderTorque(
  speed: number,
  application: number,
  maximumTorque: number,
  maximumPower: number,
  fullSpeed: number,
): number {
  const held = Math.max(application, 0) * maximumTorque * Math.tanh(speed / fullSpeed);
  const share = (held * speed) / maximumPower;
  return held / Math.sqrt(1 + share * share);
}
