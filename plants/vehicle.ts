import { store } from './define.js';
import * as frictionLaws from './laws/friction.js';
import * as roadLaws from './laws/road.js';

/**
 * The body of a vehicle on a road: m v' = road forces - rolling - air drag - m g sin(slope).
 *
 * Rolling resistance sticks (a bristle of `rollingLength`), so that a vehicle at rest on a slight grade stays there.
 * Payload follows its command over `loadingTime`; what is loaded arrives with the velocity of the vehicle. Pitching
 * moves m a h / L from the front to the rear axle with a first-order lag.
 */
export const vehicle = store({
  kind: 'vehicle',
  about: 'vehicle body with road load, grade, wind and payload',
  source: '40 CFR 1066.210 and SAE J2263 (road load); Newton',
  valid: 'straight road; the masses that rotate are elements of their own',
  ports: { road: 'road' },
  states: {
    velocity: { unit: 'm/s', about: 'forward velocity', scale: 10 },
    distance: { unit: 'm', about: 'distance driven', scale: 1000 },
    altitude: { unit: 'm', about: 'height climbed', scale: 10 },
    loadedMass: { unit: 'kg', about: 'payload on board', scale: 1000 },
    pitchAcceleration: { unit: 'm/s2', about: 'acceleration that the suspension has followed', scale: 1 },
    rollingDeflection: { unit: '1', about: 'bristle deflection of the rolling resistance', scale: 1 },
  },
  commands: {
    payload: {
      unit: 'kg',
      about: 'payload wanted on board; at rest that of the start',
      rest: 0,
      restFrom: 'payload',
      least: 0,
    },
    grade: { unit: '1', about: 'slope of the road, rise over run, uphill positive', rest: 0, least: -0.5, most: 0.5 },
    headwind: { unit: 'm/s', about: 'wind against the vehicle', rest: 0, least: -60, most: 60 },
  },
  readings: {
    acceleration: { unit: 'm/s2', about: 'forward acceleration' },
    speedMagnitude: { unit: 'm/s', about: 'velocity without its sign', least: 0 },
    totalMass: { unit: 'kg', about: 'mass with payload', least: 0 },
    tractiveForce: { unit: 'N', about: 'sum of the forces at the road' },
    rollingForce: { unit: 'N', about: 'rolling resistance and the constant and linear road load' },
    airDragForce: { unit: 'N', about: 'air drag and the quadratic road load' },
    gradeForce: { unit: 'N', about: 'downhill component of the weight' },
  },
  parameters: {
    mass: { unit: 'kg', about: 'mass without payload', least: 1, usual: [800, 40000] },
    rollingResistance: { unit: '1', about: 'coefficient of rolling resistance', default: 0, least: 0, most: 1 },
    dragArea: { unit: 'm2', about: 'drag coefficient times frontal area', default: 0, least: 0, usual: [0.4, 10] },
    airDensity: { unit: 'kg/m3', about: 'density of the air', default: 1.2, least: 0, usual: [0.9, 1.45] },
    constantLoad: { unit: 'N', about: 'constant term of a road load from a coast-down', default: 0, least: 0 },
    linearLoad: { unit: 'N s/m', about: 'linear term of it', default: 0, least: 0 },
    quadraticLoad: { unit: 'N s2/m2', about: 'quadratic term of it', default: 0, least: 0 },
    rollingLength: {
      unit: 'm',
      about: 'way over which rolling resistance builds up',
      default: 0.01,
      least: 0.001,
      most: 0.2,
    },
    rollingDamping: { unit: 's/m', about: 'damping of that build-up', default: 10, least: 0 },
    heightOfCentre: { unit: 'm', about: 'height of the centre of gravity; 0: no load shift', default: 0, least: 0 },
    wheelbase: { unit: 'm', about: 'distance of the axles', default: 4, least: 0.5 },
    pitchTime: { unit: 's', about: 'lag of pitching', default: 0.1, least: 0.01 },
    loadingTime: { unit: 's', about: 'lag of payload behind its command', default: 0.2, least: 0.01 },
    maximumSpeed: { unit: 'm/s', about: 'highest permitted velocity; 0: not watched', default: 0, least: 0 },
  },
  starts: {
    velocity: { unit: 'm/s', about: 'forward velocity', default: 0 },
    payload: { unit: 'kg', about: 'payload on board', default: 0 },
  },
  laws: { ...frictionLaws, ...roadLaws },
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the vehicle is faster than its tyres, brakes and driveline are permitted for',
    },
  ],
  efforts({ parameter, state, command, road, reading, law }) {
    const mass = parameter.mass + state.loadedMass;
    road.velocity = state.velocity;
    road.weight = mass * law.GRAVITY * law.slopeCosine(command.grade);
    road.loadShift = (mass * state.pitchAcceleration * parameter.heightOfCentre) / parameter.wheelbase;
    reading.totalMass = mass;
    reading.speedMagnitude = Math.abs(state.velocity);
  },
  derivatives({ parameter, state, command, road, reading, derivative, law }) {
    const mass = parameter.mass + state.loadedMass;
    const weight = mass * law.GRAVITY;
    const capacity = parameter.constantLoad + parameter.rollingResistance * weight * law.slopeCosine(command.grade);
    const rolling =
      law.bristleTorque(capacity, state.velocity, state.rollingDeflection, 1, parameter.rollingDamping) +
      parameter.linearLoad * state.velocity;
    const air = law.airDrag(
      parameter.quadraticLoad + law.dragCoefficient(parameter.airDensity, parameter.dragArea),
      state.velocity + command.headwind,
    );
    const downhill = weight * law.slopeSine(command.grade);
    const acceleration = (road.force - rolling - air - downhill) / mass;
    derivative.velocity = acceleration;
    derivative.distance = state.velocity;
    derivative.altitude = state.velocity * law.slopeSine(command.grade);
    derivative.loadedMass = (command.payload - state.loadedMass) / parameter.loadingTime;
    derivative.pitchAcceleration = (acceleration - state.pitchAcceleration) / parameter.pitchTime;
    derivative.rollingDeflection = law.bristleRate(state.velocity, state.rollingDeflection, 1, parameter.rollingLength);
    reading.acceleration = acceleration;
    reading.tractiveForce = road.force;
    reading.rollingForce = rolling;
    reading.airDragForce = air;
    reading.gradeForce = downhill;
  },
  energy({ parameter, state, command, law }) {
    const mass = parameter.mass + state.loadedMass;
    const capacity =
      parameter.constantLoad + parameter.rollingResistance * mass * law.GRAVITY * law.slopeCosine(command.grade);
    return (
      0.5 * mass * state.velocity * state.velocity +
      law.bristleEnergy(capacity, state.rollingDeflection, parameter.rollingLength)
    );
  },
  /** Gravity, the work of the wind, and what payload brings with it. */
  supply({ parameter, state, command, law }) {
    const mass = parameter.mass + state.loadedMass;
    const loading = (command.payload - state.loadedMass) / parameter.loadingTime;
    const air = law.airDrag(
      parameter.quadraticLoad + law.dragCoefficient(parameter.airDensity, parameter.dragArea),
      state.velocity + command.headwind,
    );
    const firmer = parameter.rollingResistance * loading * law.GRAVITY * law.slopeCosine(command.grade);
    return (
      air * command.headwind -
      mass * law.GRAVITY * law.slopeSine(command.grade) * state.velocity +
      0.5 * loading * state.velocity * state.velocity +
      law.bristleEnergy(firmer, state.rollingDeflection, parameter.rollingLength)
    );
  },
  loss({ parameter, state, command, law }) {
    const mass = parameter.mass + state.loadedMass;
    const relative = state.velocity + command.headwind;
    const capacity =
      parameter.constantLoad + parameter.rollingResistance * mass * law.GRAVITY * law.slopeCosine(command.grade);
    const air = law.airDrag(
      parameter.quadraticLoad + law.dragCoefficient(parameter.airDensity, parameter.dragArea),
      relative,
    );
    return (
      law.bristleLoss(capacity, state.velocity, state.rollingDeflection, 1, parameter.rollingDamping) +
      parameter.linearLoad * state.velocity * state.velocity +
      air * relative
    );
  },
  initial: ({ start }) => ({
    velocity: start.velocity!,
    loadedMass: start.payload!,
    rollingDeflection: Math.sign(start.velocity!),
  }),
  examine: ({ parameter }) =>
    parameter.rollingResistance! + parameter.constantLoad! > 0
      ? []
      : [
          {
            parameter: 'rollingResistance',
            what: 'the vehicle has no rolling resistance and will never stand still by itself',
            remedy: 'give rollingResistance, or constantLoad from a coast-down',
          },
        ],
});
