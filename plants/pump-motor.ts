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
  source: 'Wilson 1946 (losses); terms of ISO 4391',
  valid: 'mean values: no flow ripple; loss coefficients constant',
  ports: { high: 'oil', low: 'oil', caseDrain: 'oil', shaft: 'shaft' },
  states: {
    displacement: { unit: '1', about: 'displacement as a share of the full one', least: -1.05, most: 1.05 },
    displacementRate: { unit: '1/s', about: 'its rate', scale: 10 },
  },
  commands: {
    torqueRequest: { unit: 'N m', about: 'wanted torque on the shaft, before losses', rest: 0 },
    displacementRequest: { unit: '1', about: 'wanted displacement', rest: 0, least: -1, most: 1 },
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
  },
  readings: {
    torque: { unit: 'N m', about: 'torque on the shaft' },
    flow: { unit: 'm3/s', about: 'volume flow from high to low through the cylinders' },
    highFlow: { unit: 'm3/s', about: 'volume flow out of the high side, leakage included' },
    leakage: { unit: 'm3/s', about: 'leakage out of the high side' },
    wantedDisplacement: { unit: '1', about: 'displacement that the actuator is driven to' },
    shaftPower: { unit: 'W', about: 'power given to the shaft' },
    hydraulicPower: { unit: 'W', about: 'power taken from the oil' },
    speed: { unit: 'rad/s', about: 'shaft speed' },
    speedMagnitude: { unit: 'rad/s', about: 'shaft speed without its sign', least: 0 },
    difference: { unit: 'Pa', about: 'pressure of the high side less that of the low side' },
    inletPressure: { unit: 'Pa', about: 'the lower of the two pressures, at which a pump draws' },
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
    request: { unit: '1', about: 'what it obeys', default: 0, choices: ['torque', 'displacement'] },
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
    dryTorque: { unit: 'N m', about: 'friction torque without pressure', default: 1, least: 0, most: 1000 },
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
    leastInletPressure: { unit: 'Pa', about: 'least inlet pressure; 0: not watched', default: 0.8e5, least: 0 },
    maximumCasePressure: { unit: 'Pa', about: 'greatest case pressure; 0: not watched', default: 3e5, least: 0 },
  },
  laws: { ...flowLaws, ...pumpMotorLaws },
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'pistons lift off or parts fly apart: the unit is to be disconnected before',
    },
    {
      reading: 'inletPressure',
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
  flows({ parameter, high, low, caseDrain, shaft, state, command, derivative, reading, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const stroke = Math.max(-1, Math.min(1, state.displacement));
    const difference = high.pressure - low.pressure;
    const viscosity = 0.5 * (high.viscosity + low.viscosity);
    const drawing = stroke * shaft.speed;
    const density = law.carriedDensity(high.density, low.density, drawing, parameter.smoothSpeed);

    const lossTorque =
      command.frictionFactor *
      law.wilsonTorque(
        difference,
        shaft.speed,
        viscosity,
        radian,
        parameter.viscousCoefficient,
        parameter.frictionCoefficient,
        parameter.dryTorque,
        parameter.smoothSpeed,
      );

    const slip = parameter.slipCoefficient * command.wear;
    const across = law.wilsonLeakage(difference, viscosity, radian, slip * (1 - parameter.caseLeakShare));
    const highLeak = law.wilsonLeakage(
      high.pressure - caseDrain.pressure,
      viscosity,
      radian,
      slip * parameter.caseLeakShare,
    );
    const lowLeak = law.wilsonLeakage(
      low.pressure - caseDrain.pressure,
      viscosity,
      radian,
      slip * parameter.caseLeakShare,
    );
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
    const asked = parameter.request === 0 ? byTorque : command.displacementRequest;
    const wanted = command.enable > 0.5 ? Math.max(parameter.leastDisplacement, Math.min(1, asked)) : 0;
    const approach = (parameter.naturalFrequency / (2 * parameter.damping)) * (wanted - state.displacement);
    const limited = Math.max(-parameter.rateLimit, Math.min(parameter.rateLimit, approach));
    const rate = command.stuck > 0.5 ? 0 : limited;
    derivative.displacement = command.stuck > 0.5 ? 0 : state.displacementRate;
    derivative.displacementRate = 2 * parameter.damping * parameter.naturalFrequency * (rate - state.displacementRate);

    reading.torque = torque;
    reading.flow = massFlow / density;
    reading.leakage = across + highLeak;
    reading.highFlow = massFlow / density + across + highLeak;
    reading.wantedDisplacement = wanted;
    reading.shaftPower = torque * shaft.speed;
    reading.hydraulicPower = massFlow * (high.potential - low.potential) + acrossLoss + highLoss + lowLoss;
    reading.speed = shaft.speed;
    reading.speedMagnitude = Math.abs(shaft.speed);
    reading.difference = difference;
    reading.inletPressure = Math.min(high.pressure, low.pressure);
    reading.casePressure = caseDrain.pressure;
  },
  /** Friction after Wilson, and what leaks from a higher to a lower potential. */
  loss({ parameter, high, low, caseDrain, shaft, command, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const difference = high.pressure - low.pressure;
    const viscosity = 0.5 * (high.viscosity + low.viscosity);
    const lossTorque =
      command.frictionFactor *
      law.wilsonTorque(
        difference,
        shaft.speed,
        viscosity,
        radian,
        parameter.viscousCoefficient,
        parameter.frictionCoefficient,
        parameter.dryTorque,
        parameter.smoothSpeed,
      );

    const slip = parameter.slipCoefficient * command.wear;
    const across = law.wilsonLeakage(difference, viscosity, radian, slip * (1 - parameter.caseLeakShare));
    const highLeak = law.wilsonLeakage(
      high.pressure - caseDrain.pressure,
      viscosity,
      radian,
      slip * parameter.caseLeakShare,
    );
    const lowLeak = law.wilsonLeakage(
      low.pressure - caseDrain.pressure,
      viscosity,
      radian,
      slip * parameter.caseLeakShare,
    );
    const acrossMass = across * (across > 0 ? high.density : low.density);
    const highMass = highLeak * (highLeak > 0 ? high.density : caseDrain.density);
    const lowMass = lowLeak * (lowLeak > 0 ? low.density : caseDrain.density);
    const acrossLoss = acrossMass * (high.potential - low.potential);
    const highLoss = highMass * (high.potential - caseDrain.potential);
    const lowLoss = lowMass * (low.potential - caseDrain.potential);

    return lossTorque * shaft.speed + acrossLoss + highLoss + lowLoss;
  },
  examine: ({ parameter }) =>
    parameter.caseHeatShare! > 0 && parameter.slipCoefficient! * parameter.caseLeakShare! === 0
      ? [
          {
            parameter: 'caseLeakShare',
            what: 'friction heats the case, and no leakage flows through it',
            remedy: 'give a slipCoefficient and a caseLeakShare above 0, or set caseHeatShare to 0',
          },
        ]
      : [],
});
