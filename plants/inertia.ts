import { store } from './define.js';

/** A rotating body: J w' = sum of torques - viscous friction. All shafts tied to it turn together. */
export const inertia = store({
  kind: 'inertia',
  about: 'rotating inertia with viscous friction',
  source: 'Newton-Euler equation of rotation about a fixed axis',
  ports: { shaft: 'shaft' },
  states: {
    speed: { unit: 'rad/s', about: 'angular speed', scale: 100 },
  },
  readings: {
    speedMagnitude: { unit: 'rad/s', about: 'speed without its sign', least: 0 },
    torque: { unit: 'N m', about: 'sum of the torques on it' },
  },
  parameters: {
    inertia: { unit: 'kg m2', about: 'moment of inertia', least: 1e-4, usual: [0.01, 50] },
    viscousFriction: { unit: 'N m s', about: 'friction torque per speed', default: 0, least: 0 },
    maximumSpeed: { unit: 'rad/s', about: 'speed above which it is damaged; 0: not watched', default: 0, least: 0 },
  },
  starts: { speed: { unit: 'rad/s', about: 'angular speed', default: 0 } },
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the shaft and what is tied to it turn faster than they are built for',
    },
  ],
  efforts({ state, shaft, reading }) {
    shaft.speed = state.speed;
    reading.speedMagnitude = Math.abs(state.speed);
  },
  derivatives({ parameter, state, shaft, reading, derivative }) {
    reading.torque = shaft.torque;
    derivative.speed = (shaft.torque - parameter.viscousFriction * state.speed) / parameter.inertia;
  },
  energy({ parameter, state }) {
    return 0.5 * parameter.inertia * state.speed * state.speed;
  },
  loss({ parameter, state }) {
    return parameter.viscousFriction * state.speed * state.speed;
  },
  initial: ({ start }) => ({ speed: start.speed! }),
});
