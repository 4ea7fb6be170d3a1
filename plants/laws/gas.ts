/**
 * Laws of nitrogen and of the gas-charged accumulator. Pure numbers, SI, absolute pressures.
 *
 * Equation of state: Benedict, Webb and Rubin with the nitrogen constants of Cooper and Goldfrank (1967), as tabulated
 * in Cengel and Boles (table 3-4) and Moran and Shapiro (table A-24), turned into mass units with M = 28.013 kg/kmol.
 * Energy form after Otis and Pourmovahed (1985). Within 1 % of the reference equation (Span et al. 2000) at 300 K to
 * 400 K up to 30 MPa. `real` is 1 for that equation and 0 for the ideal gas with c_v = 5/2 R (kappa = 1.4).
 */

export const NITROGEN_GAS_CONSTANT = 296.8;
export const BWR_A0 = 136.009;
export const BWR_B0 = 1.454325e-3;
export const BWR_C0 = 1.04036e6;
export const BWR_A = 0.115546;
export const BWR_B = 2.96663e-6;
export const BWR_C = 3356.75;
export const BWR_ALPHA = 5.786397e-9;
export const BWR_GAMMA = 6.753931e-6;
/** Characteristic temperature of the vibration of the molecule, K (ideal part of Span et al. 2000). */
export const NITROGEN_VIBRATION = 3364.011;

/** Pressure, Pa, at `density` kg/m3 and `temperature` K. */
export function gasPressure(density: number, temperature: number, real: number): number {
  const square = density * density;
  const rt = NITROGEN_GAS_CONSTANT * temperature;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? rt * density +
        real *
          square *
          (BWR_B0 * rt -
            BWR_A0 -
            BWR_C0 * (reciprocal * reciprocal) +
            density * (BWR_B * rt - BWR_A + BWR_A * BWR_ALPHA * (square * density) + BWR_C * decayed * (1 + g)))
    : rt * density;
}

/** (dp/dT) at constant volume, Pa/K. */
export function gasPressureByTemperature(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? NITROGEN_GAS_CONSTANT * density +
        real *
          square *
          (BWR_B0 * NITROGEN_GAS_CONSTANT +
            BWR_B * NITROGEN_GAS_CONSTANT * density +
            2 * reciprocal * (BWR_C0 * (reciprocal * reciprocal) - BWR_C * decayed * density * (1 + g)))
    : NITROGEN_GAS_CONSTANT * density;
}

/** (dp/drho) at constant temperature, J/kg. */
export function gasPressureByDensity(density: number, temperature: number, real: number): number {
  const square = density * density;
  const rt = NITROGEN_GAS_CONSTANT * temperature;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? rt +
        real *
          density *
          (2 * (BWR_B0 * rt - BWR_A0 - BWR_C0 * (reciprocal * reciprocal)) +
            density *
              (3 * (BWR_B * rt - BWR_A) +
                6 * BWR_A * BWR_ALPHA * (square * density) +
                BWR_C * decayed * (3 + g * (3 - 2 * g))))
    : rt;
}

/** Heat capacity at constant volume, J/(kg K). */
export function gasHeatCapacity(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const y = NITROGEN_VIBRATION * reciprocal;
  const e = Math.exp(-y);
  const excited = y / (1 - e);
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? 2.5 * NITROGEN_GAS_CONSTANT +
        real *
          (NITROGEN_GAS_CONSTANT * e * excited * excited +
            reciprocal *
              (6 * (reciprocal * reciprocal) * (BWR_C0 * density - BWR_C / BWR_GAMMA) +
                3 * BWR_C * decayed * (2 / BWR_GAMMA + square)))
    : 2.5 * NITROGEN_GAS_CONSTANT;
}

/** Second derivative of pressure by temperature, Pa/K2. */
export function gasCurvature(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? 6 *
        real *
        square *
        (reciprocal * reciprocal) *
        (BWR_C * decayed * density * (1 + g) - BWR_C0 * (reciprocal * reciprocal))
    : 0;
}

/** Mixed second derivative of pressure by density and temperature, J/(kg K). */
export function gasMixedCurvature(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? NITROGEN_GAS_CONSTANT +
        real *
          density *
          (2 * (BWR_B0 * NITROGEN_GAS_CONSTANT + 2 * BWR_C0 * (reciprocal * reciprocal) * reciprocal) +
            density * (3 * BWR_B * NITROGEN_GAS_CONSTANT - 2 * BWR_C * reciprocal * decayed * (3 + g * (3 - 2 * g))))
    : NITROGEN_GAS_CONSTANT;
}

