import { branch } from './define.js';
import * as converterLaws from './laws/converter.js';

/**
 * Electric starter motor with a free wheel: while engaged it gives a torque that falls in a straight line over the speed
 * of the shaft. Its work comes from outside; the current follows from efficiency and voltage.
 */
export const starterMotor = branch({
  kind: 'starter-motor',
  about: 'electric starter motor with a free wheel',
  source: 'straight line of torque over speed: common practice, no source',
  ports: { shaft: 'shaft' },
  states: {
    engaged: { unit: '1', about: 'pinion, 0 out to 1 in', least: -0.001, most: 1.001 },
    usedEnergy: { unit: 'J', about: 'electric energy so far', scale: 1e4 },
  },
  commands: {
    engage: { unit: '1', about: 'on above 0.5', rest: 0, least: 0, most: 1 },
    voltageFactor: { unit: '1', about: 'share of the battery voltage', rest: 1, least: 0, most: 1.3, fault: true },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque on the shaft' },
    electricPower: { unit: 'W', about: 'electric power', least: 0 },
  },
  parameters: {
    stallTorque: { unit: 'N m', about: 'torque at standstill, at the shaft', least: 1, usual: [60, 1000] },
    freeSpeed: { unit: 'rad/s', about: 'speed of the shaft at which it gives nothing', least: 1, usual: [25, 60] },
    efficiency: {
      unit: '1',
      about: 'efficiency of motor and pinion',
      default: 0.55,
      least: 0.1,
      most: 1,
      usual: [0.4, 0.7],
    },
    engageTime: { unit: 's', about: 'lag of the pinion', default: 0.05, least: 0.005, usual: [0.03, 0.15] },
  },
  laws: converterLaws,
  heat: 'leaves',
  flows({ parameter, shaft, state, command, derivative, reading, law }) {
    const torque =
      state.engaged *
      command.voltageFactor *
      law.starterTorque(shaft.speed, parameter.stallTorque, parameter.freeSpeed * command.voltageFactor + 0.01);
    const electric =
      (state.engaged *
        command.voltageFactor *
        law.starterTorque(shaft.speed, parameter.stallTorque, parameter.freeSpeed * command.voltageFactor + 0.01) *
        parameter.freeSpeed) /
      parameter.efficiency;
    shaft.torque += torque;
    derivative.engaged = ((command.engage > 0.5 ? 1 : 0) - state.engaged) / parameter.engageTime;
    derivative.usedEnergy = electric;
    reading.torque = torque;
    reading.electricPower = electric;
  },
  /** The work at the shaft; what the motor itself turns into heat does not enter the circuit. */
  supply({ parameter, shaft, state, command, law }) {
    return (
      state.engaged *
      command.voltageFactor *
      law.starterTorque(shaft.speed, parameter.stallTorque, parameter.freeSpeed * command.voltageFactor + 0.01) *
      shaft.speed
    );
  },
});
