import { store } from './define.js';
import * as frictionLaws from './laws/friction.js';
import * as shaftLaws from './laws/shaft.js';

/**
 * Planetary gear as a joint: it owns the inertias of sun, ring and carrier (with the planets' mass) and ties their
 * speeds by sun + z ring = (1 + z) carrier. Two states, carrier and ring:
 *   [Jc + (1+z)^2 Js    -z(1+z) Js] [c']   [Tc + (1+z) Ts - z Tm]
 *   [-z(1+z) Js          Jr + z^2 Js] [r'] = [Tr - z Ts + z Tm]     Tm mesh friction on the sun against the carrier.
 */
export const planetaryJoint = store({
  kind: 'planetary-joint',
  about: 'planetary gear that ties the inertias of sun, ring and carrier',
  source: 'Willis 1841 (speeds); Lagrange (equations of motion)',
  valid: 'rigid teeth; the spin of the planets about their own axes is left out',
  ports: { sun: 'shaft', ring: 'shaft', carrier: 'shaft' },
  states: {
    carrierSpeed: { unit: 'rad/s', about: 'speed of the carrier', scale: 100 },
    ringSpeed: { unit: 'rad/s', about: 'speed of the ring', scale: 100 },
  },
  readings: {
    sunSpeed: { unit: 'rad/s', about: 'speed of the sun' },
    ringSpeedMagnitude: { unit: 'rad/s', about: 'speed of the ring without its sign', least: 0 },
    carrierSpeedMagnitude: { unit: 'rad/s', about: 'speed of the carrier without its sign', least: 0 },
    sunSpeedMagnitude: { unit: 'rad/s', about: 'speed of the sun without its sign', least: 0 },
    meshTorque: { unit: 'N m', about: 'friction torque on the sun against the carrier' },
  },
  parameters: {
    ratio: { unit: '1', about: 'teeth of the ring over teeth of the sun', least: 1.2, usual: [1.5, 5] },
    sunInertia: { unit: 'kg m2', about: 'inertia of the sun', least: 1e-5 },
    ringInertia: { unit: 'kg m2', about: 'inertia of the ring', least: 1e-5 },
    carrierInertia: { unit: 'kg m2', about: 'inertia of the carrier with the planets', least: 1e-5 },
    viscousFriction: {
      unit: 'N m s',
      about: 'mesh friction per speed of the sun to the carrier',
      default: 0.002,
      least: 0,
    },
    meshFriction: { unit: 'N m', about: 'constant mesh friction on the sun', default: 0, least: 0 },
    maximumRingSpeed: { unit: 'rad/s', about: 'highest speed of the ring; 0: not watched', default: 0, least: 0 },
    maximumCarrierSpeed: { unit: 'rad/s', about: 'highest speed of the carrier; 0: not watched', default: 0, least: 0 },
    maximumSunSpeed: { unit: 'rad/s', about: 'highest speed of the sun; 0: not watched', default: 0, least: 0 },
  },
  starts: {
    carrierSpeed: { unit: 'rad/s', about: 'speed of the carrier', default: 0 },
    ringSpeed: { unit: 'rad/s', about: 'speed of the ring', default: 0 },
  },
  laws: { ...frictionLaws, ...shaftLaws },
  heat: 'leaves',
  limits: [
    {
      reading: 'ringSpeedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumRingSpeed',
      meaning: 'the ring turns faster than its bearings are built for',
    },
    {
      reading: 'carrierSpeedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumCarrierSpeed',
      meaning: 'the planets are flung against their bearings',
    },
    {
      reading: 'sunSpeedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSunSpeed',
      meaning: 'the sun, the fastest member, turns faster than its bearings are built for',
    },
  ],
  efforts({ parameter, state, sun, ring, carrier, reading, law }) {
    const fast = law.sunSpeed(state.carrierSpeed, state.ringSpeed, parameter.ratio);
    sun.speed = fast;
    ring.speed = state.ringSpeed;
    carrier.speed = state.carrierSpeed;
    reading.sunSpeed = fast;
    reading.sunSpeedMagnitude = Math.abs(fast);
    reading.ringSpeedMagnitude = Math.abs(state.ringSpeed);
    reading.carrierSpeedMagnitude = Math.abs(state.carrierSpeed);
  },
  derivatives({ parameter, state, sun, ring, carrier, reading, derivative, law }) {
    const z = parameter.ratio;
    const relative = z * (state.carrierSpeed - state.ringSpeed);
    const mesh = parameter.viscousFriction * relative + law.slidingTorque(parameter.meshFriction, relative, 1);
    const onCarrier = carrier.torque + (1 + z) * sun.torque - z * mesh;
    const onRing = ring.torque - z * sun.torque + z * mesh;
    const a = parameter.carrierInertia + (1 + z) * (1 + z) * parameter.sunInertia;
    const b = -z * (1 + z) * parameter.sunInertia;
    const d = parameter.ringInertia + z * z * parameter.sunInertia;
    const determinant = a * d - b * b;
    derivative.carrierSpeed = (d * onCarrier - b * onRing) / determinant;
    derivative.ringSpeed = (a * onRing - b * onCarrier) / determinant;
    reading.meshTorque = mesh;
  },
  energy({ parameter, state, law }) {
    const fast = law.sunSpeed(state.carrierSpeed, state.ringSpeed, parameter.ratio);
    return (
      0.5 *
      (parameter.sunInertia * fast * fast +
        parameter.ringInertia * state.ringSpeed * state.ringSpeed +
        parameter.carrierInertia * state.carrierSpeed * state.carrierSpeed)
    );
  },
  loss({ parameter, state, law }) {
    const relative = parameter.ratio * (state.carrierSpeed - state.ringSpeed);
    return (parameter.viscousFriction * relative + law.slidingTorque(parameter.meshFriction, relative, 1)) * relative;
  },
  initial: ({ start }) => ({ carrierSpeed: start.carrierSpeed!, ringSpeed: start.ringSpeed! }),
});
