import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import * as pumpMotorLaws from './laws/pump-motor.js';

/**
 * Over-centre hydrostatic unit between a high and a low side, with its case. Positive displacement drives the shaft
 * forwards when the high side has the higher pressure (motor), negative displacement brakes it (pump); in general
 * torque on the shaft = x D dp - losses, flow from high to low = x D w + leakage, with D per radian.
 *
 * The ideal unit turns pressure potential into work and back without loss, compression of the oil included: torque is
 * x D rho (h_high - h_low), which is x D dp for stiff oil. Leakage and friction are additive and never change sign with
 * the mode. Leakage heats the side it goes to; friction heats the case and the oil that leaves.
 */
export const pumpMotor = branch({
  kind: 'pump-motor',
  about: 'over-centre pump-motor with displacement actuator, leakage to the case and losses in four quadrants',
  source: 'losses: Wilson 1946, Willans lines, Schloesser 1961, McCandlish and Dorey 1984; terms of ISO 4391',
  valid:
    'mean values: no flow ripple, which a step of a millisecond cannot carry (nine pistons at 2000 rpm: 600 Hz); loss coefficients constant; mirrored efficiencies are for comparison only: their losses jump in slope at zero power and vanish at zero displacement',
  ports: { high: 'oil', low: 'oil', caseDrain: 'oil', shaft: 'shaft' },
  states: {
    displacement: { unit: '1', about: 'displacement as a share of the full one', least: -1.05, most: 1.05 },
    displacementRate: { unit: '1/s', about: 'its rate', scale: 10 },
  },
  memory: {
    viscosity: {
      unit: 'Pa s',
      about: 'dynamic viscosity of the oil in it, once a substep: it changes by nothing meanwhile',
      initial: 0.04,
      gradual: true,
    },
    mistaken: {
      unit: 's',
      about: 'time for which the displacement has been off its request by more than allowed',
      gradual: true,
    },
    delayClock: { unit: 's', about: 'time since the request moved on through the dead time', gradual: true },
    delay1: { unit: '1', about: 'request on its way through the dead time, newest' },
    delay2: { unit: '1', about: 'the one before' },
    delay3: { unit: '1', about: 'and before' },
    delay4: { unit: '1', about: 'and before' },
    delay5: { unit: '1', about: 'and before' },
    delay6: { unit: '1', about: 'and before' },
    delay7: { unit: '1', about: 'and before' },
    delay8: { unit: '1', about: 'request that has passed the dead time' },
  },
  commands: {
    torqueRequest: { unit: 'N m', about: 'wanted torque on the shaft, before losses', rest: 0 },
    displacementRequest: { unit: '1', about: 'wanted displacement', rest: 0, least: -1, most: 1 },
    currentRequest: {
      unit: 'A',
      about: 'current of the displacement valve, with its sign',
      rest: 0,
      least: -5,
      most: 5,
    },
    enable: { unit: '1', about: 'on above 0.5; off swings to zero displacement', rest: 1, least: 0, most: 1 },
    wear: {
      unit: '1',
      about: 'leakage as a multiple of that of a new unit',
      rest: 1,
      least: 0,
      most: 100,
      fault: true,
    },
    frictionFactor: {
      unit: '1',
      about: 'friction as a multiple of that of a new unit',
      rest: 1,
      least: 0,
      most: 20,
      fault: true,
    },
    stuck: {
      unit: '1',
      about: 'above 0.5 the displacement stays where it is',
      rest: 0,
      least: 0,
      most: 1,
      fault: true,
    },
    runawayTo: {
      unit: '1',
      about: 'displacement to which it runs away, whatever is asked; below -1.5: it does not',
      rest: -2,
      least: -2,
      most: 1,
      fault: true,
    },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque on the shaft' },
    flow: { unit: 'm3/s', about: 'volume flow from high to low through the cylinders' },
    highFlow: { unit: 'm3/s', about: 'volume flow out of the high side, leakage included' },
    leakage: { unit: 'm3/s', about: 'leakage out of the high side' },
    wantedDisplacement: { unit: '1', about: 'displacement that the actuator is driven to' },
    following: { unit: '1', about: 'that less the displacement, without its sign', least: 0 },
    lastingError: { unit: '1', about: 'the same once it has lasted followingTime', least: 0 },
    shaftPower: { unit: 'W', about: 'power given to the shaft' },
    hydraulicPower: { unit: 'W', about: 'power taken from the oil' },
    speed: { unit: 'rad/s', about: 'shaft speed' },
    speedMagnitude: { unit: 'rad/s', about: 'shaft speed without its sign', least: 0 },
    difference: { unit: 'Pa', about: 'pressure of the high side less that of the low side' },
    inletPressure: { unit: 'Pa', about: 'the lower of the two pressures, at which a pump draws' },
    inletForSpeed: { unit: 'Pa', about: 'the same less what the present speed wants above standstill' },
    casePressure: { unit: 'Pa', about: 'case pressure' },
  },
  parameters: {
    displacement: {
      unit: 'm3',
      about: 'volume displaced per turn at full displacement',
      least: 1e-6,
      most: 2e-3,
      usual: [1e-5, 5e-4],
    },
    leastDisplacement: {
      unit: '1',
      about: 'least displacement as a share, -1 over-centre, 0 one-sided',
      default: -1,
      least: -1,
      most: 0,
    },
    request: {
      unit: '1',
      about: 'what it obeys; fixed: a unit without actuator, always at full displacement',
      default: 0,
      choices: ['torque', 'displacement', 'fixed', 'current'],
    },
    losses: {
      unit: '1',
      about: 'form of the losses',
      default: 0,
      choices: ['wilson', 'constant efficiencies', 'willans', 'extended', 'mirrored efficiencies', 'map'],
    },
    leastDifference: {
      unit: 'Pa',
      about: 'pressure difference below which a torque request is not fully followed',
      default: 5e5,
      least: 1e4,
      most: 5e6,
      difference: true,
    },
    naturalFrequency: {
      unit: 'rad/s',
      about: 'natural frequency of the displacement actuator',
      default: 60,
      least: 2,
      most: 500,
      usual: [20, 100],
    },
    damping: { unit: '1', about: 'damping ratio of it', default: 0.9, least: 0.3, most: 3, usual: [0.7, 1] },
    rateLimit: {
      unit: '1/s',
      about: 'greatest rate of the displacement',
      default: 10,
      least: 0.1,
      most: 200,
      usual: [5, 15],
    },
    deadTime: {
      unit: 's',
      about: 'time until a request moves the actuator, in eighths of whole substeps; 0: none',
      default: 0,
      least: 0,
      most: 0.2,
      usual: [0.005, 0.02],
    },
    ratedControlPressure: {
      unit: 'Pa',
      about:
        'higher of its two pressures from which the actuator has its rate limit; below, the rate goes with the root; 0: always',
      default: 0,
      least: 0,
      most: 1e8,
      usual: [20e5, 100e5],
    },
    deadCurrent: { unit: 'A', about: 'current at which the displacement begins', default: 0.2, least: 0, most: 2 },
    fullCurrent: { unit: 'A', about: 'current of full displacement', default: 0.6, least: 0.01, most: 5 },
    slipCoefficient: {
      unit: '1',
      about: 'leakage coefficient Cs after Wilson',
      default: 3e-9,
      least: 0,
      most: 1e-6,
      usual: [1e-9, 5e-8],
    },
    viscousCoefficient: {
      unit: '1',
      about: 'viscous friction coefficient Cv after Wilson',
      default: 1.2e5,
      least: 0,
      most: 1e7,
      usual: [5e4, 3e5],
    },
    frictionCoefficient: {
      unit: '1',
      about: 'dry friction coefficient Cf after Wilson',
      default: 0.02,
      least: 0,
      most: 0.5,
      usual: [0.01, 0.1],
    },
    dryTorque: {
      unit: 'N m',
      about: 'friction torque without pressure; the constant part of a Willans line',
      default: 1,
      least: 0,
      most: 1000,
    },
    volumetricEfficiency: {
      unit: '1',
      about: 'pumped over ideal flow, for constant efficiencies and Willans lines',
      default: 0.96,
      least: 0.5,
      most: 1,
      usual: [0.92, 0.99],
    },
    mechanicalEfficiency: {
      unit: '1',
      about: 'motor torque over ideal torque, for constant efficiencies and Willans lines',
      default: 0.94,
      least: 0.5,
      most: 1,
      usual: [0.88, 0.97],
    },
    idleLeakage: {
      unit: 'm3/s',
      about: 'leakage at standstill and the rated difference, for Willans lines',
      default: 2e-5,
      least: 0,
      most: 1e-2,
    },
    ratedDifference: {
      unit: 'Pa',
      about: 'pressure difference at which it is given',
      default: 250e5,
      least: 1e6,
      most: 1e8,
      difference: true,
    },
    turbulentCoefficient: {
      unit: '1',
      about: 'turbulent leakage coefficient Cst after Schloesser, extended form',
      default: 1e-5,
      least: 0,
      most: 1e-2,
    },
    hydrodynamicCoefficient: {
      unit: '1',
      about: 'hydrodynamic torque coefficient Ch after Schloesser, extended form',
      default: 20,
      least: 0,
      most: 1e4,
    },
    deadVolumeShare: {
      unit: '1',
      about: 'volume left in the cylinders at full displacement over the displaced one, extended form',
      default: 0.15,
      least: 0,
      most: 3,
    },
    bulkModulus: {
      unit: 'Pa',
      about: 'bulk modulus of the oil in the cylinders, extended form',
      default: 1.5e9,
      least: 1e8,
      most: 1e11,
      difference: true,
    },
    ratedSpeed: {
      unit: 'rad/s',
      about: 'speed that the map is relative to',
      default: 200,
      least: 1,
      most: 2000,
    },
    mapLeakage: {
      unit: '1',
      about: 'map, leakage: share of the rated ideal flow at the rated difference',
      default: 0,
      least: -1,
      most: 1,
    },
    mapLeakageDisplacement: { unit: '1', about: 'map, the same, per displacement', default: 0, least: -1, most: 1 },
    mapLeakagePressure: {
      unit: '1',
      about: 'map, the same, per difference over the rated one',
      default: 0,
      least: -1,
      most: 1,
    },
    mapLeakageSpeed: {
      unit: '1',
      about: 'map, the same, per speed over the rated one',
      default: 0,
      least: -1,
      most: 1,
    },
    mapLeakageBoth: { unit: '1', about: 'map, the same, per displacement and speed', default: 0, least: -1, most: 1 },
    mapTorque: {
      unit: '1',
      about: 'map, loss torque: share of the rated ideal torque, constant',
      default: 0,
      least: -1,
      most: 1,
    },
    mapTorqueSpeed: { unit: '1', about: 'map, the same, per speed over the rated one', default: 0, least: -1, most: 1 },
    mapTorqueSquare: { unit: '1', about: 'map, the same, per square of that', default: 0, least: -1, most: 1 },
    mapTorquePressure: {
      unit: '1',
      about: 'map, the same, per difference over the rated one',
      default: 0,
      least: -1,
      most: 1,
    },
    mapTorqueDisplacement: {
      unit: '1',
      about: 'map, the same, per difference and displacement',
      default: 0,
      least: -1,
      most: 1,
    },
    mapTorqueBoth: { unit: '1', about: 'map, the same, per difference and speed', default: 0, least: -1, most: 1 },
    caseLeakShare: { unit: '1', about: 'share of the leakage that goes to the case', default: 0.5, least: 0, most: 1 },
    caseHeatShare: {
      unit: '1',
      about: 'share of the friction heat that the case takes',
      default: 0.5,
      least: 0,
      most: 1,
    },
    smoothSpeed: {
      unit: 'rad/s',
      about: 'speed over which dry friction changes its sign',
      default: 1,
      least: 0.01,
      most: 20,
    },
    maximumSpeed: { unit: 'rad/s', about: 'greatest permitted speed; 0: not watched', default: 0, least: 0 },
    notFollowing: {
      unit: '1',
      about: 'error of the displacement that is watched; 0: not watched',
      default: 0.25,
      least: 0,
      most: 2,
    },
    followingTime: { unit: 's', about: 'time that it may last', default: 0.3, least: 0, most: 10 },
    inletRise: {
      unit: 'Pa s',
      about: 'rise of the least inlet pressure per speed',
      default: 0,
      least: 0,
      most: 1e5,
      difference: true,
    },
    leastInletPressure: { unit: 'Pa', about: 'least inlet pressure; 0: not watched', default: 0.8e5, least: 0 },
    maximumCasePressure: { unit: 'Pa', about: 'greatest case pressure; 0: not watched', default: 3e5, least: 0 },
  },
  laws: { ...flowLaws, ...pumpMotorLaws },
  limits: [
    {
      reading: 'lastingError',
      side: 'above',
      level: 'not following',
      parameter: 'notFollowing',
      meaning: 'the swash plate does not do what it is told: a stuck actuator, lost control pressure or a broken wire',
    },
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'pistons lift off or parts fly apart: the unit is to be disconnected before',
    },
    {
      reading: 'inletForSpeed',
      side: 'below',
      level: 'below least inlet',
      parameter: 'leastInletPressure',
      meaning: 'the unit cavitates: noise, loss of torque, and damage within minutes',
    },
    {
      reading: 'casePressure',
      side: 'above',
      level: 'case pressure',
      parameter: 'maximumCasePressure',
      meaning: 'the shaft seal is pressed out and the case leaks',
    },
  ],
  update({ parameter, high, low, state, memory, command, step, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const difference = high.pressure - low.pressure;
    const byTorque = law.displacementForTorque(command.torqueRequest, difference, radian, parameter.leastDifference);
    const byCurrent = law.displacementForCurrent(command.currentRequest, parameter.deadCurrent, parameter.fullCurrent);
    const asked =
      parameter.request === 0 ? byTorque : parameter.request === 3 ? byCurrent : command.displacementRequest;
    const clock = memory.delayClock + step;
    const moves = parameter.deadTime > 0 && clock >= 0.125 * parameter.deadTime - 0.5 * step;
    const now = parameter.deadTime > 0 ? memory.delay8 : asked;
    const stroked = command.enable > 0.5 ? Math.max(parameter.leastDisplacement, Math.min(1, now)) : 0;
    const wanted = parameter.request === 2 ? 1 : stroked;
    const wrong = Math.abs(wanted - state.displacement) > parameter.notFollowing;
    memory.viscosity = 0.5 * (high.viscosity + low.viscosity);
    memory.mistaken = wrong ? Math.min(memory.mistaken + step, 100) : 0;
    memory.delayClock = parameter.deadTime > 0 && !moves ? clock : 0;
    memory.delay1 = moves ? asked : memory.delay1;
    memory.delay2 = moves ? memory.delay1 : memory.delay2;
    memory.delay3 = moves ? memory.delay2 : memory.delay3;
    memory.delay4 = moves ? memory.delay3 : memory.delay4;
    memory.delay5 = moves ? memory.delay4 : memory.delay5;
    memory.delay6 = moves ? memory.delay5 : memory.delay6;
    memory.delay7 = moves ? memory.delay6 : memory.delay7;
    memory.delay8 = moves ? memory.delay7 : memory.delay8;
  },
  flows({ parameter, high, low, caseDrain, shaft, state, memory, command, derivative, reading, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const stroke = Math.max(-1, Math.min(1, state.displacement));
    const difference = high.pressure - low.pressure;
    const viscosity = memory.viscosity;
    const drawing = stroke * shaft.speed;
    const density = law.carriedDensity(high.density, low.density, drawing, parameter.smoothSpeed);

    const mappedTorque =
      parameter.losses === 5
        ? law.mappedTorque(
            difference,
            shaft.speed,
            stroke,
            radian,
            parameter.mapTorque,
            parameter.mapTorqueSpeed,
            parameter.mapTorqueSquare,
            parameter.mapTorquePressure,
            parameter.mapTorqueDisplacement,
            parameter.mapTorqueBoth,
            parameter.ratedDifference,
            parameter.ratedSpeed,
            parameter.smoothSpeed,
          )
        : 0;
    const lossTorque =
      command.frictionFactor *
      (parameter.losses === 5
        ? mappedTorque
        : law.lossTorque(
            parameter.losses,
            difference,
            shaft.speed,
            stroke,
            viscosity,
            low.density,
            radian,
            parameter.viscousCoefficient,
            parameter.frictionCoefficient,
            parameter.dryTorque,
            parameter.mechanicalEfficiency,
            parameter.hydrodynamicCoefficient,
            parameter.smoothSpeed,
          ));

    const conductance =
      command.wear *
      law.leakConductance(
        parameter.losses,
        viscosity,
        radian,
        parameter.slipCoefficient,
        parameter.idleLeakage,
        parameter.ratedDifference,
      );
    const mappedLeakage =
      parameter.losses === 5
        ? law.mappedLeakage(
            difference,
            shaft.speed,
            stroke,
            radian,
            parameter.mapLeakage,
            parameter.mapLeakageDisplacement,
            parameter.mapLeakagePressure,
            parameter.mapLeakageSpeed,
            parameter.mapLeakageBoth,
            parameter.ratedDifference,
            parameter.ratedSpeed,
          )
        : 0;
    const further =
      command.wear *
      (parameter.losses === 5
        ? mappedLeakage
        : law.furtherLeakage(
            parameter.losses,
            difference,
            shaft.speed,
            stroke,
            low.density,
            radian,
            parameter.volumetricEfficiency,
            parameter.turbulentCoefficient,
            parameter.deadVolumeShare,
            parameter.bulkModulus,
          ));
    const across = (1 - parameter.caseLeakShare) * conductance * difference + further;
    const toCase = parameter.caseLeakShare * conductance;
    const highLeak = toCase * (high.pressure - caseDrain.pressure);
    const lowLeak = toCase * (low.pressure - caseDrain.pressure);
    const acrossMass = across * (across > 0 ? high.density : low.density);
    const highMass = highLeak * (highLeak > 0 ? high.density : caseDrain.density);
    const lowMass = lowLeak * (lowLeak > 0 ? low.density : caseDrain.density);
    const acrossLoss = acrossMass * (high.potential - low.potential);
    const highLoss = highMass * (high.potential - caseDrain.potential);
    const lowLoss = lowMass * (low.potential - caseDrain.potential);

    const massFlow = density * radian * drawing;
    const torque = radian * stroke * density * (high.potential - low.potential) - lossTorque;
    const friction = lossTorque * shaft.speed;
    const outHeat = (1 - parameter.caseHeatShare) * friction;

    const highContent = high.heatCapacity * high.temperature;
    const lowContent = low.heatCapacity * low.temperature;
    const caseContent = caseDrain.heatCapacity * caseDrain.temperature;
    const mainHeat = law.heatCarried(massFlow + acrossMass, highContent, lowContent);
    const highHeat = law.heatCarried(highMass, highContent, caseContent);
    const lowHeat = law.heatCarried(lowMass, lowContent, caseContent);

    shaft.torque += torque;
    high.massFlow -= massFlow + acrossMass + highMass;
    low.massFlow += massFlow + acrossMass - lowMass;
    caseDrain.massFlow += highMass + lowMass;
    high.heatFlow +=
      (massFlow > 0 ? 0 : outHeat) +
      (acrossMass > 0 ? 0 : acrossLoss) +
      (highMass > 0 ? 0 : highLoss) -
      mainHeat -
      highHeat;
    low.heatFlow +=
      (massFlow > 0 ? outHeat : 0) +
      (acrossMass > 0 ? acrossLoss : 0) +
      (lowMass > 0 ? 0 : lowLoss) +
      mainHeat -
      lowHeat;
    caseDrain.heatFlow +=
      parameter.caseHeatShare * friction +
      (highMass > 0 ? highLoss : 0) +
      (lowMass > 0 ? lowLoss : 0) +
      highHeat +
      lowHeat;

    const byTorque = law.displacementForTorque(command.torqueRequest, difference, radian, parameter.leastDifference);
    const byCurrent = law.displacementForCurrent(command.currentRequest, parameter.deadCurrent, parameter.fullCurrent);
    const asked =
      parameter.request === 0 ? byTorque : parameter.request === 3 ? byCurrent : command.displacementRequest;
    const arrived = parameter.deadTime > 0 ? memory.delay8 : asked;
    const stroked = command.enable > 0.5 ? Math.max(parameter.leastDisplacement, Math.min(1, arrived)) : 0;
    const wanted = parameter.request === 2 ? 1 : stroked;
    const driven = command.runawayTo < -1.5 ? wanted : Math.max(parameter.leastDisplacement, command.runawayTo);
    const approach = (parameter.naturalFrequency / (2 * parameter.damping)) * (driven - state.displacement);
    const fastest =
      parameter.rateLimit * law.controlShare(Math.max(high.pressure, low.pressure), parameter.ratedControlPressure);
    const limited = Math.max(-fastest, Math.min(fastest, approach));
    const rate = command.stuck > 0.5 ? 0 : limited;
    derivative.displacement = command.stuck > 0.5 ? 0 : state.displacementRate;
    derivative.displacementRate = 2 * parameter.damping * parameter.naturalFrequency * (rate - state.displacementRate);

    reading.torque = torque;
    reading.flow = massFlow / density;
    reading.leakage = across + highLeak;
    reading.highFlow = massFlow / density + across + highLeak;
    reading.wantedDisplacement = wanted;
    reading.following = Math.abs(wanted - state.displacement);
    reading.lastingError = memory.mistaken >= parameter.followingTime ? Math.abs(wanted - state.displacement) : 0;
    reading.shaftPower = torque * shaft.speed;
    reading.hydraulicPower = massFlow * (high.potential - low.potential) + acrossLoss + highLoss + lowLoss;
    reading.speed = shaft.speed;
    reading.speedMagnitude = Math.abs(shaft.speed);
    reading.difference = difference;
    reading.inletPressure = Math.min(high.pressure, low.pressure);
    reading.inletForSpeed = Math.min(high.pressure, low.pressure) - parameter.inletRise * Math.abs(shaft.speed);
    reading.casePressure = caseDrain.pressure;
  },
  /** Friction, and what leaks from a higher to a lower potential. */
  loss({ parameter, high, low, caseDrain, shaft, state, memory, command, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const stroke = Math.max(-1, Math.min(1, state.displacement));
    const difference = high.pressure - low.pressure;
    const viscosity = memory.viscosity;
    const mappedTorque =
      parameter.losses === 5
        ? law.mappedTorque(
            difference,
            shaft.speed,
            stroke,
            radian,
            parameter.mapTorque,
            parameter.mapTorqueSpeed,
            parameter.mapTorqueSquare,
            parameter.mapTorquePressure,
            parameter.mapTorqueDisplacement,
            parameter.mapTorqueBoth,
            parameter.ratedDifference,
            parameter.ratedSpeed,
            parameter.smoothSpeed,
          )
        : 0;
    const lossTorque =
      command.frictionFactor *
      (parameter.losses === 5
        ? mappedTorque
        : law.lossTorque(
            parameter.losses,
            difference,
            shaft.speed,
            stroke,
            viscosity,
            low.density,
            radian,
            parameter.viscousCoefficient,
            parameter.frictionCoefficient,
            parameter.dryTorque,
            parameter.mechanicalEfficiency,
            parameter.hydrodynamicCoefficient,
            parameter.smoothSpeed,
          ));

    const conductance =
      command.wear *
      law.leakConductance(
        parameter.losses,
        viscosity,
        radian,
        parameter.slipCoefficient,
        parameter.idleLeakage,
        parameter.ratedDifference,
      );
    const mappedLeakage =
      parameter.losses === 5
        ? law.mappedLeakage(
            difference,
            shaft.speed,
            stroke,
            radian,
            parameter.mapLeakage,
            parameter.mapLeakageDisplacement,
            parameter.mapLeakagePressure,
            parameter.mapLeakageSpeed,
            parameter.mapLeakageBoth,
            parameter.ratedDifference,
            parameter.ratedSpeed,
          )
        : 0;
    const further =
      command.wear *
      (parameter.losses === 5
        ? mappedLeakage
        : law.furtherLeakage(
            parameter.losses,
            difference,
            shaft.speed,
            stroke,
            low.density,
            radian,
            parameter.volumetricEfficiency,
            parameter.turbulentCoefficient,
            parameter.deadVolumeShare,
            parameter.bulkModulus,
          ));
    const across = (1 - parameter.caseLeakShare) * conductance * difference + further;
    const toCase = parameter.caseLeakShare * conductance;
    const highLeak = toCase * (high.pressure - caseDrain.pressure);
    const lowLeak = toCase * (low.pressure - caseDrain.pressure);
    const acrossMass = across * (across > 0 ? high.density : low.density);
    const highMass = highLeak * (highLeak > 0 ? high.density : caseDrain.density);
    const lowMass = lowLeak * (lowLeak > 0 ? low.density : caseDrain.density);
    const acrossLoss = acrossMass * (high.potential - low.potential);
    const highLoss = highMass * (high.potential - caseDrain.potential);
    const lowLoss = lowMass * (low.potential - caseDrain.potential);

    return lossTorque * shaft.speed + acrossLoss + highLoss + lowLoss;
  },
  initial: ({ parameter }) => (parameter.request === 2 ? { displacement: 1 } : {}),
  examine: ({ parameter }) => {
    const laminar = [parameter.slipCoefficient!, 0, parameter.idleLeakage!, parameter.slipCoefficient!, 0, 0];
    return parameter.caseHeatShare! > 0 && laminar[parameter.losses!]! * parameter.caseLeakShare! === 0
      ? [
          {
            parameter: 'caseHeatShare',
            what: 'friction heats the case, and no leakage flows through it',
            remedy: 'set caseHeatShare to 0, or take losses that leak into the case',
          },
        ]
      : [];
  },
});
