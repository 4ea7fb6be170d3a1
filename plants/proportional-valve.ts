import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing, spoolStuckAt } from './shared-parameters.js';

/**
 * Proportional valve: the spool follows the request as a second-order system whose speed is limited; the area grows in
 * proportion to the position beyond the overlap. Without power a spring shuts it.
 */
export const proportionalValve = branch({
  kind: 'proportional-valve',
  about: 'two-way proportional valve with second-order spool, limited speed and overlap',
  source: 'Merritt, Hydraulic Control Systems, 1967 (spool and area)',
  valid: 'flow forces are left out: they are part of what the spool loop corrects',
  ports: { from: 'oil', to: 'oil' },
  states: {
    position: { unit: '1', about: 'position of the spool, 0 shut to 1 open', least: -0.1, most: 1.1 },
    rate: { unit: '1/s', about: 'its rate', scale: 10 },
  },
  commands: {
    request: { unit: '1', about: 'wanted position, 0 shut to 1 open', rest: 0, least: 0, most: 1 },
    power: { unit: '1', about: 'supply, on above 0.5', rest: 1, least: 0, most: 1 },
    stuckAt: spoolStuckAt,
  },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    opening: { unit: '1', about: 'share of the area that is open', least: 0, most: 1 },
    following: { unit: '1', about: 'wanted position less position, without its sign', least: 0 },
  },
  parameters: {
    area: { unit: 'm2', about: 'area when open', least: 1e-8, most: 0.01, usual: [5e-6, 5e-4] },
    dischargeCoefficient,
    naturalFrequency: {
      unit: 'rad/s',
      about: 'natural frequency of the spool',
      default: 150,
      least: 5,
      most: 1200,
      usual: [60, 500],
    },
    damping: { unit: '1', about: 'damping ratio of it', default: 0.8, least: 0.3, most: 3, usual: [0.5, 1] },
    rateLimit: {
      unit: '1/s',
      about: 'greatest rate of the position',
      default: 20,
      least: 0.1,
      most: 1000,
      usual: [8, 100],
    },
    overlap: { unit: '1', about: 'position at which it begins to open', default: 0.05, least: 0, most: 0.5 },
    leak: { unit: 'm2', about: 'leak area when shut', default: 0, least: 0, most: 1e-5 },
    notFollowing: {
      unit: '1',
      about: 'error of the position that is watched; 0: not watched',
      default: 0,
      least: 0,
      most: 1,
    },
    smoothing,
  },
  starts: { position: { unit: '1', about: 'position', default: 0, least: 0, most: 1 } },
  laws: flowLaws,
  limits: [
    {
      reading: 'following',
      side: 'above',
      level: 'not following',
      parameter: 'notFollowing',
      meaning: 'the spool does not do what it is told: dirt, a lost supply or a broken wire',
    },
  ],
  flows({ parameter, from, to, state, command, derivative, reading, law }) {
    const asked = command.power > 0.5 ? command.request : 0;
    const wanted = command.stuckAt < 0 ? Math.max(0, Math.min(1, asked)) : command.stuckAt;
    const approach = (parameter.naturalFrequency / (2 * parameter.damping)) * (wanted - state.position);
    const limited = Math.max(-parameter.rateLimit, Math.min(parameter.rateLimit, approach));
    derivative.position = state.rate;
    derivative.rate = 2 * parameter.damping * parameter.naturalFrequency * (limited - state.rate);
    const massFlow = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.dischargeCoefficient *
        (parameter.area * law.meteredShare(state.position, parameter.overlap) + parameter.leak),
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
    reading.opening = law.meteredShare(state.position, parameter.overlap);
    reading.following = Math.abs(wanted - state.position);
  },
  loss({ parameter, from, to, state, law }) {
    return (
      law.orificeMassFlow(
        from.pressure,
        to.pressure,
        from.density,
        to.density,
        parameter.dischargeCoefficient *
          (parameter.area * law.meteredShare(state.position, parameter.overlap) + parameter.leak),
        parameter.smoothing,
      ) *
      (from.potential - to.potential)
    );
  },
  initial: ({ start }) => ({ position: start.position! }),
});
