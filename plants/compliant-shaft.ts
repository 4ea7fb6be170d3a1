import { branch } from './define.js';
import * as shaftLaws from './laws/shaft.js';

/**
 * Elastic shaft with damping and, if wanted, backlash: torque = k g(twist) + d g'(twist) (wa - wb), twist' = wa - wb,
 * g the twist beyond the gap.
 *
 * Fast mode: w = sqrt(k (1/J1 + 1/J2)). Substeps of 0.25 ms resolve it below 1600 rad/s (w h <= 0.4); k = 20 kN m/rad
 * wants an inertia of at least 0.01 kg m2 at its lighter end. A stiffer shaft is better left out: join the inertias.
 */
export const compliantShaft = branch({
  kind: 'compliant-shaft',
  about: 'elastic shaft with damping and smooth backlash',
  source: 'Hooke; backlash as a dead zone, common practice, no source',
  ports: { a: 'shaft', b: 'shaft' },
  states: { twist: { unit: 'rad', about: 'angle of a ahead of b', scale: 0.05 } },
  readings: {
    torque: { unit: 'N m', about: 'torque from a to b' },
    power: { unit: 'W', about: 'power into the shaft at a' },
  },
  parameters: {
    stiffness: { unit: 'N m/rad', about: 'torsional stiffness', default: 1e4, least: 1, usual: [500, 1e5] },
    damping: { unit: 'N m s/rad', about: 'torsional damping', default: 20, least: 0, usual: [1, 500] },
    backlash: { unit: 'rad', about: 'free play from end to end', default: 0, least: 0, most: 0.5 },
  },
  starts: { twist: { unit: 'rad', about: 'angle of a ahead of b', default: 0 } },
  laws: shaftLaws,
  heat: 'leaves',
  flows({ parameter, a, b, state, derivative, reading, law }) {
    const gap = 0.5 * parameter.backlash;
    const corner = 0.1 * gap + 1e-9;
    const difference = a.speed - b.speed;
    const torque =
      parameter.stiffness * law.engagedTwist(state.twist, gap, corner) +
      parameter.damping * law.engagedShare(state.twist, gap, corner) * difference;
    a.torque -= torque;
    b.torque += torque;
    derivative.twist = difference;
    reading.torque = torque;
    reading.power = torque * a.speed;
  },
  energy({ parameter, state, law }) {
    const gap = 0.5 * parameter.backlash;
    return parameter.stiffness * law.engagedEnergy(state.twist, gap, 0.1 * gap + 1e-9);
  },
  loss({ parameter, a, b, state, law }) {
    const gap = 0.5 * parameter.backlash;
    const difference = a.speed - b.speed;
    return parameter.damping * law.engagedShare(state.twist, gap, 0.1 * gap + 1e-9) * difference * difference;
  },
  initial: ({ start }) => ({ twist: start.twist! }),
});
