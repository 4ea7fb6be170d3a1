import { branch } from './define.js';
import * as converterLaws from './laws/converter.js';
import * as frictionLaws from './laws/friction.js';

/**
 * An accessory on a shaft: alternator, steering pump, air compressor, fan. It takes the power that it is asked for, and
 * its losses and drag besides; at low speed its torque is bounded, so that the power falls.
 */
export const accessory = branch({
  kind: 'accessory',
  about: 'machine that takes power from a shaft: alternator, steering pump, air compressor, fan',
  source: 'common practice, no source',
  ports: { shaft: 'shaft' },
  states: {
    power: { unit: 'W', about: 'useful power that it is asked for, with its lag', scale: 1000 },
    delivered: { unit: 'J', about: 'useful energy so far', scale: 1e5 },
  },
  commands: {
    powerRequest: { unit: 'W', about: 'useful power wanted, added to the constant one', rest: 0, least: 0 },
    dragFactor: {
      unit: '1',
      about: 'drag as a multiple of that of a sound one',
      rest: 1,
      least: 0,
      most: 100,
      fault: true,
    },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque against the shaft' },
    usefulPower: { unit: 'W', about: 'power that leaves as useful' },
    missingPower: { unit: 'W', about: 'power wanted that is not given' },
  },
  parameters: {
    constantPower: { unit: 'W', about: 'useful power always wanted', default: 0, least: 0, usual: [0, 2e4] },
    maximumTorque: { unit: 'N m', about: 'greatest torque', default: 60, least: 0.1, usual: [5, 300] },
    leastSpeed: { unit: 'rad/s', about: 'speed from which it works', default: 40, least: 1, usual: [20, 120] },
    efficiency: {
      unit: '1',
      about: 'useful over mechanical power',
      default: 0.7,
      least: 0.05,
      most: 1,
      usual: [0.5, 0.9],
    },
    drag: { unit: 'N m', about: 'torque without load', default: 0.5, least: 0 },
    lag: { unit: 's', about: 'lag of the power', default: 0.1, least: 0.005, usual: [0.02, 0.5] },
    greatestMissing: { unit: 'W', about: 'missing power that is watched; 0: not watched', default: 0, least: 0 },
  },
  laws: { ...converterLaws, ...frictionLaws },
  heat: 'leaves',
  limits: [
    {
      reading: 'missingPower',
      side: 'above',
      level: 'not following',
      parameter: 'greatestMissing',
      meaning: 'the accessory cannot give what is needed: steering, brake air or battery will run short',
    },
  ],
  flows({ parameter, shaft, state, command, derivative, reading, law }) {
    const useful = Math.max(state.power, 0);
    const working = law.burdenTorque(
      shaft.speed,
      useful / parameter.efficiency,
      parameter.maximumTorque,
      parameter.leastSpeed,
    );
    const drag = law.slidingTorque(parameter.drag * command.dragFactor, shaft.speed, 1);
    const wanted = parameter.constantPower + Math.max(command.powerRequest, 0);
    shaft.torque -= working + drag;
    derivative.power = (wanted - state.power) / parameter.lag;
    derivative.delivered = parameter.efficiency * working * shaft.speed;
    reading.torque = working + drag;
    reading.usefulPower = parameter.efficiency * working * shaft.speed;
    reading.missingPower = useful - parameter.efficiency * working * shaft.speed;
  },
  /** The useful power leaves. */
  supply({ parameter, shaft, state, law }) {
    return (
      -parameter.efficiency *
      law.burdenTorque(
        shaft.speed,
        Math.max(state.power, 0) / parameter.efficiency,
        parameter.maximumTorque,
        parameter.leastSpeed,
      ) *
      shaft.speed
    );
  },
  loss({ parameter, shaft, state, command, law }) {
    const working = law.burdenTorque(
      shaft.speed,
      Math.max(state.power, 0) / parameter.efficiency,
      parameter.maximumTorque,
      parameter.leastSpeed,
    );
    const drag = law.slidingTorque(parameter.drag * command.dragFactor, shaft.speed, 1);
    return ((1 - parameter.efficiency) * working + drag) * shaft.speed;
  },
  initial: ({ parameter }) => ({ power: parameter.constantPower! }),
});
