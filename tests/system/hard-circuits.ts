import * as library from '../../plants/library.js';
import type { ElementInstance, ElementKind } from '../../runtime/contract.js';
import { element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil } from '../support/oil.js';
import type { HardCircuit } from './converged.js';

/** The hard circuits: six, some in two variants, all with starts that are a few bar out of balance. */
const fluid = oil();
const ambient = { ambientTemperature: 293.15 };
const standing = (
  name: string,
  kind: ElementKind,
  parameters: Record<string, number>,
  start: Record<string, number> = {},
) => element(name, kind, { ...(kind.fluid ? { fluid } : {}), parameters, start });
const volume = (name: string, litres: number, pressure: number) =>
  standing(name, library.oilVolume, { volume: litres * litre }, { pressure: pressure * bar });
const accumulator = (name: string, parameters: Record<string, number>, start: Record<string, number>) =>
  standing(name, library.gasAccumulator, { ...ambient, ...parameters }, start);
const tank = (litres = 60) =>
  standing('tank', library.tank, { volume: litres * litre, ambientPressure: 101325, ...ambient }, { level: 0.6 });
const between = (
  name: string,
  kind: ElementKind,
  from: string,
  to: string,
  parameters: Record<string, number> = {},
  start: Record<string, number> = {},
) => element(name, kind, { parameters, start, to: { from: `${from}.oil`, to: `${to}.oil` } });

/**
 * 150 L/min through an isolation valve between 0.3 L and 0.2 L. Charging: the pumped side runs up to its relief valve.
 * Discharging: the drawn side runs down and is fed through its check valve. The valve shuts at its fastest.
 */
export function slam(direction: 'charging' | 'discharging'): HardCircuit {
  const elements = (): ElementInstance[] => [
    accumulator('accumulator', { volume: 20 * litre, precharge: 150 * bar }, { pressure: 244 * bar }),
    volume('near', 0.3, 240),
    volume('far', 0.2, 246),
    volume('low', 1.5, 8),
    accumulator(
      'reservoir',
      { volume: 20 * litre, precharge: 6 * bar, gas: 1, stopPressure: 60 * bar },
      { pressure: 10 * bar },
    ),
    between('neck', library.orifice, 'accumulator', 'near', { area: 4e-4 }),
    between(
      'valve',
      library.isolationValve,
      'near',
      'far',
      { area: 3e-4, opens: 0.01, closes: 0.001, deadTime: 0, lag: 0.003 },
      { position: 1 },
    ),
    between('relief', library.reliefValve, 'far', 'low', {
      cracking: 330 * bar,
      fullFlow: 345 * bar,
      fullFlowRate: 250 * litresPerMinute,
    }),
    between('antiCavitation', library.checkValve, 'low', 'far', { area: 2.5e-4 }),
    between('reservoirNeck', library.orifice, 'reservoir', 'low', { area: 9e-4 }),
    between('unit', library.flowSource, 'low', 'far', { lag: 0.01 }),
  ];
  const sign = direction === 'charging' ? 1 : -1;
  return {
    elements,
    seconds: 0.6,
    reliefSetting: 330 * bar,
    drive: (set, time) => {
      set('unit.flowRequest', sign * 150 * litresPerMinute);
      set('valve.open', time < 0.15 || time >= 0.35 ? 1 : 0);
    },
  };
}

/** An accumulator of 10 L that is drawn empty at 40 L/min, shuts its poppet, stays drawn, and is filled again. */
export const empties: HardCircuit = {
  elements: () => [
    accumulator('accumulator', { volume: 10 * litre, precharge: 120 * bar }, { charge: 0.02 }),
    volume('line', 0.3, 124),
    tank(),
    between('neck', library.orifice, 'accumulator', 'line', { area: 2e-4 }),
    between('unit', library.flowSource, 'tank', 'line'),
    between('relief', library.reliefValve, 'line', 'tank', {
      cracking: 330 * bar,
      fullFlow: 345 * bar,
      fullFlowRate: 120 * litresPerMinute,
    }),
  ],
  seconds: 1.2,
  reliefSetting: 330 * bar,
  drive: (set, time) => set('unit.flowRequest', (time < 0.5 ? -40 : time < 0.55 ? 0 : 40) * litresPerMinute),
};

