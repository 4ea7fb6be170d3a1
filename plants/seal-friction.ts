import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing } from './shared-parameters.js';

/**
 * Friction of the piston seals of an accumulator together with its port: oil flows only where the pressure difference
 * is above the friction (over the piston's area), and is then throttled by the port. Put it between a piston accumulator
 * and its line: the friction makes the pressure depend on the direction of flow, which a store cannot.
 */
export const sealFriction = branch({
  kind: 'seal-friction',
  about: 'seal friction of a piston accumulator, with its port',
  source: 'common practice, no source; 0.5 bar to 3 bar for piston accumulators',
  valid: 'Coulomb friction: no rise at breakaway; the piston creeps within the rounding',
  ports: { from: 'oil', to: 'oil' },
  commands: {
    frictionFactor: {
      unit: '1',
      about: 'friction as a multiple of that of new seals',
      rest: 1,
      least: 0,
      most: 50,
      fault: true,
    },
  },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    difference: { unit: 'Pa', about: 'pressure of from less that of to' },
  },
  parameters: {
    sealFriction: {
      unit: 'Pa',
      about: 'pressure difference that moves the piston',
      default: 1e5,
      least: 0,
      most: 50e5,
      difference: true,
      usual: [0.5e5, 3e5],
    },
    rounding: {
      unit: 'Pa',
      about: 'width over which the corner is rounded',
      default: 1e4,
      least: 1e3,
      most: 1e5,
      difference: true,
    },
    area: { unit: 'm2', about: 'area of the port', least: 1e-8, most: 0.05, usual: [1e-4, 2e-3] },
    dischargeCoefficient,
    smoothing,
  },
  laws: flowLaws,
  flows({ parameter, from, to, command, reading, law }) {
    const massFlow =
      parameter.dischargeCoefficient *
      parameter.area *
      Math.sqrt(2 * (from.pressure > to.pressure ? from.density : to.density)) *
      law.signedRoot(
        law.deadZone(from.pressure - to.pressure, parameter.sealFriction * command.frictionFactor, parameter.rounding),
        parameter.smoothing,
      );
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const lost = massFlow * (from.potential - to.potential);
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow += (massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (massFlow > 0 ? lost : 0) + carried;
    reading.massFlow = massFlow;
    reading.flow = massFlow / (massFlow > 0 ? from.density : to.density);
    reading.difference = from.pressure - to.pressure;
  },
  loss({ parameter, from, to, command, law }) {
    return (
      parameter.dischargeCoefficient *
      parameter.area *
      Math.sqrt(2 * (from.pressure > to.pressure ? from.density : to.density)) *
      law.signedRoot(
        law.deadZone(from.pressure - to.pressure, parameter.sealFriction * command.frictionFactor, parameter.rounding),
        parameter.smoothing,
      ) *
      (from.potential - to.potential)
    );
  },
});
