import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { checkValveFaults, dischargeCoefficient, smoothing } from './shared-parameters.js';

/** Check valve: opens from `from` to `to` above its cracking difference; its area follows with a lag, so it can slam. */
export const checkValve = branch({
  kind: 'check-valve',
  about: 'check valve whose area ramps up with the pressure difference, with a lag',
  source: 'common practice, no source',
  ports: { from: 'oil', to: 'oil' },
  states: { opening: { unit: '1', about: 'share of the area that is open', least: -0.01, most: 1.01 } },
  commands: checkValveFaults,
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area when open', least: 1e-8, most: 0.01, usual: [1e-6, 2e-3] },
    dischargeCoefficient,
    cracking: {
      unit: 'Pa',
      about: 'difference at which it begins to open',
      default: 0.2e5,
      least: 0,
      most: 50e5,
      difference: true,
      usual: [0.2e5, 5e5],
    },
    opensOver: {
      unit: 'Pa',
      about: 'further difference at which it is open',
      default: 1e5,
      least: 0.1e5,
      most: 50e5,
      difference: true,
      usual: [0.5e5, 5e5],
    },
    lag: { unit: 's', about: 'lag of the poppet', default: 0.003, least: 0.0001, most: 1, usual: [0.002, 0.01] },
    smoothing,
  },
  laws: flowLaws,
  flows({ parameter, from, to, state, command, derivative, reading, law }) {
    const wanted = law.smoothStep((from.pressure - to.pressure - parameter.cracking) / parameter.opensOver);
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
