/**
 * Laws of nitrogen and of the gas-charged accumulator. Pure numbers, SI, absolute pressures.
 *
 * Equation of state: Benedict, Webb and Rubin with the nitrogen constants of Cooper and Goldfrank (1967), as tabulated
 * in Cengel and Boles (table 3-4) and Moran and Shapiro (table A-24), turned into mass units with M = 28.013 kg/kmol.
 * Energy form after Otis and Pourmovahed (1985). Within 1 % of the reference equation (Span et al. 2000) at 300 K to
 * 400 K up to 30 MPa. `real` is 1 for that equation and 0 for the ideal gas with c_v = 5/2 R (kappa = 1.4).
 *
 * `real` 2 is the reference equation of Span, Lemmon, Jacobsen, Wagner and Yokozeki (J. Phys. Chem. Ref. Data 29 (2000)
 * 1361) by a fit of its residual Helmholtz energy that a tick can afford, a/(R T) = sum x^i sum c_ij s^j with
 * x = rho / 300 kg/m3, s = 300 K / T; everything else is derived from that one function. From 230 K to 500 K up to 60 MPa
 * it is within 5e-5 of the reference's pressure, 1.1e-3 of its c_v and 1e-3 of dp/dT and dp/drho (made by
 * tools/measure/nitrogen-fit.ts, checked in tests/published/nitrogen.test.ts).
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

/** Gas constant and small terms of the ideal part of the reference equation. */
export const REFERENCE_GAS_CONSTANT = 296.8038515348667;
export const REFERENCE_VIBRATION_SHARE = 1.012941;
export const REFERENCE_CRITICAL_TEMPERATURE = 126.192;
export const REFERENCE_A3 = -0.0001934819;
export const REFERENCE_A4 = -1.247742e-5;
export const REFERENCE_A5 = 6.678326e-8;
/** Coefficients c_ij of the fit. */
export const FIT_10 = 0.3850013830119;
export const FIT_11 = -0.1077413790326;
export const FIT_12 = -0.5732898147183;
export const FIT_13 = 0.3757598298598;
export const FIT_14 = -0.1539774321935;
export const FIT_15 = 0.02578634091436;
export const FIT_20 = 0.03264258999697;
export const FIT_21 = 0.1430821022387;
export const FIT_22 = -0.2064199651901;
export const FIT_23 = 0.1295101281337;
export const FIT_24 = -0.01495084637243;
export const FIT_25 = -0.005001583580294;
export const FIT_30 = 0.1022711065495;
export const FIT_31 = -0.450085318422;
export const FIT_32 = 0.7546733247101;
export const FIT_33 = -0.5667984035651;
export const FIT_34 = 0.1858604217697;
export const FIT_35 = -0.01934703353238;
export const FIT_40 = -0.2123049471375;
export const FIT_41 = 1.08926326116;
export const FIT_42 = -1.99929085197;
export const FIT_43 = 1.742049153335;
export const FIT_44 = -0.7374229210565;
export const FIT_45 = 0.1221231639795;
export const FIT_50 = 0.171368004426;
export const FIT_51 = -0.9056002007576;
export const FIT_52 = 1.764545239019;
export const FIT_53 = -1.640850250876;
export const FIT_54 = 0.7434374711431;
export const FIT_55 = -0.1325374234196;
export const FIT_60 = -0.04121542609354;
export const FIT_61 = 0.2288923723439;
export const FIT_62 = -0.4651472141883;
export const FIT_63 = 0.4501684692178;
export const FIT_64 = -0.2113411306891;
export const FIT_65 = 0.0389130379179;

/** Six coefficients of a row of the fit, each times its weight, as a polynomial in s. */
export function fitRow(s: number, c0: number, c1: number, c2: number, c3: number, c4: number, c5: number): number {
  return c0 + s * (c1 + s * (c2 + s * (c3 + s * (c4 + s * c5))));
}

