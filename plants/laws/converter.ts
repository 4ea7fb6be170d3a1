/** Laws of the hydrodynamic torque converter, and of machines that start and burden an engine. Pure numbers, SI. */

/** Torque that the pump takes, N m: K w_p (w_p - w_t); the speed that counts is never below 1 rad/s. */
export function converterPumpTorque(pumpSpeed: number, turbineSpeed: number, capacity: number): number {
  return capacity * Math.sqrt(pumpSpeed * pumpSpeed + 1) * (pumpSpeed - turbineSpeed);
}

/** Turbine speed over pump speed; the pump counts with at least a hundredth of a rad/s. */
export function converterSpeedRatio(pumpSpeed: number, turbineSpeed: number): number {
  return turbineSpeed / Math.max(pumpSpeed, 0.01);
}

/** Turbine torque over pump torque: `stallRatio` at and below standstill of the turbine, 1 from the coupling point on. */
export function converterRatio(
  pumpSpeed: number,
  turbineSpeed: number,
  stallRatio: number,
  couplingPoint: number,
): number {
  const ratio = Math.max(0, converterSpeedRatio(pumpSpeed, turbineSpeed));
  const driving = pumpSpeed > turbineSpeed ? Math.max(0, 1 - ratio / couplingPoint) : 0;
  return 1 + (stallRatio - 1) * driving;
}

/**
 * Heat of the converter, W: that of the slip, less the work that the guide wheel's torque does on the turbine,
 * T_p (w_p - w_t) - (ratio - 1) T_p w_t.
 */
export function converterLoss(
  pumpSpeed: number,
  turbineSpeed: number,
  capacity: number,
  stallRatio: number,
  couplingPoint: number,
): number {
  const taken = converterPumpTorque(pumpSpeed, turbineSpeed, capacity);
  const more = converterRatio(pumpSpeed, turbineSpeed, stallRatio, couplingPoint) - 1;
  return taken * (pumpSpeed - turbineSpeed) - more * taken * turbineSpeed;
}

/** Torque of a series motor over speed: a straight line from stall to `freeSpeed`, nothing beyond (free wheel). */
export function starterTorque(speed: number, stallTorque: number, freeSpeed: number): number {
  return stallTorque * Math.max(0, Math.min(1, 1 - speed / freeSpeed));
}

/**
 * Torque of a machine that takes `power` W from a shaft, N m: power over speed, bounded by `most` and falling in a
 * straight line to nothing below the speed at which that bound is met, or below `leastSpeed`. Never drives.
 */
export function burdenTorque(speed: number, power: number, most: number, leastSpeed: number): number {
  const whole = Math.max(leastSpeed, power / most);
  return speed > whole ? power / Math.max(speed, 0.1) : (power * Math.max(speed, 0)) / (whole * whole);
}