/** Second derivative of pressure by density, Pa m6/kg2. */
export function gasDensityCurvature(density: number, temperature: number, real: number): number {
  const square = density * density;
  const rt = NITROGEN_GAS_CONSTANT * temperature;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? real *
        (2 * (BWR_B0 * rt - BWR_A0 - BWR_C0 * (reciprocal * reciprocal)) +
          density *
            (6 * (BWR_B * rt - BWR_A) +
              30 * BWR_A * BWR_ALPHA * (square * density) +
              2 * BWR_C * decayed * (3 + g * (3 + g * (2 * g - 9)))))
    : 0;
}

/** Derivative of the heat capacity by temperature, J/(kg K2). */
export function gasHeatCapacityByTemperature(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const y = NITROGEN_VIBRATION * reciprocal;
  const e = Math.exp(-y);
  const excited = y / (1 - e);
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  const vibration = NITROGEN_GAS_CONSTANT * e * excited * excited;
  const residual =
    reciprocal *
    (6 * (reciprocal * reciprocal) * (BWR_C0 * density - BWR_C / BWR_GAMMA) +
      3 * BWR_C * decayed * (2 / BWR_GAMMA + square));
  return real > 0 ? -real * reciprocal * (vibration * (2 - excited * (1 + e)) + 3 * residual) : 0;
}

/**
 * Slopes of the laws above, in the form that the builder takes instead of differentiating them: one evaluation serves
 * all states. `real` is a constant. (dc_v/drho = -T p_TT / rho^2.)
 */
export const gasPressureSlopes = {
  density: (density: number, temperature: number, real: number, _value: number) =>
    gasPressureByDensity(density, temperature, real),
  temperature: (density: number, temperature: number, real: number, _value: number) =>
    gasPressureByTemperature(density, temperature, real),
};
export const gasPressureByTemperatureSlopes = {
  density: (density: number, temperature: number, real: number, _value: number) =>
    gasMixedCurvature(density, temperature, real),
  temperature: (density: number, temperature: number, real: number, _value: number) =>
    gasCurvature(density, temperature, real),
};
export const gasPressureByDensitySlopes = {
  density: (density: number, temperature: number, real: number, _value: number) =>
    gasDensityCurvature(density, temperature, real),
  temperature: (density: number, temperature: number, real: number, _value: number) =>
    gasMixedCurvature(density, temperature, real),
};
export const gasHeatCapacitySlopes = {
  density: (density: number, temperature: number, real: number, _value: number) =>
    (-temperature * gasCurvature(density, temperature, real)) / (density * density),
  temperature: (density: number, temperature: number, real: number, _value: number) =>
    gasHeatCapacityByTemperature(density, temperature, real),
};

/** Internal energy, J/kg, zero for the dilute gas at 0 K. Consistent with the laws above: du/dT = c_v, du/dv = T p_T - p. */
export function gasEnergy(density: number, temperature: number, real: number): number {
  const square = density * density;
  const reciprocal = 1 / temperature;
  const e = Math.exp(-(NITROGEN_VIBRATION * reciprocal));
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  return real > 0
    ? 2.5 * NITROGEN_GAS_CONSTANT * temperature +
        real *
          ((NITROGEN_GAS_CONSTANT * NITROGEN_VIBRATION * e) / (1 - e) -
            (BWR_A0 + 3 * BWR_C0 * (reciprocal * reciprocal)) * density -
            0.5 * BWR_A * square +
            0.2 * BWR_A * BWR_ALPHA * square * (square * density) +
            ((1.5 * BWR_C) / BWR_GAMMA) * (2 * (reciprocal * reciprocal) - decayed * (2 + g)))
    : 2.5 * NITROGEN_GAS_CONSTANT * temperature;
}

/**
 * Share of the gas pressure that the oil of an accumulator sees, 0 to 1, by its oil volume: 1 with the poppet open, and
 * 1 - (1 - V/Vc)^3 below the closing volume Vc, where the poppet carries the rest. The gas then gives way only by this
 * share of the oil volume (see `separatorTravel`), which keeps the energy exact and the oil pressure above zero.
 */
export function poppetShare(oilVolume: number, closingVolume: number): number {
  const closed = Math.max(0, 1 - oilVolume * (1 / closingVolume));
  return 1 - closed * closed * closed;
}

/** Volume by which the gas has shrunk from its precharge volume, m3: the integral of the poppet's share. */
export function separatorTravel(oilVolume: number, closingVolume: number): number {
  const closed = Math.max(0, 1 - oilVolume * (1 / closingVolume));
  return oilVolume - 0.25 * closingVolume * (1 - closed * closed * closed * closed);
}