/** sum f_i x^i sum w_j c_ij s^j over the fit: with weights 1 its value, with others its derivatives. */
export function fitSum(
  density: number,
  temperature: number,
  f1: number,
  f2: number,
  f3: number,
  f4: number,
  f5: number,
  f6: number,
  w0: number,
  w1: number,
  w2: number,
  w3: number,
  w4: number,
  w5: number,
): number {
  const x = density * (1 / 300);
  const s = 300 * (1 / temperature);
  const row1 = fitRow(s, w0 * FIT_10, w1 * FIT_11, w2 * FIT_12, w3 * FIT_13, w4 * FIT_14, w5 * FIT_15);
  const row2 = fitRow(s, w0 * FIT_20, w1 * FIT_21, w2 * FIT_22, w3 * FIT_23, w4 * FIT_24, w5 * FIT_25);
  const row3 = fitRow(s, w0 * FIT_30, w1 * FIT_31, w2 * FIT_32, w3 * FIT_33, w4 * FIT_34, w5 * FIT_35);
  const row4 = fitRow(s, w0 * FIT_40, w1 * FIT_41, w2 * FIT_42, w3 * FIT_43, w4 * FIT_44, w5 * FIT_45);
  const row5 = fitRow(s, w0 * FIT_50, w1 * FIT_51, w2 * FIT_52, w3 * FIT_53, w4 * FIT_54, w5 * FIT_55);
  const row6 = fitRow(s, w0 * FIT_60, w1 * FIT_61, w2 * FIT_62, w3 * FIT_63, w4 * FIT_64, w5 * FIT_65);
  return x * (f1 * row1 + x * (f2 * row2 + x * (f3 * row3 + x * (f4 * row4 + x * (f5 * row5 + x * (f6 * row6))))));
}

/** Heat capacity of the dilute gas after the reference equation, J/(kg K). */
export function referenceDiluteHeatCapacity(temperature: number): number {
  const y = NITROGEN_VIBRATION * (1 / temperature);
  const e = Math.exp(-y);
  const excited = y / (1 - e);
  const t = temperature * (1 / REFERENCE_CRITICAL_TEMPERATURE);
  return (
    REFERENCE_GAS_CONSTANT *
    (2.5 -
      t * (2 * REFERENCE_A3 + t * (6 * REFERENCE_A4 + t * (12 * REFERENCE_A5))) +
      REFERENCE_VIBRATION_SHARE * e * excited * excited)
  );
}

/** Its derivative by temperature, J/(kg K2). */
export function referenceDiluteHeatCapacitySlope(temperature: number): number {
  const reciprocal = 1 / temperature;
  const y = NITROGEN_VIBRATION * reciprocal;
  const e = Math.exp(-y);
  const excited = y / (1 - e);
  const t = temperature * (1 / REFERENCE_CRITICAL_TEMPERATURE);
  return (
    REFERENCE_GAS_CONSTANT *
    (-(2 * REFERENCE_A3 + t * (12 * REFERENCE_A4 + t * (36 * REFERENCE_A5))) * (1 / REFERENCE_CRITICAL_TEMPERATURE) -
      reciprocal * REFERENCE_VIBRATION_SHARE * e * excited * excited * (2 - excited * (1 + e)))
  );
}

/** Internal energy of the dilute gas after the reference equation, J/kg. */
export function referenceDiluteEnergy(temperature: number): number {
  const e = Math.exp(-(NITROGEN_VIBRATION * (1 / temperature)));
  const t = temperature * (1 / REFERENCE_CRITICAL_TEMPERATURE);
  return (
    REFERENCE_GAS_CONSTANT *
    (2.5 * temperature -
      temperature * (t * (REFERENCE_A3 + t * (2 * REFERENCE_A4 + t * (3 * REFERENCE_A5)))) +
      (REFERENCE_VIBRATION_SHARE * NITROGEN_VIBRATION * e) / (1 - e))
  );
}

