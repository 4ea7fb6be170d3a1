import { branch } from './define.js';

/** Heat between two thermal contacts in proportion to their temperature difference. */
export const heatConductance = branch({
  kind: 'heat-conductance',
  about: 'heat conductance between two thermal contacts',
  source: "Newton's law of cooling",
  ports: { a: 'heat', b: 'heat' },
  readings: { heatFlow: { unit: 'W', about: 'heat from a to b' } },
  parameters: { conductance: { unit: 'W/K', about: 'conductance', least: 0, most: 1e6, usual: [1, 2000] } },
  flows({ parameter, a, b, reading }) {
    const heatFlow = parameter.conductance * (a.temperature - b.temperature);
    a.heatFlow -= heatFlow;
    b.heatFlow += heatFlow;
    reading.heatFlow = heatFlow;
  },
});
