import { store } from './define.js';
import * as frictionLaws from './laws/friction.js';

/**
 * Driven axle: final drive, differential and both wheels turning together, one inertia at wheel speed.
 *   input speed = ratio wheel speed;   J w' = wheel torques + ratio input torque - loss torque
 * Loss torque at the wheels: oil and bearing drag, plus `meshLoss` of the torque that the final drive transmits; it is
 * additive and against the motion in all four quadrants.
 */
export const axle = store({
  kind: 'axle',
  about: 'final drive, differential and wheels of one axle as one inertia',
  source: 'additive gear losses: common practice, no source',
  valid: 'both wheels at one speed',
  ports: { input: 'shaft', wheels: 'shaft' },
  states: { speed: { unit: 'rad/s', about: 'speed of the wheels', scale: 50 } },
  readings: {
    inputSpeed: { unit: 'rad/s', about: 'speed of the input shaft' },
    inputTorque: { unit: 'N m', about: 'torque into the final drive' },
    lossTorque: { unit: 'N m', about: 'loss torque at the wheels' },
    speedMagnitude: { unit: 'rad/s', about: 'speed of the input without its sign', least: 0 },
  },
  parameters: {
    ratio: { unit: '1', about: 'input speed over wheel speed', default: 1, least: 0.1, usual: [2, 8] },
    inertia: { unit: 'kg m2', about: 'inertia of wheels and gear at wheel speed', least: 0.01, usual: [1, 60] },
    dragTorque: { unit: 'N m', about: 'drag of bearings and oil at the wheels', default: 0, least: 0, usual: [0, 60] },
    maximumSpeed: { unit: 'rad/s', about: 'highest speed of the input; 0: not watched', default: 0, least: 0 },
    meshLoss: { unit: '1', about: 'share of the transmitted torque that is lost', default: 0.03, least: 0, most: 0.3 },
  },
  starts: { speed: { unit: 'rad/s', about: 'speed of the wheels', default: 0 } },
  laws: frictionLaws,
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the final drive turns faster than its bearings and seals are built for',
    },
  ],
  efforts({ parameter, state, input, wheels, reading }) {
    input.speed = parameter.ratio * state.speed;
    wheels.speed = state.speed;
    reading.inputSpeed = parameter.ratio * state.speed;
    reading.speedMagnitude = Math.abs(parameter.ratio * state.speed);
  },
  derivatives({ parameter, state, input, wheels, reading, derivative, law }) {
    const transmitted = parameter.ratio * input.torque;
    const resisting = law.slidingTorque(
      parameter.dragTorque + parameter.meshLoss * Math.abs(transmitted),
      state.speed,
      0.1,
    );
    derivative.speed = (wheels.torque + transmitted - resisting) / parameter.inertia;
    reading.inputTorque = input.torque;
    reading.lossTorque = resisting;
  },
  energy({ parameter, state }) {
    return 0.5 * parameter.inertia * state.speed * state.speed;
  },
  loss({ parameter, state, input, law }) {
    return (
      law.slidingTorque(
        parameter.dragTorque + parameter.meshLoss * Math.abs(parameter.ratio * input.torque),
        state.speed,
        0.1,
      ) * state.speed
    );
  },
  initial: ({ start }) => ({ speed: start.speed! }),
});
