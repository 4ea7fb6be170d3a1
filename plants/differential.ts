import { store } from './define.js';

/**
 * Open differential as a joint: input speed = ratio (left + right) / 2; it owns the inertias of input and both wheels.
 *   [Jl + q  q] [l']   [Tl + ratio/2 Ti - d (l - r)]
 *   [q  Jr + q] [r'] = [Tr + ratio/2 Ti + d (l - r)]     q = Ji ratio^2 / 4
 */
export const differential = store({
  kind: 'differential',
  about: 'final drive with open differential and a wheel on each side',
  source: 'Lagrange (equations of motion)',
  ports: { input: 'shaft', left: 'shaft', right: 'shaft' },
  states: {
    leftSpeed: { unit: 'rad/s', about: 'speed of the left wheel', scale: 50 },
    rightSpeed: { unit: 'rad/s', about: 'speed of the right wheel', scale: 50 },
  },
  readings: {
    inputSpeed: { unit: 'rad/s', about: 'speed of the input shaft' },
    speedMagnitude: { unit: 'rad/s', about: 'speed of the input without its sign', least: 0 },
    slipSpeed: { unit: 'rad/s', about: 'speed of one wheel over the other, without its sign', least: 0 },
  },
  parameters: {
    ratio: { unit: '1', about: 'input speed over mean wheel speed', default: 1, least: 0.1, usual: [2, 8] },
    inputInertia: { unit: 'kg m2', about: 'inertia at the input', default: 0.05, least: 0 },
    wheelInertia: { unit: 'kg m2', about: 'inertia of one wheel with its half shaft', least: 0.01, usual: [0.5, 30] },
    maximumSpeed: { unit: 'rad/s', about: 'highest speed of the input; 0: not watched', default: 0, least: 0 },
    maximumSlipSpeed: {
      unit: 'rad/s',
      about: 'highest speed of one wheel over the other; 0: not watched',
      default: 0,
      least: 0,
    },
    wheelFriction: { unit: 'N m s', about: 'friction torque of a wheel per speed', default: 0, least: 0 },
    lockingFriction: {
      unit: 'N m s',
      about: 'torque from the faster to the slower wheel per difference of their speeds',
      default: 0,
      least: 0,
    },
  },
  starts: { speed: { unit: 'rad/s', about: 'speed of both wheels', default: 0 } },
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the final drive turns faster than its bearings and seals are built for',
    },
    {
      reading: 'slipSpeed',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSlipSpeed',
      meaning: 'one wheel spins: the pinions of the differential seize within minutes',
    },
  ],
  efforts({ parameter, state, input, left, right, reading }) {
    const fast = 0.5 * parameter.ratio * (state.leftSpeed + state.rightSpeed);
    input.speed = fast;
    left.speed = state.leftSpeed;
    right.speed = state.rightSpeed;
    reading.inputSpeed = fast;
    reading.speedMagnitude = Math.abs(fast);
    reading.slipSpeed = Math.abs(state.leftSpeed - state.rightSpeed);
  },
  derivatives({ parameter, state, input, left, right, derivative }) {
    const drive = 0.5 * parameter.ratio * input.torque;
    const locking = parameter.lockingFriction * (state.leftSpeed - state.rightSpeed);
    const onLeft = left.torque + drive - locking - parameter.wheelFriction * state.leftSpeed;
    const onRight = right.torque + drive + locking - parameter.wheelFriction * state.rightSpeed;
    const shared = 0.25 * parameter.inputInertia * parameter.ratio * parameter.ratio;
    const own = parameter.wheelInertia + shared;
    const determinant = own * own - shared * shared;
    derivative.leftSpeed = (own * onLeft - shared * onRight) / determinant;
    derivative.rightSpeed = (own * onRight - shared * onLeft) / determinant;
  },
  energy({ parameter, state }) {
    const fast = 0.5 * parameter.ratio * (state.leftSpeed + state.rightSpeed);
    return (
      0.5 *
      (parameter.wheelInertia * (state.leftSpeed * state.leftSpeed + state.rightSpeed * state.rightSpeed) +
        parameter.inputInertia * fast * fast)
    );
  },
  loss({ parameter, state }) {
    const difference = state.leftSpeed - state.rightSpeed;
    return (
      parameter.lockingFriction * difference * difference +
      parameter.wheelFriction * (state.leftSpeed * state.leftSpeed + state.rightSpeed * state.rightSpeed)
    );
  },
  initial: ({ start }) => ({ leftSpeed: start.speed!, rightSpeed: start.speed! }),
});
