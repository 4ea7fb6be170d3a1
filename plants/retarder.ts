import { branch } from './define.js';
import * as frictionLaws from './laws/friction.js';

/**
 * Retarder on a shaft (hydrodynamic or eddy current): a torque against the rotation without contact, none at
 * standstill, full above `fullSpeed`, bounded by what its cooling takes away. It follows the demand with a lag.
 */
export const retarder = branch({
  kind: 'retarder',
  about: 'wear-free brake on a shaft: no torque at standstill, bounded by power',
  source: 'common practice, no source',
  ports: { shaft: 'shaft' },
  states: {
    application: { unit: '1', about: 'application as a share of the full one', least: -0.001, scale: 1 },
    brakeEnergy: { unit: 'J', about: 'heat of braking so far', scale: 1e5 },
  },
  commands: {
    demand: { unit: '1', about: 'wanted application, 0 to 1', rest: 0, least: 0, most: 1 },
    gainFactor: { unit: '1', about: 'share of the torque that is left', rest: 1, least: 0, most: 2, fault: true },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque against the shaft' },
    brakePower: { unit: 'W', about: 'heat of braking', least: 0 },
  },
  parameters: {
    maximumTorque: { unit: 'N m', about: 'torque at full application', least: 1, usual: [200, 4000] },
    maximumPower: { unit: 'W', about: 'power that its cooling takes away', least: 100, usual: [5e4, 6e5] },
    fullSpeed: {
      unit: 'rad/s',
      about: 'speed above which the torque is there',
      default: 40,
      least: 1,
      usual: [20, 100],
    },
    applicationTime: { unit: 's', about: 'lag of the application', default: 0.3, least: 0.01, usual: [0.1, 1] },
  },
  laws: frictionLaws,
  heat: 'leaves',
  flows({ parameter, shaft, state, command, derivative, reading, law }) {
    const torque = law.retarderTorque(
      shaft.speed,
      state.application,
      parameter.maximumTorque,
      parameter.maximumPower,
      parameter.fullSpeed,
    );
    shaft.torque -= torque;
    derivative.application = (command.demand * command.gainFactor - state.application) / parameter.applicationTime;
    derivative.brakeEnergy = torque * shaft.speed;
    reading.torque = torque;
    reading.brakePower = torque * shaft.speed;
  },
  loss({ parameter, shaft, state, law }) {
    return (
      law.retarderTorque(
        shaft.speed,
        state.application,
        parameter.maximumTorque,
        parameter.maximumPower,
        parameter.fullSpeed,
      ) * shaft.speed
    );
  },
});
