import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';

/** A prescribed flow from one store to another, whatever the pressures; the work it takes or gives comes from outside. */
export const flowSource = branch({
  kind: 'flow-source',
  about: 'prescribed flow between two stores, following its command with a lag',
  source: 'prescribed',
  ports: { from: 'oil', to: 'oil' },
  states: { flow: { unit: 'm3/s', about: 'volume flow at the density upstream', scale: 1e-3 } },
  commands: { flowRequest: { unit: 'm3/s', about: 'wanted volume flow', rest: 0, least: -0.1, most: 0.1 } },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    power: { unit: 'W', about: 'power put into the oil' },
  },
  parameters: { lag: { unit: 's', about: 'lag of the flow', default: 0.005, least: 0.0001, most: 10 } },
  starts: { flow: { unit: 'm3/s', about: 'flow', default: 0 } },
  laws: flowLaws,
  flows({ parameter, from, to, state, command, derivative, reading, law }) {
    const massFlow = state.flow * (state.flow > 0 ? from.density : to.density);
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    derivative.flow = (command.flowRequest - state.flow) / parameter.lag;
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow -= carried;
    to.heatFlow += carried;
    reading.massFlow = massFlow;
    reading.power = massFlow * (to.potential - from.potential);
  },
  supply({ from, to, state }) {
    return state.flow * (state.flow > 0 ? from.density : to.density) * (to.potential - from.potential);
  },
  initial: ({ start }) => ({ flow: start.flow! }),
});
