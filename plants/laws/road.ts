/**
 * Road load: F = f0 + f1 v + f2 v^2 with the physical split f0 = Crr m g cos, f2 = rho CdA / 2 (the forms of SAE J1263,
 * SAE J2263 and 40 CFR 1066.210), and the grade resistance m g sin.
 */

/** Standard acceleration of free fall, m/s2 (CGPM 1901). */
export const GRAVITY = 9.80665;

/** Sine of the slope angle from the grade (rise over run). */
export function slopeSine(grade: number): number {
  return grade / Math.sqrt(1 + grade * grade);
}

/** Cosine of the slope angle from the grade (rise over run). */
export function slopeCosine(grade: number): number {
  return 1 / Math.sqrt(1 + grade * grade);
}

/** Aerodynamic drag against the motion through the air, N; `relative` is velocity plus headwind, m/s. */
export function airDrag(quadratic: number, relative: number): number {
  return quadratic * relative * Math.abs(relative);
}

/** Coefficient of the square of the speed, N s2/m2, from air density and drag area. */
export function dragCoefficient(airDensity: number, dragArea: number): number {
  return 0.5 * airDensity * dragArea;
}
