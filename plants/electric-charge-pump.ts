import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import * as pumpMotorLaws from './laws/pump-motor.js';
import { chargePumpParameters } from './shared-parameters.js';

/** The charge pump with a speed-controlled electric motor; the work of the motor comes from outside. */
export const electricChargePump = branch({
  kind: 'electric-charge-pump',
  about: 'pump of fixed displacement with an electric motor and its own relief valve',
  source: 'Wilson 1946 (losses); terms of ISO 4391',
  valid: 'mean values; the inlet is flooded or its suction line is drawn as an element of its own',
  ports: { inlet: 'oil', outlet: 'oil' },
  states: {
    reliefLift: { unit: '1', about: 'opening of its relief valve, 1 at the rated point', least: -0.01 },
    speed: { unit: 'rad/s', about: 'speed of the motor', scale: 100 },
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
    speedRequest: { unit: 'rad/s', about: 'wanted speed', rest: 0, least: 0, most: 1000 },
    power: { unit: '1', about: 'supply of the motor, on above 0.5', rest: 1, least: 0, most: 1 },
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
    shaftPower: { unit: 'W', about: 'power of the motor' },
    inletPressure: { unit: 'Pa', about: 'pressure at its inlet' },
  },
  parameters: {
    ...chargePumpParameters,
    maximumSpeed: { unit: 'rad/s', about: 'greatest speed of the motor', default: 314, least: 1, most: 2000 },
    speedLag: { unit: 's', about: 'lag of the speed', default: 0.2, least: 0.01, most: 10, usual: [0.1, 1] },
  },
  laws: { ...flowLaws, ...pumpMotorLaws },
  limits: [
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
  flows({ parameter, inlet, outlet, state, memory, command, derivative, reading, law }) {
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
      state.speed,
      memory.viscosity,
      radian,
      parameter.viscousCoefficient,
      parameter.frictionCoefficient,
      parameter.dryTorque,
      parameter.smoothSpeed,
    );
    const density = law.carriedDensity(outlet.density, inlet.density, -state.speed, parameter.smoothSpeed);
    const massFlow = density * radian * state.speed;
    const torque = radian * density * (outlet.potential - inlet.potential) + lossTorque;
    const friction = lossTorque * state.speed;
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
    derivative.speed =
      ((command.power > 0.5 ? Math.max(0, Math.min(parameter.maximumSpeed, command.speedRequest)) : 0) - state.speed) /
      parameter.speedLag;
    reading.shaftPower = torque * state.speed;
    reading.flow = net / inlet.density;
    reading.inletPressure = inlet.pressure;
    reading.reliefFlow = reliefFlow;
    reading.torque = torque;
  },
  loss({ parameter, inlet, outlet, state, memory, command, law }) {
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
      state.speed,
      memory.viscosity,
      radian,
      parameter.viscousCoefficient,
      parameter.frictionCoefficient,
      parameter.dryTorque,
      parameter.smoothSpeed,
    );
    return backLoss + lossTorque * state.speed;
  },
  /** Work of the electric motor. */
  supply({ parameter, inlet, outlet, state, memory, law }) {
    const radian = parameter.displacement / (2 * law.CIRCLE_RATIO);
    const density = law.carriedDensity(outlet.density, inlet.density, -state.speed, parameter.smoothSpeed);
    const lossTorque = law.wilsonTorque(
      outlet.pressure - inlet.pressure,
      state.speed,
      memory.viscosity,
      radian,
      parameter.viscousCoefficient,
      parameter.frictionCoefficient,
      parameter.dryTorque,
      parameter.smoothSpeed,
    );
    return (radian * density * (outlet.potential - inlet.potential) + lossTorque) * state.speed;
  },
  starts: { speed: { unit: 'rad/s', about: 'speed', default: 0, least: 0 } },
  initial: ({ start }) => ({ speed: start.speed! }),
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