/** Pressure, Pa, that the end stop adds: a cubic spring past `fullVolume`, `stopPressure` at five closing volumes past it. */
export function stopRise(oilVolume: number, closingVolume: number, fullVolume: number, stopPressure: number): number {
  const past = Math.max(0, oilVolume - fullVolume) * (0.2 / closingVolume);
  return stopPressure * (past * past) * past;
}

/** Energy in that spring, J. */
export function stopEnergy(oilVolume: number, closingVolume: number, fullVolume: number, stopPressure: number): number {
  const past = Math.max(0, oilVolume - fullVolume) * (0.2 / closingVolume);
  return 1.25 * stopPressure * closingVolume * (past * past) * (past * past);
}

/** Gas volume, m3, never below half a percent of `volume`. */
export function accumulatorGasVolume(oilVolume: number, volume: number, closingVolume: number): number {
  return Math.max(volume - separatorTravel(oilVolume, closingVolume), 0.005 * volume);
}

/** Oil pressure, Pa, of an accumulator whose oil takes `oilVolume`. */
export function accumulatorPressure(
  oilVolume: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
): number {
  const density = gasMass * (1 / accumulatorGasVolume(oilVolume, volume, closingVolume));
  return (
    gasPressure(density, temperature, real) * poppetShare(oilVolume, closingVolume) +
    stopRise(oilVolume, closingVolume, fullVolume, stopPressure)
  );
}

/** Its derivative by the oil volume, Pa/m3. */
export function accumulatorStiffness(
  oilVolume: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
): number {
  const reciprocal = 1 / accumulatorGasVolume(oilVolume, volume, closingVolume);
  const density = gasMass * reciprocal;
  const closed = Math.max(0, 1 - oilVolume * (1 / closingVolume));
  const share = poppetShare(oilVolume, closingVolume);
  const past = Math.max(0, oilVolume - fullVolume) * (0.2 / closingVolume);
  return (
    gasPressureByDensity(density, temperature, real) * density * reciprocal * (share * share) +
    (gasPressure(density, temperature, real) * (3 * (closed * closed)) + 0.6 * stopPressure * (past * past)) *
      (1 / closingVolume)
  );
}

/** Volume of oil as a share of its volume at the standard atmosphere; the same law as `oilVolumeRatio` of oil.ts. */
export function storedOilRatio(pressure: number, freeAir: number, numerator: number, denominator: number): number {
  const above = pressure - 101325;
  const air = freeAir * 101325 * (1 / pressure);
  const thinning = 1 / (1 + denominator * above);
  return air + (1 - freeAir) * (1 + numerator * above) * thinning;
}

/** Its derivative by pressure, 1/Pa; the same law as `oilVolumeSlope` of oil.ts. */
export function storedOilSlope(pressure: number, freeAir: number, numerator: number, denominator: number): number {
  const above = pressure - 101325;
  const air = freeAir * 101325 * (1 / pressure);
  const thinning = 1 / (1 + denominator * above);
  return -(air * (1 / pressure)) - (1 - freeAir) * (denominator - numerator) * (thinning * thinning);
}