/** Two check valves at one chamber of 40 mL that breathes at 12 Hz: suction and pressure valve of a piston pump. */
export const pumpChamber: HardCircuit = {
  elements: () => [
    accumulator('accumulator', { volume: 1 * litre, precharge: 80 * bar }, { pressure: 120 * bar }),
    volume('chamber', 0.04, 60),
    tank(),
    between('suction', library.checkValve, 'tank', 'chamber', {
      area: 1.5e-4,
      cracking: 0.1 * bar,
      opensOver: 0.4 * bar,
    }),
    between('pressure', library.checkValve, 'chamber', 'accumulator', { area: 8e-5 }),
    between('piston', library.flowSource, 'tank', 'chamber', { lag: 0.002 }),
    between('load', library.orifice, 'accumulator', 'tank', { area: 1.5e-6 }),
    between('relief', library.reliefValve, 'accumulator', 'tank', {
      cracking: 200 * bar,
      fullFlow: 215 * bar,
      fullFlowRate: 60 * litresPerMinute,
    }),
  ],
  seconds: 0.8,
  reliefSetting: 200 * bar,
  drive: (set, time) => set('piston.flowRequest', 30 * litresPerMinute * Math.sin(2 * Math.PI * 12 * time)),
};

/** A shuttle: two check valves feed one volume of 50 mL from two lines that take turns in being the higher one. */
export const shuttle: HardCircuit = {
  elements: () => [
    standing('leftSupply', library.pressureSource, { pressure: 105 * bar }),
    standing('rightSupply', library.pressureSource, { pressure: 100 * bar }),
    volume('left', 0.2, 102),
    volume('right', 0.2, 104),
    volume('common', 0.05, 108),
    tank(),
    between('leftPort', library.orifice, 'leftSupply', 'left', { area: 1e-4 }),
    between('rightPort', library.orifice, 'rightSupply', 'right', { area: 1e-4 }),
    between('fromLeft', library.checkValve, 'left', 'common', { area: 1e-4 }),
    between('fromRight', library.checkValve, 'right', 'common', { area: 1e-4 }),
    between('load', library.orifice, 'common', 'tank', { area: 4e-6 }),
  ],
  seconds: 0.6,
  reliefSetting: 200 * bar,
  drive: (set, time) => {
    set('leftSupply.pressureChange', (Math.floor(time / 0.1) % 2 === 0 ? 0 : -30) * bar);
    set('rightSupply.pressureChange', 20 * bar * Math.sin(2 * Math.PI * 20 * time));
  },
};

/** An accumulator, its neck, an open valve and two volumes that start 4 bar and 8 bar above it, closed off. */
export const outOfBalance = (): ElementInstance[] => [
  accumulator('accumulator', { volume: 50 * litre, precharge: 150 * bar }, { pressure: 260 * bar }),
  volume('near', 0.3, 264),
  volume('far', 0.3, 268),
  between('neck', library.orifice, 'accumulator', 'near', { area: 4e-4 }),
  between('valve', library.isolationValve, 'near', 'far', { area: 4e-4 }, { position: 1 }),
];

/** A reservoir of 1.3 bar absolute that is drawn empty, starves what draws from it, and is filled again. */
export const reservoir: HardCircuit = {
  elements: () => [
    accumulator(
      'reservoir',
      {
        volume: 10 * litre,
        precharge: 1.3 * bar,
        gas: 1,
        separator: 1,
        timeConstant: 5,
        stopPressure: 20 * bar,
        leastGasShare: 0.3,
      },
      { charge: 0.02 },
    ),
    volume('low', 0.8, 3.5),
    volume('high', 0.5, 60),
    accumulator('accumulator', { volume: 4 * litre, precharge: 60 * bar }, { pressure: 75 * bar }),
    between('neck', library.orifice, 'reservoir', 'low', { area: 6e-4 }),
    between('highNeck', library.orifice, 'accumulator', 'high', { area: 2e-4 }),
    between('unit', library.flowSource, 'low', 'high', { lag: 0.01 }),
    tank(),
    between('relief', library.reliefValve, 'low', 'tank', {
      cracking: 20 * bar,
      fullFlow: 24 * bar,
      fullFlowRate: 60 * litresPerMinute,
    }),
  ],
  seconds: 1.2,
  reliefSetting: 20 * bar,
  drive: (set, time) => set('unit.flowRequest', (time < 0.5 ? 40 : -40) * litresPerMinute),
};

