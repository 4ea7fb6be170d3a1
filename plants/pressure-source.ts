import { store } from './define.js';
import * as oilLaws from './laws/oil.js';

/**
 * An endless supply at a prescribed pressure, for small test circuits. What it has given out so far are states, so that
 * the solver integrates them with everything else: the flow out of a prescribed pressure may change within a substep
 * as much as it likes, and a rule over the ends of substeps would miss it.
 */
export const pressureSource = store({
  kind: 'pressure-source',
  about: 'prescribed oil pressure, following its command with a lag, and temperature',
  source: 'prescribed',
  ports: { oil: 'oil' },
  fluid: true,
  states: {
    change: { unit: 'Pa', about: 'change of the pressure so far', scale: 1e5, difference: true },
    givenMass: { unit: 'kg', about: 'oil given out so far' },
    givenEnergy: { unit: 'J', about: 'energy given out so far', scale: 1e5 },
  },
  commands: {
    pressureChange: { unit: 'Pa', about: 'wanted change of the prescribed pressure', rest: 0, difference: true },
  },
  readings: {
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 0 },
    massFlow: { unit: 'kg/s', about: 'mass flow out of the source' },
  },
  parameters: {
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 1000, most: 1e8 },
    lag: { unit: 's', about: 'lag of a change', default: 0.002, least: 0.0001, most: 10 },
    temperature: { unit: 'K', about: 'oil temperature; 0: that of the fluid', default: 0, least: 0, most: 450 },
  },
  laws: oilLaws,
  efforts({ parameter, state, fluid, oil, reading, law }) {
    const pressure = Math.max(parameter.pressure + state.change, 1000);
    const temperature = parameter.temperature > 0 ? parameter.temperature : fluid.temperature;
    oil.pressure = pressure;
    oil.temperature = temperature;
    oil.density = law.oilDensity(pressure, fluid.referenceDensity, fluid.freeAir, fluid.numerator, fluid.denominator);
    oil.potential = law.oilPotential(
      pressure,
      fluid.referenceDensity,
      fluid.freeAir,
      fluid.numerator,
      fluid.denominator,
    );
    oil.viscosity =
      fluid.referenceDensity * law.kinematicViscosity(temperature, fluid.viscosityIntercept, fluid.viscositySlope);
    oil.heatCapacity = fluid.heatCapacity;
    reading.pressure = pressure;
  },
  derivatives({ parameter, state, command, oil, reading, derivative }) {
    derivative.change = (command.pressureChange - state.change) / parameter.lag;
    derivative.givenMass = -oil.massFlow;
    derivative.givenEnergy = -oil.massFlow * oil.potential - oil.heatFlow;
    reading.massFlow = -oil.massFlow;
  },
  energy({ state }) {
    return -state.givenEnergy;
  },
  holds: { oil: ({ state }) => -state.givenMass },
});
