import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import * as pumpMotorLaws from './laws/pump-motor.js';
import { chargePumpParameters } from './shared-parameters.js';

/** Pump of fixed displacement on a shaft, from the tank to the low side, with a relief valve back to its inlet. */
export const chargePump = branch({
  kind: 'charge-pump',
  about: 'pump of fixed displacement on a shaft, with its own relief valve',
  source: 'Wilson 1946 (losses); terms of ISO 4391',
  valid: 'mean values; the inlet is flooded or its suction line is drawn as an element of its own',
  ports: { inlet: 'oil', outlet: 'oil', shaft: 'shaft' },
  states: {
    reliefLift: { unit: '1', about: 'opening of its relief valve, 1 at the rated point', least: -0.01 },
  },
  memory: {
    viscosity: {
      unit: 'Pa s',
      about: 'dynamic viscosity of the oil in it, once a substep: it changes by nothing meanwhile',
      initial: 0.04,
      gradual: true,
    },
  },
  commands: {
    wear: {
      unit: '1',
      about: 'leakage as a multiple of that of a new pump',
      rest: 1,
      least: 0,
      most: 100,
      fault: true,
    },
  },
  readings: {
    flow: { unit: 'm3/s', about: 'volume flow into the outlet, less leakage and relief, at the inlet density' },
    reliefFlow: { unit: 'm3/s', about: 'volume flow through its relief valve' },
    torque: { unit: 'N m', about: 'torque that it takes' },
    shaftPower: { unit: 'W', about: 'power taken from the shaft' },
    speedMagnitude: { unit: 'rad/s', about: 'speed without its sign', least: 0 },
    inletPressure: { unit: 'Pa', about: 'pressure at its inlet' },
  },
  parameters: {
    ...chargePumpParameters,
    maximumSpeed: { unit: 'rad/s', about: 'greatest permitted speed; 0: not watched', default: 0, least: 0 },
  },
  laws: { ...flowLaws, ...pumpMotorLaws },
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the pump cavitates and wears out',
    },
    {
      reading: 'inletPressure',
      side: 'below',
      level: 'below least inlet',
      parameter: 'leastInletPressure',
      meaning: 'the charge pump cavitates and the low side will starve',
    },
  ],
  update({ inlet, memory }) {
    memory.viscosity = inlet.viscosity;
  },
  flows({ parameter, inlet, outlet, shaft, state, memory, command, derivative, reading, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const difference = outlet.pressure - inlet.pressure;
    const slip = law.wilsonLeakage(difference, memory.viscosity, radian, parameter.slipCoefficient * command.wear);
    const slipMass = slip * (slip > 0 ? outlet.density : inlet.density);
    const reliefFlow =
      (parameter.fullFlowRate * Math.max(state.reliefLift, 0) * law.signedRoot(difference, 2e4)) /
      Math.sqrt(parameter.fullFlow - 101325);
    const reliefMass = reliefFlow * (reliefFlow > 0 ? outlet.density : inlet.density);
    const backMass = slipMass + reliefMass;
    const backLoss = backMass * (outlet.potential - inlet.potential);
    const lossTorque = law.wilsonTorque(
      difference,
      shaft.speed,
      memory.viscosity,
      radian,
      parameter.viscousCoefficient,
      parameter.frictionCoefficient,
      parameter.dryTorque,
      parameter.smoothSpeed,
    );
    const density = law.carriedDensity(outlet.density, inlet.density, -shaft.speed, parameter.smoothSpeed);
    const massFlow = density * radian * shaft.speed;
    const torque = radian * density * (outlet.potential - inlet.potential) + lossTorque;
    const friction = lossTorque * shaft.speed;
    const net = massFlow - backMass;
    const carried = law.heatCarried(
      net,
      inlet.heatCapacity * inlet.temperature,
      outlet.heatCapacity * outlet.temperature,
    );
    const share = law.reliefShare(outlet.pressure, parameter.cracking, parameter.fullFlow, 1e4);
    const wanted = law.reliefLift(share, difference, parameter.fullFlow - 101325);
    derivative.reliefLift = (wanted - state.reliefLift) / parameter.reliefLag;
    inlet.massFlow -= net;
    outlet.massFlow += net;
    inlet.heatFlow += (massFlow > 0 ? 0 : friction) + (backMass > 0 ? backLoss : 0) - carried;
    outlet.heatFlow += (massFlow > 0 ? friction : 0) + (backMass > 0 ? 0 : backLoss) + carried;
    shaft.torque -= torque;
    reading.shaftPower = torque * shaft.speed;
    reading.flow = net / inlet.density;
    reading.speedMagnitude = Math.abs(shaft.speed);
    reading.inletPressure = inlet.pressure;
    reading.reliefFlow = reliefFlow;
    reading.torque = torque;
  },
  loss({ parameter, inlet, outlet, shaft, state, memory, command, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const difference = outlet.pressure - inlet.pressure;
    const slip = law.wilsonLeakage(difference, memory.viscosity, radian, parameter.slipCoefficient * command.wear);
    const slipMass = slip * (slip > 0 ? outlet.density : inlet.density);
    const reliefFlow =
      (parameter.fullFlowRate * Math.max(state.reliefLift, 0) * law.signedRoot(difference, 2e4)) /
      Math.sqrt(parameter.fullFlow - 101325);
    const reliefMass = reliefFlow * (reliefFlow > 0 ? outlet.density : inlet.density);
    const backMass = slipMass + reliefMass;
    const backLoss = backMass * (outlet.potential - inlet.potential);
    const lossTorque = law.wilsonTorque(
      difference,
      shaft.speed,
      memory.viscosity,
      radian,
      parameter.viscousCoefficient,
      parameter.frictionCoefficient,
      parameter.dryTorque,
      parameter.smoothSpeed,
    );
    return backLoss + lossTorque * shaft.speed;
  },
  examine: ({ parameter }) =>
    parameter.fullFlow! > parameter.cracking!
      ? []
      : [
          {
            parameter: 'fullFlow',
            what: 'the full-flow pressure of its relief valve is not above the cracking pressure',
            remedy: 'raise fullFlow, or lower cracking',
          },
        ],
});
