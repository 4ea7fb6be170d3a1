import { branch } from './define.js';
import * as tyreLaws from './laws/tyre.js';

/**
 * Longitudinal tyre with relaxation: the carcass deflection u is the state, slip is u / relaxationLength. The surface
 * scales the peak friction: of the Magic Formula the whole curve, as the commonly quoted sets for wet, snow and ice do.
 * A damping that fades with speed settles rocking at standstill.
 *
 * Load: `loadShare` of the body's weight, plus `axlePosition` (1 rear, -1 front) times the load that pitching moves,
 * plus the command `loadTransfer`. One element may stand for both tyres of an axle.
 *
 * Fast modes: wheel against carcass, w = sqrt(slope Fz r^2 / (sigma J)); 19, 40 kN, 0.5 m, 0.3 m, 20 kg m2: 28 Hz.
 */
export const tyre = branch({
  kind: 'tyre',
  about: 'longitudinal tyre with relaxation length',
  source: 'Pacejka, Tire and Vehicle Dynamics (Magic Formula, relaxation); Dugoff et al., SAE 700377',
  valid: 'no lateral slip; slip up to 3 at standstill',
  ports: { wheel: 'shaft', road: 'road' },
  states: {
    deflection: { unit: 'm', about: 'longitudinal deflection of the carcass', scale: 0.01 },
    strainEnergy: { unit: 'J', about: 'elastic energy of the carcass', scale: 100 },
  },
  commands: {
    surfaceFriction: {
      unit: '1',
      about: 'friction of the surface relative to the dry road of the parameters',
      rest: 1,
      least: 0.01,
      most: 2,
    },
    loadTransfer: { unit: 'N', about: 'vertical load added from elsewhere', rest: 0 },
  },
  readings: {
    slip: { unit: '1', about: 'longitudinal slip that the carcass feels, driving positive' },
    force: { unit: 'N', about: 'force on the body, forward positive' },
    load: { unit: 'N', about: 'vertical load' },
    lock: { unit: '1', about: 'slip of a braked wheel above walking pace, without its sign', least: 0 },
    slipVelocity: { unit: 'm/s', about: 'wheel speed times radius less velocity' },
  },
  parameters: {
    radius: { unit: 'm', about: 'rolling radius', least: 0.05, usual: [0.25, 0.6] },
    loadShare: { unit: '1', about: 'share of the weight of the body that it carries', default: 0.5, least: 0, most: 1 },
    axlePosition: { unit: '1', about: 'share of load shift: 1 rear, -1 front, 0 none', default: 0, least: -1, most: 1 },
    model: { unit: '1', about: 'shape of the force', default: 0, choices: ['magic formula', 'friction'] },
    stiffnessFactor: { unit: '1', about: 'B of the Magic Formula', default: 10, least: 1, most: 30 },
    shapeFactor: { unit: '1', about: 'C of it', default: 1.9, least: 1, most: 2.5 },
    peakFriction: { unit: '1', about: 'D of it; friction of the friction tyre', default: 1, least: 0.01, most: 2 },
    curvatureFactor: { unit: '1', about: 'E of it', default: 0.97, least: -10, most: 1 },
    lockedSlip: {
      unit: '1',
      about: 'slip of a braked wheel from which it counts as locked; 0: not watched',
      default: 0.6,
      least: 0,
      most: 1,
    },
    relaxationLength: { unit: 'm', about: 'relaxation length', default: 0.3, least: 0.05, usual: [0.15, 0.6] },
    creepSpeed: {
      unit: 'm/s',
      about: 'speed at which the carcass relaxes at standstill',
      default: 2e-4,
      least: 1e-6,
      most: 0.01,
    },
    dampingTime: { unit: 's', about: 'damping at standstill over stiffness', default: 0.01, least: 0, most: 0.1 },
    dampingSpeed: { unit: 'm/s', about: 'speed over which that damping fades', default: 0.5, least: 0.01 },
  },
  laws: tyreLaws,
  heat: 'leaves',
  limits: [
    {
      reading: 'lock',
      side: 'above',
      level: 'locked',
      parameter: 'lockedSlip',
      meaning: 'the wheel is locked: the vehicle cannot be steered there and its tyre is ruined',
    },
  ],
  flows({ parameter, wheel, road, state, command, derivative, reading, law }) {
    const slipVelocity = wheel.speed * parameter.radius - road.velocity;
    const load = Math.max(
      parameter.loadShare * road.weight + parameter.axlePosition * road.loadShift + command.loadTransfer,
      0,
    );
    const slip = state.deflection / parameter.relaxationLength;
    const friction = Math.max(command.surfaceFriction, 0.01);
    const slope = law.magicFormulaSlope(parameter.stiffnessFactor, parameter.shapeFactor, parameter.peakFriction);
    const share =
      parameter.model === 0
        ? law.magicFormula(
            slip,
            parameter.stiffnessFactor,
            parameter.shapeFactor,
            parameter.peakFriction * friction,
            parameter.curvatureFactor,
          )
        : law.dugoff(slip, slope, parameter.peakFriction * friction);
    const elastic = load * share;
    const damping =
      ((parameter.dampingTime * slope * load * friction) / parameter.relaxationLength) *
      slipVelocity *
      law.standstillShare(slipVelocity, road.velocity, parameter.dampingSpeed);
    const force = elastic + damping;
    const rate = law.relaxationRate(
      state.deflection,
      slipVelocity,
      road.velocity,
      parameter.relaxationLength,
      parameter.creepSpeed,
    );
    wheel.torque -= force * parameter.radius;
    road.force += force;
    derivative.deflection = rate;
    derivative.strainEnergy = elastic * rate;
    reading.slip = slip;
    reading.force = force;
    reading.load = load;
    reading.lock = Math.abs(road.velocity) > 1.5 ? Math.max(0, -slip * Math.sign(road.velocity)) : 0;
    reading.slipVelocity = slipVelocity;
  },
  energy({ state }) {
    return state.strainEnergy;
  },
  loss({ parameter, wheel, road, state, command, law }) {
    const slipVelocity = wheel.speed * parameter.radius - road.velocity;
    const load = Math.max(
      parameter.loadShare * road.weight + parameter.axlePosition * road.loadShift + command.loadTransfer,
      0,
    );
    const slip = state.deflection / parameter.relaxationLength;
    const friction = Math.max(command.surfaceFriction, 0.01);
    const slope = law.magicFormulaSlope(parameter.stiffnessFactor, parameter.shapeFactor, parameter.peakFriction);
    const share =
      parameter.model === 0
        ? law.magicFormula(
            slip,
            parameter.stiffnessFactor,
            parameter.shapeFactor,
            parameter.peakFriction * friction,
            parameter.curvatureFactor,
          )
        : law.dugoff(slip, slope, parameter.peakFriction * friction);
    const sliding = load * share * slip;
    const damping =
      ((parameter.dampingTime * slope * load * friction) / parameter.relaxationLength) *
      slipVelocity *
      law.standstillShare(slipVelocity, road.velocity, parameter.dampingSpeed);
    return sliding * law.relaxationSpeed(slipVelocity, road.velocity, parameter.creepSpeed) + damping * slipVelocity;
  },
  examine: ({ parameter }) => {
    // a spinning wheel at standstill has slip 3: see relaxationRate
    const x = 3 * parameter.stiffnessFactor!;
    const bent = Math.atan(x - parameter.curvatureFactor! * (x - Math.atan(x)));
    return parameter.model !== 0 || parameter.shapeFactor! * bent < Math.PI
      ? []
      : [
          {
            parameter: 'shapeFactor',
            what: 'the force of the Magic Formula turns round within the slip of a spinning wheel and would drive it',
            remedy: 'lower shapeFactor below 2, or bring curvatureFactor near 1',
          },
        ];
  },
});
