/**
 * Combustion engine: the Willans line p_me = e p_mf - p_me0 (Willans 1888; Guzzella & Onder, Introduction to Modeling
 * and Control of Internal Combustion Engine Systems) and a full-load curve through a few points.
 */

/** Torque of a mean effective pressure of a four-stroke engine, N m: p V / (4 pi). */
export function meanEffectiveTorque(pressure: number, sweptVolume: number): number {
  return (pressure * sweptVolume) / 12.566370614359172;
}

/** Fuel power, W: (brake torque + drag torque) speed / e. */
export function willansFuelPower(torque: number, dragTorque: number, speed: number, efficiency: number): number {
  return ((torque + dragTorque) * speed) / efficiency;
}

/** 0 below zero and x above, rounded over `width`. */
export function ramp(x: number, width: number): number {
  return 0.5 * (x + Math.sqrt(x * x + width * width));
}

/** Full-load torque, N m: straight lines through five points of rising speed, corners rounded over `width` rad/s. */
export function fullLoadTorque(
  speed: number,
  w1: number,
  w2: number,
  w3: number,
  w4: number,
  w5: number,
  t1: number,
  t2: number,
  t3: number,
  t4: number,
  t5: number,
  width: number,
): number {
  const s1 = (t2 - t1) / (w2 - w1);
  const s2 = (t3 - t2) / (w3 - w2);
  const s3 = (t4 - t3) / (w4 - w3);
  const s4 = (t5 - t4) / (w5 - w4);
  const rising =
    t1 +
    s1 * ramp(speed - w1, width) +
    (s2 - s1) * ramp(speed - w2, width) +
    (s3 - s2) * ramp(speed - w3, width) +
    (s4 - s3) * ramp(speed - w4, width);
  return Math.max(rising, 0);
}

/** 0 below `threshold` less twice `width` and 1 above `threshold` and twice `width`; smooth between, 3 x^2 - 2 x^3. */
export function smoothSwitch(x: number, threshold: number, width: number): number {
  const held = Math.max(0, Math.min(1, (x - threshold) * (0.25 / width) + 0.5));
  return held * held * (3 - 2 * held);
}

/** `x` held between `least` and `most`. */
export function between(x: number, least: number, most: number): number {
  return Math.min(Math.max(x, least), most);
}