/** A 7.5 t truck on a 10 % grade that hangs on a clutch against the frame; the clutch lets go, slips and takes hold again. */
export const clutchOnGrade: HardCircuit = {
  elements: () => [
    standing('body', library.vehicle, { mass: 7500, rollingResistance: 0.008, dragArea: 4.5, heightOfCentre: 1.1 }),
    standing('wheels', library.axle, { ratio: 4.1, inertia: 24 }),
    standing('output', library.inertia, { inertia: 0.35 }),
    standing('frame', library.speedSource, {}),
    element('clutch', library.clutch, {
      parameters: { maximumTorque: 1500, staticFactor: 1.15 },
      start: { application: 1 },
      to: { a: 'output.shaft', b: 'frame.shaft' },
    }),
    element('shaft', library.compliantShaft, {
      parameters: { stiffness: 9000, damping: 25 },
      to: { a: 'output.shaft', b: 'wheels.input' },
    }),
    element('tyres', library.tyre, {
      parameters: { radius: 0.48, loadShare: 1, axlePosition: 0 },
      to: { wheel: 'wheels.wheels', road: 'body.road' },
    }),
  ],
  seconds: 2.5,
  reliefSetting: 1,
  others: {
    'body.velocity': 1,
    'output.speed': 10,
    'clutch.torque': 1500,
    'shaft.torque': 1500,
    'clutch.deflection': 1,
  },
  drive: (set, time) => {
    set('body.grade', 0.1);
    set('clutch.engagement', time > 0.8 && time < 1.2 ? 0.35 : 1);
  },
};

/** A planetary joint between an engine torque on its carrier, a pump-motor on its sun and a load behind a shaft with backlash on its ring; every load turns round. */
export const planetary: HardCircuit = {
  elements: () => [
    standing(
      'joint',
      library.planetaryJoint,
      { ratio: 2.4, sunInertia: 0.02, ringInertia: 0.05, carrierInertia: 0.4, meshFriction: 3 },
      { carrierSpeed: 120, ringSpeed: 90 },
    ),
    standing('load', library.inertia, { inertia: 8, viscousFriction: 0.2 }, { speed: 90 }),
    accumulator('accumulator', { volume: 20 * litre, precharge: 150 * bar }, { pressure: 244 * bar }),
    volume('high', 0.5, 240),
    volume('low', 1.5, 8),
    volume('case', 0.5, 1.1),
    accumulator(
      'reservoir',
      { volume: 20 * litre, precharge: 6 * bar, gas: 1, stopPressure: 60 * bar },
      { pressure: 10 * bar },
    ),
    tank(),
    between('neck', library.orifice, 'accumulator', 'high', { area: 3e-4 }),
    between('reservoirNeck', library.orifice, 'reservoir', 'low', { area: 9e-4 }),
    between('drain', library.orifice, 'case', 'tank', { area: 6e-5 }),
    between('relief', library.reliefValve, 'high', 'low', {
      cracking: 330 * bar,
      fullFlow: 345 * bar,
      fullFlowRate: 200 * litresPerMinute,
    }),
    element('unit', library.pumpMotor, {
      parameters: { displacement: 60e-6, naturalFrequency: 60, rateLimit: 12 },
      to: { high: 'high.oil', low: 'low.oil', caseDrain: 'case.oil', shaft: 'joint.sun' },
    }),
    element('engine', library.torqueSource, { to: { shaft: 'joint.carrier' } }),
    element('shaft', library.compliantShaft, {
      parameters: { stiffness: 9000, damping: 12, backlash: 0.02 },
      to: { a: 'joint.ring', b: 'load.shaft' },
    }),
  ],
  seconds: 1.2,
  reliefSetting: 330 * bar,
  others: {
    'joint.carrierSpeed': 150,
    'joint.ringSpeed': 150,
    'joint.sunSpeed': 200,
    'load.speed': 150,
    'shaft.torque': 600,
  },
  drive: (set, time) => {
    const sign = Math.floor(time / 0.3) % 2 === 0 ? 1 : -1;
    set('engine.torque', sign * 320);
    set('unit.torqueRequest', -sign * 90);
  },
};

export const hardCircuits: readonly (readonly [string, HardCircuit])[] = [
  ['an isolation valve slammed while charging', slam('charging')],
  ['an isolation valve slammed while discharging', slam('discharging')],
  ['an accumulator that runs empty, closes and is refilled', empties],
  ['two check valves facing one volume: a pump chamber', pumpChamber],
  ['two check valves facing one volume: a shuttle', shuttle],
  ['a clutch that sticks on a grade', clutchOnGrade],
  ['a planetary joint under load reversal', planetary],
  ['a reservoir near zero pressure', reservoir],
];
