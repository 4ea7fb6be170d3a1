import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { smoothing } from './shared-parameters.js';

/**
 * Relief valve, set by the absolute pressure at its inlet (spring chamber drained to the outside). Closed below
 * cracking; the flow then rises in a straight line to the rated one at the full-flow pressure. Once lifted it follows
 * the line from the reseat pressure, until that is reached. The lift follows with a lag.
 */
export const reliefValve = branch({
  kind: 'relief-valve',
  about: 'pressure relief valve with cracking, override, reseat and lag',
  source: 'Merritt, Hydraulic Control Systems, 1967; terms after ISO 4126-1',
  ports: { from: 'oil', to: 'oil' },
  states: {
    // half a percent of lift: substeps in which the valve cracks are done again in quarters
    lift: { unit: '1', about: 'opening, 1 at the rated point', least: -0.01, errorWeight: () => 200 },
  },
  memory: { lifted: { unit: '1', about: '1 from cracking until the reseat pressure is reached', initial: 0 } },
  commands: {
    settingFactor: { unit: '1', about: 'drift of the setting', rest: 1, least: 0.1, most: 3, fault: true },
    stuckAt: { unit: '1', about: 'lift at which it sticks; below 0: free', rest: -1, least: -1, most: 3, fault: true },
  },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the inlet' },
    lostPower: { unit: 'W', about: 'power turned into heat' },
  },
  parameters: {
    cracking: { unit: 'Pa', about: 'pressure at which it begins to open: the relief setting', least: 1.1e5, most: 1e8 },
    fullFlow: { unit: 'Pa', about: 'pressure at the rated flow', least: 1.2e5, most: 1.5e8 },
    fullFlowRate: { unit: 'm3/s', about: 'flow at that pressure', least: 1e-6, most: 0.1, usual: [1e-4, 0.02] },
    reseat: {
      unit: '1',
      about: 'reseat pressure as a share of cracking (absolute)',
      default: 0.92,
      least: 0.3,
      most: 1,
      usual: [0.75, 0.97],
    },
    lag: { unit: 's', about: 'lag of the lift', default: 0.005, least: 0.0005, most: 0.5, usual: [0.003, 0.03] },
    rounding: {
      unit: 'Pa',
      about: 'width over which the corner at cracking is rounded',
      default: 1e4,
      least: 1e3,
      most: 2e5,
      difference: true,
    },
    passingFlow: {
      unit: 'm3/s',
      about: 'flow from which it counts as passing; 0: not watched',
      default: 1.6667e-5,
      least: 0,
    },
    smoothing,
  },
  laws: flowLaws,
  limits: [
    {
      reading: 'flow',
      side: 'above',
      level: 'relief passing',
      parameter: 'passingFlow',
      meaning: 'the relief valve passes oil: energy is lost and the oil heats up quickly',
    },
  ],
  update({ parameter, from, memory, command }) {
    const opens = from.pressure > parameter.cracking * command.settingFactor;
    const stays = from.pressure > parameter.reseat * parameter.cracking * command.settingFactor;
    memory.lifted = opens || (memory.lifted > 0.5 && stays) ? 1 : 0;
  },
  flows({ parameter, from, to, state, memory, command, derivative, reading, law }) {
    const rated = parameter.fullFlow - 101325;
    const setting = parameter.cracking * command.settingFactor;
    // what the memory will say after this substep holds within it already: the lift would else come a substep late
    const over = (from.pressure - setting) / (0.07 * (parameter.fullFlow - parameter.cracking));
    const lifted = memory.lifted > 0.5 ? 1 : law.smoothStep(over);
    const cracking = setting * (1 - (1 - parameter.reseat) * lifted);
    const share = law.reliefShare(
      from.pressure,
      cracking,
      parameter.fullFlow * command.settingFactor,
      parameter.rounding,
    );
    const wanted = law.reliefLift(share, from.pressure - to.pressure, rated);
    derivative.lift = ((command.stuckAt < 0 ? wanted : command.stuckAt) - state.lift) / parameter.lag;
    const flow =
      (parameter.fullFlowRate *
        Math.max(state.lift, 0) *
        law.signedRoot(from.pressure - to.pressure, parameter.smoothing)) /
      Math.sqrt(rated);
    const massFlow = flow * (flow > 0 ? from.density : to.density);
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const lost = massFlow * (from.potential - to.potential);
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow += (massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (massFlow > 0 ? lost : 0) + carried;
    reading.massFlow = massFlow;
    reading.flow = flow;
    reading.lostPower = lost;
  },
  loss({ parameter, from, to, state, law }) {
    const flow =
      (parameter.fullFlowRate *
        Math.max(state.lift, 0) *
        law.signedRoot(from.pressure - to.pressure, parameter.smoothing)) /
      Math.sqrt(parameter.fullFlow - 101325);
    return flow * (flow > 0 ? from.density : to.density) * (from.potential - to.potential);
  },
  examine: ({ parameter }) =>
    parameter.fullFlow! > parameter.cracking!
      ? []
      : [
          {
            parameter: 'fullFlow',
            what: 'the full-flow pressure is not above the cracking pressure',
            remedy: 'direct valves rise by 10 % to 25 %, pilot-operated ones by 3 % to 10 %',
          },
        ],
});
