import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { checkValveFaults, dischargeCoefficient, smoothing } from './shared-parameters.js';

/**
 * Pilot-operated check valve. It opens from `from` to `to` like a check valve; pressure at `pilot` pushes a piston of
 * `pilotRatio` times the area of the seat against the poppet and opens it for flow back. Forces on the poppet, per area
 * of the seat: (p_from - p_to) + pilotRatio (p_pilot - p_from) against the spring (pilot piston drained to `from`).
 */
export const pilotCheckValve = branch({
  kind: 'pilot-check-valve',
  about: 'check valve that pilot pressure opens for flow back',
  source: 'balance of forces on the poppet; common practice for the ramp of the area',
  valid: 'the oil that the pilot piston takes is left out',
  ports: { from: 'oil', to: 'oil', pilot: 'oil' },
  states: { opening: { unit: '1', about: 'share of the area that is open', least: -0.01, most: 1.01 } },
  commands: checkValveFaults,
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    driving: { unit: 'Pa', about: 'what opens it: difference and pilot, less the spring' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area when open', least: 1e-8, most: 0.01, usual: [1e-6, 2e-3] },
    dischargeCoefficient,
    pilotRatio: {
      unit: '1',
      about: 'area of the pilot piston over that of the seat',
      default: 4,
      least: 1.05,
      most: 30,
      usual: [2.5, 12],
    },
    cracking: {
      unit: 'Pa',
      about: 'difference at which it begins to open',
      default: 0.5e5,
      least: 0,
      most: 50e5,
      difference: true,
      usual: [0.2e5, 10e5],
    },
    opensOver: {
      unit: 'Pa',
      about: 'further difference at which it is open',
      default: 2e5,
      least: 0.1e5,
      most: 50e5,
      difference: true,
      usual: [0.5e5, 10e5],
    },
    lag: { unit: 's', about: 'lag of the poppet', default: 0.005, least: 0.0005, most: 1, usual: [0.003, 0.03] },
    smoothing,
  },
  laws: flowLaws,
  flows({ parameter, from, to, pilot, state, command, derivative, reading, law }) {
    const driving =
      from.pressure -
      to.pressure +
      parameter.pilotRatio * Math.max(0, pilot.pressure - from.pressure) -
      parameter.cracking;
    const wanted = law.smoothStep(driving / parameter.opensOver);
    derivative.opening = ((command.stuckAt < 0 ? wanted : command.stuckAt) - state.opening) / parameter.lag;
    const massFlow = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.dischargeCoefficient * (parameter.area * Math.max(state.opening, 0) + command.leakArea),
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
    reading.driving = driving;
  },
  loss({ parameter, from, to, state, command, law }) {
    return (
      law.orificeMassFlow(
        from.pressure,
        to.pressure,
        from.density,
        to.density,
        parameter.dischargeCoefficient * (parameter.area * Math.max(state.opening, 0) + command.leakArea),
        parameter.smoothing,
      ) *
      (from.potential - to.potential)
    );
  },
});
