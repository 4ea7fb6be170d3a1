import type { BuildValues } from '../runtime/contract.js';
import { store } from './define.js';
import { massWeight, oilMass } from './fluids.js';
import * as flowLaws from './laws/flow.js';
import * as oilLaws from './laws/oil.js';
import { oilStoreParameters } from './shared-parameters.js';

/**
 * A closed volume of oil: mass is the state, pressure follows from it. Line, case, manifold or chamber. Oil that leaks to the
 * surroundings takes its energy along; what it leaks is settled once a substep, which is short against how fast it empties.
 */
export const oilVolume = store({
  kind: 'oil-volume',
  about: 'closed oil volume with compressible oil and free air',
  source: 'Merritt, Hydraulic Control Systems, 1967; pressure law of laws/oil.ts',
  valid: 'one lump: lines short against the wave length; dissolved air comes and goes at once',
  ports: { oil: 'oil', wall: 'heat' },
  fluid: true,
  states: {
    mass: {
      unit: 'kg',
      about: 'oil mass',
      least: 0,
      errorWeight: ({ parameter, fluid }: BuildValues) => massWeight(parameter.volume!, fluid),
    },
    heat: { unit: 'J', about: 'thermal energy of the oil and of the metal that follows it', scale: 1e5 },
  },
  memory: {
    leak: { unit: 'kg/s', about: 'oil lost to the surroundings, once a substep', gradual: true },
    lost: { unit: 'kg', about: 'oil lost to the surroundings so far', gradual: true },
  },
  commands: {
    leakArea: {
      unit: 'm2',
      about: 'area through which oil is lost to the surroundings: an external leak',
      rest: 0,
      least: 0,
      most: 1e-4,
      fault: true,
    },
  },
  readings: {
    pressure: { unit: 'Pa', about: 'absolute pressure', least: 0 },
    temperature: { unit: 'K', about: 'oil temperature' },
  },
  parameters: {
    volume: { unit: 'm3', about: 'volume', least: 1e-7, most: 1, usual: [1e-5, 0.02] },
    ...oilStoreParameters,
    maximumAllowable: { unit: 'Pa', about: 'maximum allowable pressure PS; 0: not watched', default: 0, least: 0 },
    reliefSetting: {
      unit: 'Pa',
      about: 'cracking pressure of the relief valve that protects it; 0: not watched',
      default: 0,
      least: 0,
    },
    leastPressure: {
      unit: 'Pa',
      about: 'least inlet pressure of what draws from it; 0: not watched',
      default: 0,
      least: 0,
    },
    maximumCasePressure: { unit: 'Pa', about: 'greatest pressure as a case; 0: not watched', default: 0, least: 0 },
    maximumTemperature: { unit: 'K', about: 'greatest oil temperature; 0: not watched', default: 0, least: 0 },
  },
  starts: {
    pressure: { unit: 'Pa', about: 'absolute pressure', default: 101325, least: 1000 },
    temperature: { unit: 'K', about: 'oil temperature; 0: that of the fluid', default: 0, least: 0, most: 450 },
  },
  laws: { ...oilLaws, ...flowLaws },
  limits: [
    {
      reading: 'pressure',
      side: 'above',
      level: 'near relief',
      parameter: 'reliefSetting',
      share: 0.95,
      meaning: 'little is left until the relief valve opens and turns the work into heat',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'relief passing',
      parameter: 'reliefSetting',
      meaning: 'the relief valve passes oil: energy is lost and the oil heats up quickly',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'above maximum',
      parameter: 'maximumAllowable',
      meaning: 'hoses, housings and fittings are loaded beyond what they are permitted for',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'above 1.1 maximum',
      parameter: 'maximumAllowable',
      share: 1.1,
      meaning: 'a part may burst; a real vehicle is to be stopped, relieved and inspected',
    },
    {
      reading: 'pressure',
      side: 'below',
      level: 'below least inlet',
      parameter: 'leastPressure',
      meaning: 'the unit that draws from here cavitates: noise, loss of torque, and damage within minutes',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'case pressure',
      parameter: 'maximumCasePressure',
      meaning: 'the shaft seal is pressed out and the case leaks',
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
    const full = fluid.referenceDensity * parameter.volume;
    const mass = Math.max(state.mass, 0.001 * full);
    const pressure = law.oilPressure(full / mass, fluid.freeAir, fluid.numerator, fluid.denominator);
    const temperature = state.heat / (fluid.heatCapacity * (Math.max(state.mass, 0) + parameter.metalShare * full));
    oil.pressure = pressure;
    oil.temperature = temperature;
    // below the least mass of the pressure law the density goes to zero with the oil that is left
    oil.density = Math.max(state.mass, 1e-6 * mass) / parameter.volume;
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
    wall.temperature = temperature;
    reading.pressure = pressure;
    reading.temperature = temperature;
  },
  update({ memory, command, oil, step, law }) {
    const leak = Math.max(
      0,
      law.orificeMassFlow(oil.pressure, law.STANDARD_PRESSURE, oil.density, oil.density, 0.7 * command.leakArea, 1e4),
    );
    // what leaked in the substep that has ended is the leak from before
    memory.lost = memory.lost + step * memory.leak;
    memory.leak = leak;
  },
  derivatives({ memory, derivative, oil, wall }) {
    derivative.mass = oil.massFlow - memory.leak;
    derivative.heat = oil.heatFlow + wall.heatFlow - memory.leak * oil.heatCapacity * oil.temperature;
  },
  supply({ memory, oil }) {
    return -memory.leak * (oil.potential + oil.heatCapacity * oil.temperature);
  },
  energy({ parameter, state, oil }) {
    return state.mass * oil.potential - oil.pressure * parameter.volume + state.heat;
  },
  /** What was lost counts as held: it is known to the bit, an integral over the leak would not be. */
  holds: { oil: ({ state, memory }) => state.mass + memory.lost },
  initial: ({ parameter, fluid, start }) => {
    const mass = oilMass(parameter.volume!, start.pressure!, fluid);
    const metal = parameter.metalShare! * fluid.referenceDensity! * parameter.volume!;
    return { mass, heat: (mass + metal) * fluid.heatCapacity! * (start.temperature! || fluid.temperature!) };
  },
});
