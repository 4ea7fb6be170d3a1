import { branch } from './define.js';
import * as frictionLaws from './laws/friction.js';

/**
 * Friction clutch that sticks and slips: a bristle between two shafts whose capacity follows the engagement command
 * with a first-order lag. Rising capacity does work on the bristles (supply), falling capacity lets it go as loss.
 *
 * Fast mode: bristles against the lighter shaft, w = sqrt(Tmax / (bristleAngle J)). 1000 N m, 0.01 rad and 0.1 kg m2:
 * 1000 rad/s; substeps of 0.25 ms resolve up to 1600 rad/s.
 */
export const clutch = branch({
  kind: 'clutch',
  about: 'friction clutch between two shafts, sticking and slipping',
  source: 'Canudas de Wit et al., IEEE Trans. Autom. Control 40 (1995) 419 (bristles)',
  ports: { a: 'shaft', b: 'shaft' },
  states: {
    application: { unit: '1', about: 'clamping as a share of the full one', least: -0.001, most: 1.001, scale: 1 },
    deflection: { unit: '1', about: 'bristle deflection', scale: 1 },
    slipEnergy: { unit: 'J', about: 'heat of slipping so far', scale: 1e4 },
  },
  commands: {
    engagement: { unit: '1', about: 'wanted clamping, 0 open to 1 closed', rest: 0, least: 0, most: 1 },
    capacityFactor: {
      unit: '1',
      about: 'share of the torque capacity that is left',
      rest: 1,
      least: 0,
      most: 2,
      fault: true,
    },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque from a to b' },
    slip: { unit: 'rad/s', about: 'speed of a less speed of b' },
    capacity: { unit: 'N m', about: 'greatest torque at the present clamping', least: 0 },
    slipPower: { unit: 'W', about: 'heat of slipping', least: 0 },
  },
  parameters: {
    maximumTorque: { unit: 'N m', about: 'sliding torque when closed', least: 1, usual: [50, 5000] },
    engagementTime: { unit: 's', about: 'lag of the clamping', default: 0.03, least: 0.003, usual: [0.01, 0.3] },
    bristleAngle: {
      unit: 'rad',
      about: 'slip after which friction is built up',
      default: 0.01,
      least: 0.002,
      most: 0.1,
    },
    bristleDamping: { unit: 's/rad', about: 'damping of sticking', default: 0.05, least: 0, most: 1 },
    staticFactor: { unit: '1', about: 'sticking over sliding torque', default: 1, least: 1, most: 2 },
    staticWidth: { unit: 'rad/s', about: 'slip over which it falls to sliding', default: 2, least: 0.01 },
  },
  starts: { application: { unit: '1', about: 'clamping', default: 0, least: 0, most: 1 } },
  laws: frictionLaws,
  heat: 'leaves',
  flows({ parameter, a, b, state, command, derivative, reading, law }) {
    const slip = a.speed - b.speed;
    const level = law.stribeckLevel(slip, parameter.staticFactor, parameter.staticWidth);
    const capacity = parameter.maximumTorque * state.application;
    const torque = law.bristleTorque(capacity, slip, state.deflection, level, parameter.bristleDamping);
    const heat = law.bristleLoss(capacity, slip, state.deflection, level, parameter.bristleDamping);
    a.torque -= torque;
    b.torque += torque;
    derivative.application =
      (command.engagement * command.capacityFactor - state.application) / parameter.engagementTime;
    derivative.deflection = law.bristleRate(slip, state.deflection, level, parameter.bristleAngle);
    derivative.slipEnergy = heat;
    reading.torque = torque;
    reading.slip = slip;
    reading.capacity = capacity * parameter.staticFactor;
    reading.slipPower = heat;
  },
  energy({ parameter, state, law }) {
    return law.bristleEnergy(parameter.maximumTorque * state.application, state.deflection, parameter.bristleAngle);
  },
  supply({ parameter, state, command, law }) {
    const rate = (command.engagement * command.capacityFactor - state.application) / parameter.engagementTime;
    return law.bristleEnergy(parameter.maximumTorque * Math.max(rate, 0), state.deflection, parameter.bristleAngle);
  },
  loss({ parameter, a, b, state, command, law }) {
    const slip = a.speed - b.speed;
    const level = law.stribeckLevel(slip, parameter.staticFactor, parameter.staticWidth);
    const rate = (command.engagement * command.capacityFactor - state.application) / parameter.engagementTime;
    return (
      law.bristleLoss(
        parameter.maximumTorque * state.application,
        slip,
        state.deflection,
        level,
        parameter.bristleDamping,
      ) + law.bristleEnergy(parameter.maximumTorque * Math.max(-rate, 0), state.deflection, parameter.bristleAngle)
    );
  },
  initial: ({ start }) => ({ application: start.application! }),
});
