/**
 * Laws of mineral oil with free air. Pure numbers, SI, absolute pressures.
 *
 * The pressure law is barotropic: at the declared reference temperature, volume and pressure belong together, so that
 * compression energy closes exactly. With P = p - p_a (p_a the standard atmosphere), the volume of an oil mass as a
 * share of its volume at p_a is
 *
 *     x(p) = a0 p_a / p  +  (1 - a0) (1 + u P) / (1 + v P)
 *
 * a0 free air by volume at p_a (isothermal, comes and goes at once); u = (K' - 1)/(2 K), v = (K' + 1)/(2 K) with K the
 * tangent bulk modulus of the liquid at p_a and K' = dK/dp there. K' = 0 is the constant modulus, exp(-P/K) within
 * (P/K)^3/12; K' near 10 is what oils show. x(p) inverts in closed form (a quadratic) and stays positive for every mass.
 * The lumped form of entrained air is common to the family reviewed by Gholizadeh, Burton and Schoenau (2011, 2012).
 */

/** Standard atmosphere, Pa: the reference of volumes and potentials. */
export const STANDARD_PRESSURE = 101325;
/** ln 10, for laws that are written with common logarithms. */
export const NATURAL_TEN = Math.LN10;

/** Numerator coefficient u of the liquid, 1/Pa. `modulus` Pa, `modulusSlope` = dK/dp, a pure number. */
export function liquidNumerator(modulus: number, modulusSlope: number): number {
  return (modulusSlope - 1) / (2 * modulus);
}

/** Denominator coefficient v of the liquid, 1/Pa. */
export function liquidDenominator(modulus: number, modulusSlope: number): number {
  return (modulusSlope + 1) / (2 * modulus);
}

/** Volume as a share of the volume at the standard atmosphere, x(p). `pressure` > 0. */
export function oilVolumeRatio(pressure: number, freeAir: number, numerator: number, denominator: number): number {
  const above = pressure - STANDARD_PRESSURE;
  const air = freeAir * STANDARD_PRESSURE * (1 / pressure);
  const thinning = 1 / (1 + denominator * above);
  return air + (1 - freeAir) * (1 + numerator * above) * thinning;
}

/** dx/dp, 1/Pa, negative. */
export function oilVolumeSlope(pressure: number, freeAir: number, numerator: number, denominator: number): number {
  const above = pressure - STANDARD_PRESSURE;
  const air = freeAir * STANDARD_PRESSURE * (1 / pressure);
  const thinning = 1 / (1 + denominator * above);
  return -(air * (1 / pressure)) - (1 - freeAir) * (denominator - numerator) * (thinning * thinning);
}

/**
 * Pressure, Pa, of oil whose volume is `ratio` (> 0) times its volume at the standard atmosphere: the positive root of
 * a p^2 - q p - r = 0. Smooth, falling, positive for every ratio; `freeAir` must be above zero.
 */
export function oilPressure(ratio: number, freeAir: number, numerator: number, denominator: number): number {
  const a = Math.max(ratio * denominator - (1 - freeAir) * numerator, 0.02 * denominator);
  const q =
    freeAir * STANDARD_PRESSURE * denominator +
    (1 - freeAir) * (1 - numerator * STANDARD_PRESSURE) -
    ratio * (1 - denominator * STANDARD_PRESSURE);
  const r = freeAir * STANDARD_PRESSURE * (1 - denominator * STANDARD_PRESSURE);
  const root = Math.sqrt(q * q + 4 * a * r);
  return q > 0 ? (q + root) / (2 * a) : (2 * r) / (root - q);
}

/** Its exact slope, from that of the inverse. */
export const oilPressureSlopes = {
  ratio: (_ratio: number, freeAir: number, numerator: number, denominator: number, value: number) =>
    1 / oilVolumeSlope(value, freeAir, numerator, denominator),
};

/** Density, kg/m3, at `pressure` Pa; `referenceDensity` is that of oil with its air at the standard atmosphere. */
export function oilDensity(
  pressure: number,
  referenceDensity: number,
  freeAir: number,
  numerator: number,
  denominator: number,
): number {
  return referenceDensity / oilVolumeRatio(pressure, freeAir, numerator, denominator);
}

/**
 * ln(1 + z) for z > -0.5: twice the first eleven terms of artanh(z/(2 + z)). Exact to rounding up to z = 0.6, within 1e-12 of
 * itself up to 1; the library function costs more.
 */
export function logarithmOfOneAnd(z: number): number {
  const s = z / (2 + z);
  const q = s * s;
  const qq = q * q;
  const low = 1 + q * (1 / 3) + qq * (1 / 5 + q * (1 / 7));
  const middle = 1 / 9 + q * (1 / 11) + qq * (1 / 13 + q * (1 / 15));
  const high = 1 / 17 + q * (1 / 19) + qq * (1 / 21);
  return 2 * s * (low + qq * qq * (middle + qq * qq * high));
}

/** Pressure potential h(p) = integral of dp/rho from the standard atmosphere, J/kg. */
export function oilPotential(
  pressure: number,
  referenceDensity: number,
  freeAir: number,
  numerator: number,
  denominator: number,
): number {
  const above = pressure - STANDARD_PRESSURE;
  const share = numerator / denominator;
  const air = freeAir * STANDARD_PRESSURE * Math.log(pressure * (1 / STANDARD_PRESSURE));
  const liquid = share * above + ((1 - share) / denominator) * logarithmOfOneAnd(denominator * above);
  return (air + (1 - freeAir) * liquid) * (1 / referenceDensity);
}

/** Its exact slope, 1/rho. */
export const oilPotentialSlopes = {
  pressure: (
    pressure: number,
    referenceDensity: number,
    freeAir: number,
    numerator: number,
    denominator: number,
    _value: number,
  ) => oilVolumeRatio(pressure, freeAir, numerator, denominator) * (1 / referenceDensity),
};

/**
 * Effective tangent bulk modulus, Pa: 1/K_e = (V_l/V)/K_l + (V_g/V)/(n p). `exponent` n is the polytropic exponent of
 * the air; the pressure law of the plant is n = 1.
 */
export function effectiveBulkModulus(
  pressure: number,
  exponent: number,
  freeAir: number,
  numerator: number,
  denominator: number,
): number {
  const above = pressure - STANDARD_PRESSURE;
  const air = freeAir * Math.exp(Math.log(STANDARD_PRESSURE / pressure) / exponent);
  const top = 1 + numerator * above;
  const bottom = 1 + denominator * above;
  const liquid = ((1 - freeAir) * top) / bottom;
  const liquidSlope = ((1 - freeAir) * (denominator - numerator)) / (bottom * bottom);
  return (air + liquid) / (liquidSlope + air / (exponent * pressure));
}

/**
 * Kinematic viscosity, m2/s, after Walther (ASTM D341): log10 log10(nu + 0.7) = intercept - slope log10 T, nu in mm2/s,
 * T in K. Valid above about 2 mm2/s; the temperature is held within 200 K to 500 K.
 */
export function kinematicViscosity(temperature: number, intercept: number, slope: number): number {
  const held = Math.max(200, Math.min(500, temperature));
  const outer = NATURAL_TEN * intercept - slope * Math.log(held);
  return 1e-6 * Math.max(0.2, Math.exp(NATURAL_TEN * Math.exp(outer)) - 0.7);
}
