import { store } from './define.js';
import * as oilLaws from './laws/oil.js';

/** An endless supply at a prescribed pressure, for small test circuits: what flows in or out comes from outside. */
export const pressureSource = store({
  kind: 'pressure-source',
  about: 'prescribed oil pressure and temperature',
  source: 'prescribed',
  ports: { oil: 'oil' },
  fluid: true,
  commands: {
    pressureChange: { unit: 'Pa', about: 'change of the prescribed pressure', rest: 0 },
  },
  readings: {
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 0 },
    massFlow: { unit: 'kg/s', about: 'mass flow out of the source' },
  },
  parameters: {
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 1000, most: 1e8 },
    temperature: { unit: 'K', about: 'oil temperature; 0: that of the fluid', default: 0, least: 0, most: 450 },
  },
  laws: oilLaws,
  efforts({ parameter, command, fluid, oil, reading, law }) {
    const pressure = Math.max(parameter.pressure + command.pressureChange, 1000);
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
  derivatives({ oil, reading }) {
    reading.massFlow = -oil.massFlow;
  },
  supply({ oil }) {
    return -oil.massFlow * oil.potential - oil.heatFlow;
  },
  brings: { oil: ({ oil }) => -oil.massFlow },
});