/** Pressure, Pa, at `density` kg/m3 and `temperature` K. */
export function gasPressure(density: number, temperature: number, real: number): number {
  const square = density * density;
  const rt = NITROGEN_GAS_CONSTANT * temperature;
  const reciprocal = 1 / temperature;
  const g = BWR_GAMMA * square;
  const decayed = Math.exp(-g) * (reciprocal * reciprocal);
  const reference =
    REFERENCE_GAS_CONSTANT *
    temperature *
    density *
    (1 + fitSum(density, temperature, 1, 2, 3, 4, 5, 6, 1, 1, 1, 1, 1, 1));
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    REFERENCE_GAS_CONSTANT * density * (1 + fitSum(density, temperature, 1, 2, 3, 4, 5, 6, 1, 0, -1, -2, -3, -4));
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    REFERENCE_GAS_CONSTANT * temperature * (1 + fitSum(density, temperature, 2, 6, 12, 20, 30, 42, 1, 1, 1, 1, 1, 1));
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    referenceDiluteHeatCapacity(temperature) +
    REFERENCE_GAS_CONSTANT * fitSum(density, temperature, 1, 1, 1, 1, 1, 1, 0, 0, -2, -6, -12, -20);
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    -REFERENCE_GAS_CONSTANT *
    density *
    (1 / temperature) *
    fitSum(density, temperature, 1, 2, 3, 4, 5, 6, 0, 0, -2, -6, -12, -20);
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    REFERENCE_GAS_CONSTANT * (1 + fitSum(density, temperature, 2, 6, 12, 20, 30, 42, 1, 0, -1, -2, -3, -4));
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    REFERENCE_GAS_CONSTANT *
    temperature *
    (1 / density) *
    fitSum(density, temperature, 2, 12, 36, 80, 150, 252, 1, 1, 1, 1, 1, 1);
  return real > 1
    ? reference
    : real > 0
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
  const reference =
    referenceDiluteHeatCapacitySlope(temperature) -
    REFERENCE_GAS_CONSTANT *
      (1 / temperature) *
      fitSum(density, temperature, 1, 1, 1, 1, 1, 1, 0, 0, -4, -18, -48, -100);
  return real > 1
    ? reference
    : real > 0
      ? -real * reciprocal * (vibration * (2 - excited * (1 + e)) + 3 * residual)
      : 0;
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
  const reference =
    referenceDiluteEnergy(temperature) +
    REFERENCE_GAS_CONSTANT * temperature * fitSum(density, temperature, 1, 1, 1, 1, 1, 1, 0, 1, 2, 3, 4, 5);
  return real > 1
    ? reference
    : real > 0
      ? 2.5 * NITROGEN_GAS_CONSTANT * temperature +
        real *
          ((NITROGEN_GAS_CONSTANT * NITROGEN_VIBRATION * e) / (1 - e) -
            (BWR_A0 + 3 * BWR_C0 * (reciprocal * reciprocal)) * density -
            0.5 * BWR_A * square +
            0.2 * BWR_A * BWR_ALPHA * square * (square * density) +
            ((1.5 * BWR_C) / BWR_GAMMA) * (2 * (reciprocal * reciprocal) - decayed * (2 + g)))
      : 2.5 * NITROGEN_GAS_CONSTANT * temperature;
}

/** Viscosity of nitrogen, Pa s: Sutherland's law and a rise with density through the values at 300 K, 10 and 30 MPa. */
export function nitrogenViscosity(density: number, temperature: number): number {
  const t = temperature * (1 / 273);
  return 1.663e-5 * t * Math.sqrt(t) * (380 / (temperature + 107)) + density * (1.188e-8 + 6.27e-11 * density);
}

/** Thermal conductivity of nitrogen, W/(m K): dilute with T^(3/4), the rise with density as for the viscosity. */
export function nitrogenConductivity(density: number, temperature: number): number {
  const t = temperature * (1 / 300);
  return 0.0259 * Math.sqrt(t * Math.sqrt(t)) + density * (3.686e-5 + 8.67e-8 * density);
}

/**
 * Heat transfer coefficient of turbulent natural convection, W/(m2 K): Nu = C Ra^(1/3) (McAdams, Heat Transmission, 1954),
 * from which the length drops out. The temperature difference is rounded over 0.01 K. `byTemperature` and `byDensity`
 * are the slopes of the pressure, which give the expansion and c_p.
 */
export function naturalConvection(
  density: number,
  temperature: number,
  wallTemperature: number,
  heatCapacity: number,
  byTemperature: number,
  byDensity: number,
  factor: number,
): number {
  const expansion = byTemperature / (density * byDensity);
  const atPressure = heatCapacity + (temperature * byTemperature * expansion) / density;
  const viscosity = nitrogenViscosity(density, temperature);
  const conductivity = nitrogenConductivity(density, temperature);
  const difference = wallTemperature - temperature;
  const size = Math.sqrt(difference * difference + 1e-4);
  const rayleigh = (9.80665 * expansion * size * (density * density) * atPressure) / (viscosity * conductivity);
  return factor * conductivity * Math.exp((1 / 3) * Math.log(rayleigh));
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