/** One Newton step towards the oil volume at which the oil, compressed by the accumulator's pressure, just fits. */
export function accumulatorNewton(
  oilVolume: number,
  relaxed: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
  freeAir: number,
  numerator: number,
  denominator: number,
): number {
  const pressure = accumulatorPressure(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const stiffness = accumulatorStiffness(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const excess = oilVolume - relaxed * storedOilRatio(pressure, freeAir, numerator, denominator);
  const next =
    oilVolume - excess / (1 - relaxed * storedOilSlope(pressure, freeAir, numerator, denominator) * stiffness);
  return Math.min(Math.max(next, 0.5 * relaxed), 0.99 * volume);
}

/**
 * Oil volume, m3, of an accumulator that holds `mass` kg of oil (> 0) and `gasMass` kg of gas at `temperature` K: the
 * root of V_oil - m/rho_ref x(p(V_oil)) = 0 by two Newton steps. The start compresses the liquid by the pressure of an
 * ideal gas, and counts the air at a pressure that rises in proportion to the oil volume below the closing volume, so
 * that it holds down to an empty port. Residual below 1e-12 of `volume` up to 400 bar and 1e-9 up to 500 bar; past the end of
 * travel up to 1e-4.
 */
export function accumulatorOilVolume(
  mass: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
  referenceDensity: number,
  freeAir: number,
  numerator: number,
  denominator: number,
): number {
  const relaxed = mass * (1 / referenceDensity);
  const dilute = NITROGEN_GAS_CONSTANT * temperature * gasMass;
  const estimate = dilute / Math.max(volume - relaxed, 0.05 * volume) - 101325;
  const liquid = (relaxed * (1 - freeAir) * (1 + numerator * estimate)) / (1 + denominator * estimate);
  const air = (relaxed * freeAir * 135100 * closingVolume * volume) / dilute;
  const start = 0.5 * (liquid + Math.sqrt(liquid * liquid + air));
  const first = accumulatorNewton(
    Math.min(start, 0.97 * volume),
    relaxed,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
    freeAir,
    numerator,
    denominator,
  );
  return accumulatorNewton(
    first,
    relaxed,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
    freeAir,
    numerator,
    denominator,
  );
}

/** How the oil volume answers a mass of oil, m3/kg: (dV/dm) at the solution `oilVolume`. */
export function accumulatorVolumeByMass(
  mass: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
  referenceDensity: number,
  freeAir: number,
  numerator: number,
  denominator: number,
  oilVolume: number,
): number {
  const pressure = accumulatorPressure(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const stiffness = accumulatorStiffness(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const slope = mass * (1 / referenceDensity) * storedOilSlope(pressure, freeAir, numerator, denominator);
  return (
    storedOilRatio(pressure, freeAir, numerator, denominator) * (1 / referenceDensity) * (1 / (1 - slope * stiffness))
  );
}

/** How it answers a change of gas pressure by itself, m3/Pa, negative: (dV/dp_gas) at the solution `oilVolume`. */
export function accumulatorVolumeByGas(
  mass: number,
  temperature: number,
  gasMass: number,
  real: number,
  volume: number,
  closingVolume: number,
  fullVolume: number,
  stopPressure: number,
  referenceDensity: number,
  freeAir: number,
  numerator: number,
  denominator: number,
  oilVolume: number,
): number {
  const pressure = accumulatorPressure(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const stiffness = accumulatorStiffness(
    oilVolume,
    temperature,
    gasMass,
    real,
    volume,
    closingVolume,
    fullVolume,
    stopPressure,
  );
  const slope = mass * (1 / referenceDensity) * storedOilSlope(pressure, freeAir, numerator, denominator);
  return slope * poppetShare(oilVolume, closingVolume) * (1 / (1 - slope * stiffness));
}

/** Exact slopes of `accumulatorOilVolume` by the implicit function theorem; the other arguments are constants. */
export const accumulatorOilVolumeSlopes = {
  mass: (
    mass: number,
    temperature: number,
    gasMass: number,
    real: number,
    volume: number,
    closingVolume: number,
    fullVolume: number,
    stopPressure: number,
    referenceDensity: number,
    freeAir: number,
    numerator: number,
    denominator: number,
    oilVolume: number,
  ) =>
    accumulatorVolumeByMass(
      mass,
      temperature,
      gasMass,
      real,
      volume,
      closingVolume,
      fullVolume,
      stopPressure,
      referenceDensity,
      freeAir,
      numerator,
      denominator,
      oilVolume,
    ),
  temperature: (
    mass: number,
    temperature: number,
    gasMass: number,
    real: number,
    volume: number,
    closingVolume: number,
    fullVolume: number,
    stopPressure: number,
    referenceDensity: number,
    freeAir: number,
    numerator: number,
    denominator: number,
    oilVolume: number,
  ) =>
    accumulatorVolumeByGas(
      mass,
      temperature,
      gasMass,
      real,
      volume,
      closingVolume,
      fullVolume,
      stopPressure,
      referenceDensity,
      freeAir,
      numerator,
      denominator,
      oilVolume,
    ) *
    gasPressureByTemperature(gasMass * (1 / accumulatorGasVolume(oilVolume, volume, closingVolume)), temperature, real),
  gasMass: (
    mass: number,
    temperature: number,
    gasMass: number,
    real: number,
    volume: number,
    closingVolume: number,
    fullVolume: number,
    stopPressure: number,
    referenceDensity: number,
    freeAir: number,
    numerator: number,
    denominator: number,
    oilVolume: number,
  ) =>
    accumulatorVolumeByGas(
      mass,
      temperature,
      gasMass,
      real,
      volume,
      closingVolume,
      fullVolume,
      stopPressure,
      referenceDensity,
      freeAir,
      numerator,
      denominator,
      oilVolume,
    ) *
    gasPressureByDensity(gasMass * (1 / accumulatorGasVolume(oilVolume, volume, closingVolume)), temperature, real) *
    (1 / accumulatorGasVolume(oilVolume, volume, closingVolume)),
};
