import { branch } from './define.js';
import * as frictionLaws from './laws/friction.js';

/** Drag of bearings, seals and air on a shaft: T = a sign(w) + b w + c w |w|, the sign smoothed over `width`. */
export const shaftDrag = branch({
  kind: 'shaft-drag',
  about: 'drag of bearings, seals and air on a shaft',
  source: 'common practice, no source',
  ports: { shaft: 'shaft' },
  readings: { torque: { unit: 'N m', about: 'torque against the shaft' } },
  parameters: {
    constantDrag: { unit: 'N m', about: 'constant part a', default: 0, least: 0 },
    linearDrag: { unit: 'N m s', about: 'linear part b', default: 0, least: 0 },
    quadraticDrag: { unit: 'N m s2', about: 'quadratic part c', default: 0, least: 0 },
    width: { unit: 'rad/s', about: 'speed over which the constant part turns its sign', default: 0.5, least: 0.01 },
  },
  laws: frictionLaws,
  heat: 'leaves',
  flows({ parameter, shaft, reading, law }) {
    const torque =
      law.slidingTorque(parameter.constantDrag, shaft.speed, parameter.width) +
      (parameter.linearDrag + parameter.quadraticDrag * Math.abs(shaft.speed)) * shaft.speed;
    shaft.torque -= torque;
    reading.torque = torque;
  },
  loss({ parameter, shaft, law }) {
    return (
      (law.slidingTorque(parameter.constantDrag, shaft.speed, parameter.width) +
        (parameter.linearDrag + parameter.quadraticDrag * Math.abs(shaft.speed)) * shaft.speed) *
      shaft.speed
    );
  },
});
