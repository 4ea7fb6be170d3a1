import { store } from './define.js';
import { oilMass } from './fluids.js';
import * as flowLaws from './laws/flow.js';
import * as oilLaws from './laws/oil.js';
import { oilStoreParameters } from './shared-parameters.js';

/**
 * An open tank at the pressure of the air around it. Air breathes in and out as the level moves; its work on the oil is
 * counted as power from outside. Below a twentieth of the volume, what is drawn contains air: the density falls with
 * the level, so that flow out ends as the tank runs dry.
 */
export const tank = store({
  kind: 'tank',
  about: 'tank open to the atmosphere, with level and heat to its surroundings',
  source: 'common practice, no source',
  valid: 'the height of the oil above the ports is neglected',
  ports: { oil: 'oil', wall: 'heat' },
  fluid: true,
  states: {
    mass: { unit: 'kg', about: 'oil mass', least: 0 },
    heat: { unit: 'J', about: 'thermal energy of the oil and of the metal that follows it', scale: 1e6 },
  },
  readings: {
    level: { unit: '1', about: 'oil as a share of the volume', least: 0, most: 1 },
    temperature: { unit: 'K', about: 'oil temperature' },
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 0 },
    airFlow: { unit: 'm3/s', about: 'air breathed in' },
  },
  parameters: {
    volume: { unit: 'm3', about: 'volume', least: 1e-4, most: 2, usual: [0.005, 0.2] },
    ...oilStoreParameters,
    ambientPressure: {
      unit: 'Pa',
      about: 'pressure of the air around it',
      least: 3e4,
      most: 3e5,
      usual: [7e4, 1.1e5],
    },
    ambientTemperature: { unit: 'K', about: 'temperature around it', least: 220, most: 340 },
    conductance: { unit: 'W/K', about: 'heat through its walls', default: 10, least: 0, usual: [5, 50] },
    leastLevel: { unit: '1', about: 'level that is low; 0: not watched', default: 0.15, least: 0, most: 1 },
    maximumTemperature: { unit: 'K', about: 'greatest oil temperature; 0: not watched', default: 0, least: 0 },
  },
  starts: {
    level: { unit: '1', about: 'oil as a share of the volume', default: 0.7, least: 0, most: 1 },
    temperature: { unit: 'K', about: 'oil temperature; 0: that of the fluid', default: 0, least: 0, most: 450 },
  },
  laws: { ...oilLaws, ...flowLaws },
  limits: [
    {
      reading: 'level',
      side: 'below',
      level: 'level low',
      parameter: 'leastLevel',
      meaning: 'the charge pump will soon draw air, and oil is missing somewhere',
    },
    {
      reading: 'temperature',
      side: 'above',
      level: 'over temperature',
      parameter: 'maximumTemperature',
      meaning: 'the oil ages quickly, becomes thin, and seals harden',
    },
  ],
  efforts({ parameter, state, fluid, oil, wall, reading, law }) {
    const ratio = law.oilVolumeRatio(parameter.ambientPressure, fluid.freeAir, fluid.numerator, fluid.denominator);
    const full = (fluid.referenceDensity * parameter.volume) / ratio;
    const temperature = state.heat / (fluid.heatCapacity * (Math.max(state.mass, 0) + parameter.metalShare * full));
    oil.pressure = parameter.ambientPressure;
    oil.temperature = temperature;
    oil.density = (fluid.referenceDensity / ratio) * Math.max(1e-5, law.smoothStep((20 * state.mass) / full));
    oil.potential = law.oilPotential(
      parameter.ambientPressure,
      fluid.referenceDensity,
      fluid.freeAir,
      fluid.numerator,
      fluid.denominator,
    );
    oil.viscosity =
      fluid.referenceDensity * law.kinematicViscosity(temperature, fluid.viscosityIntercept, fluid.viscositySlope);
    oil.heatCapacity = fluid.heatCapacity;
    wall.temperature = temperature;
    reading.level = state.mass / full;
    reading.temperature = temperature;
    reading.pressure = parameter.ambientPressure;
  },
  derivatives({ parameter, fluid, derivative, oil, wall, reading, law }) {
    const ratio = law.oilVolumeRatio(parameter.ambientPressure, fluid.freeAir, fluid.numerator, fluid.denominator);
    derivative.mass = oil.massFlow;
    derivative.heat =
      oil.heatFlow + wall.heatFlow + parameter.conductance * (parameter.ambientTemperature - oil.temperature);
    reading.airFlow = (-oil.massFlow * ratio) / fluid.referenceDensity;
  },
  energy({ parameter, state, fluid, oil, law }) {
    const ratio = law.oilVolumeRatio(parameter.ambientPressure, fluid.freeAir, fluid.numerator, fluid.denominator);
    return state.mass * (oil.potential - (parameter.ambientPressure * ratio) / fluid.referenceDensity) + state.heat;
  },
  /** Heat from the surroundings, and the work of the air that breathes. */
  supply({ parameter, fluid, oil, law }) {
    const ratio = law.oilVolumeRatio(parameter.ambientPressure, fluid.freeAir, fluid.numerator, fluid.denominator);
    return (
      parameter.conductance * (parameter.ambientTemperature - oil.temperature) -
      (parameter.ambientPressure * oil.massFlow * ratio) / fluid.referenceDensity
    );
  },
  holds: { oil: ({ state }) => state.mass },
  initial: ({ parameter, fluid, start }) => {
    const mass = oilMass(parameter.volume! * start.level!, parameter.ambientPressure!, fluid);
    const metal = parameter.metalShare! * oilMass(parameter.volume!, parameter.ambientPressure!, fluid);
    return { mass, heat: (mass + metal) * fluid.heatCapacity! * (start.temperature! || fluid.temperature!) };
  },
});
