import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing, spoolStuckAt } from './shared-parameters.js';

/**
 * Isolation valve: a request is taken over after the dead time of its pilot stage, the spool then moves at its opening
 * or closing rate with a short lag at the ends, and the area follows the position on a minimum-jerk curve, which keeps
 * oil columns from hammering. Without power it goes to its fail position.
 */
export const isolationValve = branch({
  kind: 'isolation-valve',
  about: 'isolation valve with opening and closing times, dead time and a fail position',
  source: 'common practice, no source',
  ports: { from: 'oil', to: 'oil' },
  states: { position: { unit: '1', about: 'position of the spool, 0 closed to 1 open', least: -0.01, most: 1.01 } },
  memory: {
    accepted: { unit: '1', about: 'position that the spool is driven to' },
    waited: { unit: 's', about: 'time for which another one has been asked for', gradual: true },
  },
  commands: {
    open: { unit: '1', about: 'wanted position, 0 closed to 1 open', rest: 0, least: 0, most: 1 },
    power: { unit: '1', about: 'supply of the pilot stage, on above 0.5', rest: 1, least: 0, most: 1 },
    stuckAt: spoolStuckAt,
    leakArea: { unit: 'm2', about: 'further leak area', rest: 0, least: 0, most: 1e-3, fault: true },
    speedFactor: { unit: '1', about: 'share of its speed that is left', rest: 1, least: 0.01, most: 1, fault: true },
  },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    opening: { unit: '1', about: 'share of the area that is open', least: 0, most: 1 },
    difference: { unit: 'Pa', about: 'pressure of from less that of to' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area when open', least: 1e-8, most: 0.01, usual: [2e-5, 1e-3] },
    dischargeCoefficient,
    opens: { unit: 's', about: 'time to open', default: 0.03, least: 0.001, most: 10, usual: [0.02, 0.1] },
    closes: { unit: 's', about: 'time to close', default: 0.03, least: 0.001, most: 10, usual: [0.02, 0.1] },
    deadTime: { unit: 's', about: 'time until it begins to move', default: 0.01, least: 0, most: 1, usual: [0, 0.04] },
    lag: { unit: 's', about: 'lag at the ends of its way', default: 0.003, least: 0.0001, most: 1 },
    leak: { unit: 'm2', about: 'leak area when closed', default: 0, least: 0, most: 1e-5 },
    atPowerLoss: { unit: '1', about: 'where it goes without power', default: 0, choices: ['closed', 'open', 'holds'] },
    smoothing,
  },
  starts: { position: { unit: '1', about: 'position', default: 0, least: 0, most: 1 } },
  laws: flowLaws,
  update({ parameter, memory, command, step }) {
    const without = parameter.atPowerLoss === 0 ? 0 : parameter.atPowerLoss === 1 ? 1 : memory.accepted;
    const asked = command.power > 0.5 ? command.open : without;
    const waiting = asked !== memory.accepted;
    const waited = waiting ? memory.waited + step : 0;
    // half a substep of grace: whole substeps do not add up to the dead time to the bit
    const taken = waiting && waited >= parameter.deadTime - 0.5 * step;
    memory.accepted = taken ? asked : memory.accepted;
    memory.waited = taken ? 0 : waited;
  },
  flows({ parameter, from, to, state, memory, command, derivative, reading, law }) {
    const target = command.stuckAt < 0 ? memory.accepted : command.stuckAt;
    const rate = (target - state.position) / parameter.lag;
    derivative.position = command.speedFactor * Math.max(-1 / parameter.closes, Math.min(1 / parameter.opens, rate));
    const opening = law.minimumJerk(state.position);
    const massFlow = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.dischargeCoefficient * (parameter.area * opening + parameter.leak + command.leakArea),
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
    reading.opening = opening;
    reading.difference = from.pressure - to.pressure;
  },
  loss({ parameter, from, to, state, command, law }) {
    return (
      law.orificeMassFlow(
        from.pressure,
        to.pressure,
        from.density,
        to.density,
        parameter.dischargeCoefficient *
          (parameter.area * law.minimumJerk(state.position) + parameter.leak + command.leakArea),
        parameter.smoothing,
      ) *
      (from.potential - to.potential)
    );
  },
  initial: ({ start }) => ({ position: start.position!, accepted: start.position!, waited: 0 }),
});
