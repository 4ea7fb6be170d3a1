import { branch } from './define.js';
import * as frictionLaws from './laws/friction.js';
import {
  brakeBristles,
  brakeMaximumTorque,
  brakeTorqueLeft,
  frictionBrakeReadings,
  frictionBrakeStates,
} from './shared-parameters.js';

/**
 * Park brake on a shaft against the frame: springs apply it, the command releases it, with a lag. Bristle friction holds a
 * standing vehicle without creep. Without supply it applies.
 */
export const parkBrake = branch({
  kind: 'park-brake',
  about: 'spring-applied brake of a shaft against the frame, released by command',
  source: 'Canudas de Wit et al., IEEE Trans. Autom. Control 40 (1995) 419 (bristles)',
  valid: 'no fade with temperature',
  ports: { shaft: 'shaft' },
  states: frictionBrakeStates,
  commands: {
    release: { unit: '1', about: 'release, 0 applied to 1 released', rest: 0, least: 0, most: 1 },
    power: { unit: '1', about: 'supply of the release, on above 0.5', rest: 1, least: 0, most: 1 },
    gainFactor: brakeTorqueLeft,
  },
  readings: frictionBrakeReadings,
  parameters: {
    maximumTorque: brakeMaximumTorque,
    applicationTime: { unit: 's', about: 'lag of the application', default: 0.2, least: 0.003, usual: [0.1, 1] },
    ...brakeBristles,
  },
  starts: { application: { unit: '1', about: 'application', default: 1, least: 0, most: 1 } },
  laws: frictionLaws,
  heat: 'leaves',
  flows({ parameter, shaft, state, command, derivative, reading, law }) {
    const level = law.stribeckLevel(shaft.speed, parameter.staticFactor, parameter.staticWidth);
    const capacity = parameter.maximumTorque * state.application;
    const torque = law.bristleTorque(capacity, shaft.speed, state.deflection, level, parameter.bristleDamping);
    const heat = law.bristleLoss(capacity, shaft.speed, state.deflection, level, parameter.bristleDamping);
    shaft.torque -= torque;
    derivative.application =
      ((1 - (command.power > 0.5 ? command.release : 0)) * command.gainFactor - state.application) /
      parameter.applicationTime;
    derivative.deflection = law.bristleRate(shaft.speed, state.deflection, level, parameter.bristleAngle);
    derivative.brakeEnergy = heat;
    reading.torque = torque;
    reading.capacity = capacity * parameter.staticFactor;
    reading.brakePower = heat;
  },
  energy({ parameter, state, law }) {
    return law.bristleEnergy(parameter.maximumTorque * state.application, state.deflection, parameter.bristleAngle);
  },
  supply({ parameter, state, command, law }) {
    const rate =
      ((1 - (command.power > 0.5 ? command.release : 0)) * command.gainFactor - state.application) /
      parameter.applicationTime;
    return law.bristleEnergy(parameter.maximumTorque * Math.max(rate, 0), state.deflection, parameter.bristleAngle);
  },
  loss({ parameter, shaft, state, command, law }) {
    const level = law.stribeckLevel(shaft.speed, parameter.staticFactor, parameter.staticWidth);
    const rate =
      ((1 - (command.power > 0.5 ? command.release : 0)) * command.gainFactor - state.application) /
      parameter.applicationTime;
    return (
      law.bristleLoss(
        parameter.maximumTorque * state.application,
        shaft.speed,
        state.deflection,
        level,
        parameter.bristleDamping,
      ) + law.bristleEnergy(parameter.maximumTorque * Math.max(-rate, 0), state.deflection, parameter.bristleAngle)
    );
  },
  initial: ({ start }) => ({ application: start.application! }),
});
