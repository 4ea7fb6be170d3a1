import type { CommandDeclaration, ParameterDeclaration } from '../runtime/contract.js';

/** Parameters, states, commands and readings that several elements declare alike. */

export const dischargeCoefficient = {
  unit: '1',
  about: 'discharge coefficient',
  default: 0.65,
  least: 0.3,
  most: 1,
  usual: [0.6, 0.8],
} as const satisfies ParameterDeclaration;

/** Of the square root of a stiff orifice: see `orificeMassFlow`. */
export const smoothing = {
  unit: 'Pa',
  about: 'pressure difference below which it is laminar',
  default: 2e4,
  least: 100,
  most: 2e5,
  difference: true,
} as const satisfies ParameterDeclaration;

/** A charge pump with its relief valve, whatever drives it. */
export const chargePumpParameters = {
  displacement: { unit: 'm3', about: 'volume displaced per turn', least: 1e-7, most: 1e-3, usual: [2e-6, 1e-4] },
  slipCoefficient: {
    unit: '1',
    about: 'leakage coefficient Cs after Wilson',
    default: 2e-8,
    least: 0,
    most: 1e-6,
    usual: [5e-9, 1e-7],
  },
  viscousCoefficient: {
    unit: '1',
    about: 'viscous friction coefficient Cv after Wilson',
    default: 1e5,
    least: 0,
    most: 1e7,
    usual: [5e4, 3e5],
  },
  frictionCoefficient: {
    unit: '1',
    about: 'dry friction coefficient Cf after Wilson',
    default: 0.1,
    least: 0,
    most: 0.5,
    usual: [0.03, 0.25],
  },
  dryTorque: { unit: 'N m', about: 'friction torque without pressure', default: 0.2, least: 0, most: 100 },
  smoothSpeed: {
    unit: 'rad/s',
    about: 'speed over which dry friction changes its sign',
    default: 1,
    least: 0.01,
    most: 20,
  },
  cracking: {
    unit: 'Pa',
    about: 'outlet pressure at which its relief valve begins to open',
    least: 1.1e5,
    most: 1e7,
    usual: [5e5, 4e6],
  },
  fullFlow: { unit: 'Pa', about: 'outlet pressure at the rated flow of its relief valve', least: 1.2e5, most: 2e7 },
  fullFlowRate: { unit: 'm3/s', about: 'that rated flow', least: 1e-6, most: 0.02, usual: [1e-4, 2e-3] },
  leastInletPressure: { unit: 'Pa', about: 'least inlet pressure; 0: not watched', default: 0.6e5, least: 0 },
  reliefLag: { unit: 's', about: 'lag of its relief valve', default: 0.005, least: 0.0005, most: 0.5 },
} as const satisfies Record<string, ParameterDeclaration>;

/**
 * Of stores of oil. A store that has run empty keeps the temperature of its metal: heat over mass alone would be a
 * quotient of two rounding errors.
 */
export const oilStoreParameters = {
  metalShare: {
    unit: '1',
    about: 'heat capacity of the metal that follows the oil temperature, as a share of that of a store full of oil',
    default: 0.01,
    least: 0.001,
    most: 100,
    usual: [0.005, 0.5],
  },
} as const;

/** A friction brake of a shaft against the frame, whatever applies it. */
export const frictionBrakeStates = {
  application: { unit: '1', about: 'application as a share of the full one', least: -0.001, scale: 1 },
  deflection: { unit: '1', about: 'bristle deflection', scale: 1 },
  brakeEnergy: { unit: 'J', about: 'heat of braking so far', scale: 1e5 },
} as const;
export const frictionBrakeReadings = {
  torque: { unit: 'N m', about: 'torque against the shaft' },
  capacity: { unit: 'N m', about: 'greatest torque at the present application', least: 0 },
  brakePower: { unit: 'W', about: 'heat of braking', least: 0 },
} as const;
export const brakeTorqueLeft = {
  unit: '1',
  about: 'share of the brake torque that is left',
  rest: 1,
  least: 0,
  most: 2,
  fault: true,
} as const satisfies CommandDeclaration;
export const brakeMaximumTorque = {
  unit: 'N m',
  about: 'torque at full application',
  least: 1,
  usual: [500, 30000],
} as const satisfies ParameterDeclaration;
export const brakeBristles = {
  bristleAngle: {
    unit: 'rad',
    about: 'slip after which friction is built up',
    default: 0.008,
    least: 0.002,
    most: 0.1,
  },
  bristleDamping: { unit: 's/rad', about: 'damping of sticking', default: 0.02, least: 0, most: 1 },
  staticFactor: { unit: '1', about: 'sticking over sliding torque', default: 1, least: 1, most: 2 },
  staticWidth: { unit: 'rad/s', about: 'slip over which it falls to sliding', default: 0.5, least: 0.01 },
} as const satisfies Record<string, ParameterDeclaration>;

/** Faults of a check valve, with a pilot or without. */
export const checkValveFaults = {
  stuckAt: { unit: '1', about: 'opening at which it sticks; below 0: free', rest: -1, least: -1, most: 1, fault: true },
  leakArea: { unit: 'm2', about: 'area that stays open', rest: 0, least: 0, most: 1e-3, fault: true },
} as const satisfies Record<string, CommandDeclaration>;

/** Of a spool that a command moves. */
export const spoolStuckAt = {
  unit: '1',
  about: 'position to which it goes and sticks; below 0: free',
  rest: -1,
  least: -1,
  most: 1,
  fault: true,
} as const satisfies CommandDeclaration;
