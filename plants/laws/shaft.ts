/**
 * Torsion with smooth backlash, and the planetary gear (Willis 1841): sun + z ring = (1 + z) carrier, z = ring teeth
 * over sun teeth.
 */

/** Twist beyond a gap of half width `gap`, corners rounded over `width`; the twist itself when the gap is zero. */
export function engagedTwist(twist: number, gap: number, width: number): number {
  return twist + 0.5 * (rounded(twist - gap, width) - rounded(twist + gap, width));
}

/** Slope of `engagedTwist`, 0 .. 1: the share of stiffness and damping that acts. */
export function engagedShare(twist: number, gap: number, width: number): number {
  return 1 + 0.5 * ((twist - gap) / rounded(twist - gap, width) - (twist + gap) / rounded(twist + gap, width));
}

/** Integral of `engagedTwist` from zero: the elastic energy per unit of stiffness. */
export function engagedEnergy(twist: number, gap: number, width: number): number {
  return (
    0.5 * twist * twist +
    0.5 * (roundedArea(twist - gap, width) - roundedArea(twist + gap, width)) +
    roundedArea(gap, width)
  );
}

/** sqrt(x^2 + width^2), never zero. */
export function rounded(x: number, width: number): number {
  return Math.sqrt(x * x + width * width);
}

/** Integral of `rounded` from zero to x; odd in x. */
export function roundedArea(x: number, width: number): number {
  const root = rounded(x, width);
  return 0.5 * (x * root + width * width * Math.sign(x) * Math.log((Math.abs(x) + root) / width));
}

/** Speed of the sun from carrier and ring, rad/s. */
export function sunSpeed(carrier: number, ring: number, ratio: number): number {
  return (1 + ratio) * carrier - ratio * ring;
}
