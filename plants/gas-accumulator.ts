import type { BuildValues } from '../runtime/contract.js';
import { store } from './define.js';
import { oilMass } from './fluids.js';
import { poppetWidth, prechargeMass, restOilVolume } from './gas-accumulator-start.js';
import { smoothStep } from './laws/flow.js';
import * as gasLaws from './laws/gas.js';
import * as oilLaws from './laws/oil.js';
import { oilStoreParameters } from './shared-parameters.js';

/**
 * A gas-charged accumulator: oil, gas and separator in one store, as energy storage or as pressurised reservoir. The
 * oil is compressed by the pressure it sees; gas temperature is a state; gas heats the wall with a time constant, a
 * conductance or by natural convection, the wall gives heat to its surroundings. In the short form, for comparison only,
 * the gas has the temperature at which heat and work would balance, with a short lag; it has none where the gas is
 * charged faster than its heat can leave (see `shortFormMargin`). When nearly empty the poppet closes and the oil pressure leaves the gas pressure;
 * at its end the separator meets a stop.
 */
export const gasAccumulator = store({
  kind: 'gas-accumulator',
  about: 'bladder, piston or diaphragm accumulator with real or ideal nitrogen',
  source:
    'Otis and Pourmovahed 1985 (thermal time constant); Benedict, Webb and Rubin; Cooper and Goldfrank 1967; Span et al. 2000',
  valid:
    'gas 250 K to 450 K, up to 40 MPa (reference-nitrogen 230 K to 500 K, up to 60 MPa); natural convection within a third or so; one thermal time constant: right for temperature and energy, weak for stiffness above 0.1 Hz (Hartig, Depp, Rexer and Pelz 2020)',
  ports: { oil: 'oil', wall: 'heat' },
  fluid: true,
  states: {
    mass: {
      unit: 'kg',
      about: 'oil mass',
      least: 0,
      errorWeight: ({ parameter, fluid }: BuildValues) =>
        (3 * parameter.precharge!) / (poppetWidth(parameter) * fluid.referenceDensity! * 0.5e5),
    },
    heat: { unit: 'J', about: 'thermal energy of the oil and of the metal that follows it', scale: 1e6 },
    gasTemperature: { unit: 'K', about: 'gas temperature', least: 100, most: 700, scale: 300, errorWeight: () => 1 },
    wallTemperature: { unit: 'K', about: 'wall temperature', least: 200, most: 500, scale: 300 },
    gasMass: { unit: 'kg', about: 'gas mass', least: 0 },
  },
  commands: {
    gasLeak: { unit: 'kg/s', about: 'gas lost to the surroundings', rest: 0, least: 0, most: 10, fault: true },
  },
  readings: {
    pressure: { unit: 'Pa', about: 'absolute oil pressure', least: 0 },
    gasPressure: { unit: 'Pa', about: 'absolute gas pressure', least: 0 },
    gasVolume: { unit: 'm3', about: 'gas volume', least: 0 },
    oilVolume: { unit: 'm3', about: 'oil volume under pressure', least: 0 },
    stateOfCharge: { unit: '1', about: 'oil volume as a share of that at the end of travel', least: 0 },
    oilTemperature: { unit: 'K', about: 'oil temperature' },
    gasHeatFlow: { unit: 'W', about: 'heat from the wall into the gas' },
    inflow: { unit: 'm3/s', about: 'oil that flows in, at its own pressure' },
    heatTime: { unit: 's', about: 'thermal time constant of the gas at present', least: 0 },
    shortFormMargin: {
      unit: '1',
      about: 'what is left until the short form has no solution: 1 at rest, 0 there',
    },
  },
  parameters: {
    volume: { unit: 'm3', about: 'gas volume when empty of oil', least: 1e-5, most: 2, usual: [1e-4, 0.2] },
    ...oilStoreParameters,
    precharge: { unit: 'Pa', about: 'gas pressure when empty of oil', least: 1.1e5, most: 4e7, usual: [3e5, 2.2e7] },
    prechargeTemperature: {
      unit: 'K',
      about: 'temperature at which the precharge was set',
      default: 293.15,
      least: 230,
      most: 350,
    },
    gas: {
      unit: '1',
      about: 'nitrogen by Benedict, Webb and Rubin, as an ideal gas, or by the reference equation (fitted)',
      default: 0,
      choices: ['nitrogen', 'ideal-nitrogen', 'reference-nitrogen'],
    },
    separator: { unit: '1', about: 'kind of separator', default: 0, choices: ['bladder', 'piston', 'diaphragm'] },
    leastGasShare: {
      unit: '1',
      about: 'gas volume at the end of travel, as a share of the volume',
      default: 0.05,
      least: 0.01,
      most: 0.9,
    },
    closingShare: {
      unit: '1',
      about: 'oil volume below which the poppet closes, as a share of the volume',
      default: 0.004,
      least: 0.001,
      most: 0.05,
    },
    stopPressure: {
      unit: 'Pa',
      about: 'pressure of the end stop five closing volumes past the end of travel',
      default: 3e7,
      least: 1e6,
      most: 1e9,
      difference: true,
    },
    heatTransfer: {
      unit: '1',
      about: 'what carries heat between gas and wall',
      default: 0,
      choices: ['time constant', 'conductance', 'natural convection'],
    },
    gasTemperatureForm: {
      unit: '1',
      about: 'gas temperature as a state, or by the short form for comparison',
      default: 0,
      choices: ['state', 'short form'],
    },
    gasConductance: {
      unit: 'W/K',
      about: 'conductance between gas and wall, where that is chosen',
      default: 100,
      least: 0.01,
      most: 1e6,
      usual: [1, 500],
    },
    gasSurface: {
      unit: 'm2',
      about: 'surface between gas and wall, for natural convection',
      default: 0.5,
      least: 1e-3,
      most: 50,
      usual: [0.02, 3],
    },
    convectionFactor: {
      unit: '1',
      about: 'factor C of Nu = C Ra^(1/3)',
      default: 0.13,
      least: 0.01,
      most: 1,
      usual: [0.1, 0.15],
    },
    shortFormLag: { unit: 's', about: 'lag of the short form', default: 0.02, least: 0.002, most: 1 },
    leastShortFormMargin: {
      unit: '1',
      about: 'margin of the short form below which it is not to be believed; 0: not watched',
      default: 0.6,
      least: 0,
      most: 1,
    },
    timeConstant: {
      unit: 's',
      about: 'thermal time constant of the gas, m cv/(h A)',
      default: 30,
      least: 0.1,
      most: 1e9,
      usual: [3, 120],
    },
    foamHeatCapacity: {
      unit: 'J/K',
      about: 'heat capacity of elastomeric foam in the gas; 0: none',
      default: 0,
      least: 0,
      most: 1e6,
    },
    wallHeatCapacity: {
      unit: 'J/K',
      about: 'heat capacity of the shell',
      default: 30000,
      least: 100,
      most: 1e12,
      usual: [2e3, 1e5],
    },
    ambientConductance: {
      unit: 'W/K',
      about: 'heat from the wall to the surroundings',
      default: 8,
      least: 0,
      usual: [0, 30],
    },
    oilConductance: { unit: 'W/K', about: 'heat between the oil and the wall', default: 20, least: 0, usual: [0, 200] },
    ambientTemperature: { unit: 'K', about: 'temperature around it', least: 220, most: 340 },
    reliefSetting: {
      unit: 'Pa',
      about: 'cracking pressure of the relief valve that protects it; 0: not watched',
      default: 0,
      least: 0,
    },
    maximumAllowable: { unit: 'Pa', about: 'maximum allowable pressure PS; 0: not watched', default: 0, least: 0 },
    maximumTemperature: { unit: 'K', about: 'greatest gas temperature; 0: not watched', default: 0, least: 0 },
    endOfTravel: {
      unit: '1',
      about: 'state of charge at which the separator is near its end',
      default: 0.97,
      least: 0,
    },
  },
  starts: {
    pressure: { unit: 'Pa', about: 'absolute oil pressure; 0: by state of charge', default: 0, least: 0 },
    charge: { unit: '1', about: 'state of charge; 0: empty', default: 0, least: 0, most: 1 },
    temperature: { unit: 'K', about: 'gas and wall temperature; 0: the surroundings', default: 0, least: 0, most: 450 },
    oilTemperature: { unit: 'K', about: 'oil temperature; 0: that of the fluid', default: 0, least: 0, most: 450 },
  },
  laws: { ...oilLaws, ...gasLaws, smoothStep },
  limits: [
    {
      reading: 'shortFormMargin',
      side: 'below',
      level: 'not following',
      parameter: 'leastShortFormMargin',
      meaning:
        'oil flows in nearly as fast as the short form of the gas can follow: temperature and pressure are wrong',
    },
    {
      reading: 'gasPressure',
      side: 'below',
      level: 'below precharge',
      parameter: 'precharge',
      share: 0.9,
      meaning: 'gas has been lost: the accumulator stores less and its separator strikes the poppet',
    },
    {
      reading: 'pressure',
      side: 'below',
      level: 'below precharge',
      parameter: 'precharge',
      meaning: 'the accumulator is empty: no oil is left for braking, launching or lubrication',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'near relief',
      parameter: 'reliefSetting',
      share: 0.95,
      meaning: 'the accumulator is nearly full: recovered energy will soon go over the relief valve',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'above maximum',
      parameter: 'maximumAllowable',
      meaning: 'the pressure vessel is loaded beyond what it is permitted for',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'above 1.1 maximum',
      parameter: 'maximumAllowable',
      share: 1.1,
      meaning: 'the pressure vessel may fail; a real vehicle is to be stopped, relieved and inspected',
    },
    {
      reading: 'gasTemperature',
      side: 'above',
      level: 'over temperature',
      parameter: 'maximumTemperature',
      meaning: 'the separator hardens and will leak gas into the oil',
    },
    {
      reading: 'stateOfCharge',
      side: 'above',
      level: 'end of travel',
      parameter: 'endOfTravel',
      meaning: 'the separator is at its end: the pressure will rise without warning and the bladder or seal suffers',
    },
  ],
  efforts({ parameter, state, fluid, oil, wall, reading, law }) {
    const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
    const closing = parameter.closingShare * parameter.volume;
    const end = (1 - parameter.leastGasShare) * parameter.volume;
    const mass = Math.max(state.mass, 1e-8 * fluid.referenceDensity * parameter.volume);
    const oilVolume = law.accumulatorOilVolume(
      mass,
      state.gasTemperature,
      state.gasMass,
      real,
      parameter.volume,
      closing,
      end,
      parameter.stopPressure,
      fluid.referenceDensity,
      fluid.freeAir,
      fluid.numerator,
      fluid.denominator,
    );
    const gasVolume = law.accumulatorGasVolume(oilVolume, parameter.volume, closing);
    const gasPressure = law.gasPressure(state.gasMass * (1 / gasVolume), state.gasTemperature, real);
    const pressure =
      gasPressure * law.poppetShare(oilVolume, closing) + law.stopRise(oilVolume, closing, end, parameter.stopPressure);
    const temperature =
      state.heat /
      (fluid.heatCapacity *
        (Math.max(state.mass, 0) + parameter.metalShare * fluid.referenceDensity * parameter.volume));
    oil.pressure = pressure;
    oil.temperature = temperature;
    // below a tenth of the closing volume the density goes to zero with the oil that is left: what draws gets less
    oil.density =
      (Math.max(state.mass, 1e-6 * mass) / oilVolume) * Math.max(1e-4, law.smoothStep((10 * oilVolume) / closing));
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
    wall.temperature = state.wallTemperature;
    reading.pressure = pressure;
    reading.gasPressure = gasPressure;
    reading.gasVolume = gasVolume;
    reading.oilVolume = oilVolume;
    reading.stateOfCharge = oilVolume * (1 / end);
    reading.oilTemperature = temperature;
  },
  derivatives({ parameter, state, command, fluid, oil, wall, reading, derivative, law }) {
    const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
    const closing = parameter.closingShare * parameter.volume;
    const end = (1 - parameter.leastGasShare) * parameter.volume;
    const mass = Math.max(state.mass, 1e-8 * fluid.referenceDensity * parameter.volume);
    const oilVolume = reading.oilVolume;
    const gasVolume = reading.gasVolume;
    const density = state.gasMass * (1 / gasVolume);
    const heatCapacity = state.gasMass * law.gasHeatCapacity(density, state.gasTemperature, real);
    const byTemperature = law.gasPressureByTemperature(density, state.gasTemperature, real);
    const byMass = law.accumulatorVolumeByMass(
      mass,
      state.gasTemperature,
      state.gasMass,
      real,
      parameter.volume,
      closing,
      end,
      parameter.stopPressure,
      fluid.referenceDensity,
      fluid.freeAir,
      fluid.numerator,
      fluid.denominator,
      oilVolume,
    );
    const byGas = law.accumulatorVolumeByGas(
      mass,
      state.gasTemperature,
      state.gasMass,
      real,
      parameter.volume,
      closing,
      end,
      parameter.stopPressure,
      fluid.referenceDensity,
      fluid.freeAir,
      fluid.numerator,
      fluid.denominator,
      oilVolume,
    );
    // the gas volume answers oil, gas temperature and gas loss: dVg = -share (byMass dm + byGas (pT dT + pm dmg))
    const share = law.poppetShare(oilVolume, closing);
    const gasLoss = -command.gasLeak;
    const byGasMass = law.gasPressureByDensity(density, state.gasTemperature, real) * (1 / gasVolume);
    const shrinking = share * (byMass * oil.massFlow + byGas * byGasMass * gasLoss);
    const conductance =
      parameter.heatTransfer === 0
        ? heatCapacity * (1 / parameter.timeConstant)
        : parameter.heatTransfer === 1
          ? parameter.gasConductance
          : parameter.gasSurface *
            law.naturalConvection(
              density,
              state.gasTemperature,
              state.wallTemperature,
              law.gasHeatCapacity(density, state.gasTemperature, real),
              byTemperature,
              law.gasPressureByDensity(density, state.gasTemperature, real),
              parameter.convectionFactor,
            );
    const work = state.gasTemperature * byTemperature;
    const oilHeat = parameter.oilConductance * (oil.temperature - state.wallTemperature);
    derivative.mass = oil.massFlow;
    derivative.heat = oil.heatFlow - oilHeat;
    derivative.gasMass = gasLoss;
    const resisting = heatCapacity + parameter.foamHeatCapacity - work * share * byGas * byTemperature;
    const working = work * (shrinking + gasLoss / density);
    // the short form: heat and work balance, (hA)(Tw - T) = T pT dV/dt
    const margin = 1 - (byTemperature * share * byMass * oil.massFlow) / conductance;
    // held where the laws of the gas still hold: 0.77 to 1.67 times the wall's temperature
    const believed = Math.max(0.6, Math.min(1.3, margin));
    const settled = (state.wallTemperature / believed - state.gasTemperature) / parameter.shortFormLag;
    const driven = conductance * (state.wallTemperature - state.gasTemperature);
    const heatFlow = parameter.gasTemperatureForm === 0 ? driven : settled * resisting - working;
    derivative.gasTemperature = parameter.gasTemperatureForm === 0 ? (driven + working) / resisting : settled;
    derivative.wallTemperature =
      (oilHeat -
        heatFlow +
        wall.heatFlow +
        parameter.ambientConductance * (parameter.ambientTemperature - state.wallTemperature)) *
      (1 / parameter.wallHeatCapacity);
    reading.gasHeatFlow = heatFlow;
    reading.heatTime = heatCapacity / conductance;
    reading.shortFormMargin = parameter.gasTemperatureForm === 0 ? 1 : margin;
    reading.inflow = (oil.massFlow * oilVolume) / mass;
  },
  energy({ parameter, state, oil, reading, law }) {
    const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
    const closing = parameter.closingShare * parameter.volume;
    const end = (1 - parameter.leastGasShare) * parameter.volume;
    return (
      state.mass * oil.potential -
      oil.pressure * reading.oilVolume +
      state.heat +
      state.gasMass * law.gasEnergy(state.gasMass * (1 / reading.gasVolume), state.gasTemperature, real) +
      law.stopEnergy(reading.oilVolume, closing, end, parameter.stopPressure) +
      parameter.foamHeatCapacity * state.gasTemperature +
      parameter.wallHeatCapacity * state.wallTemperature
    );
  },
  /** Heat from the surroundings; gas that leaks takes its enthalpy along. */
  supply({ parameter, state, command, reading, law }) {
    const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
    const density = state.gasMass * (1 / reading.gasVolume);
    const enthalpy = law.gasEnergy(density, state.gasTemperature, real) + reading.gasPressure / density;
    return (
      parameter.ambientConductance * (parameter.ambientTemperature - state.wallTemperature) - command.gasLeak * enthalpy
    );
  },
  holds: { oil: ({ state }) => state.mass },
  initial: ({ parameter, fluid, start }) => {
    const temperature = start.temperature! || parameter.ambientTemperature!;
    const gasMass = prechargeMass(parameter);
    const [oilVolume, pressure] = restOilVolume(parameter, gasMass, temperature, start);
    const mass = oilMass(oilVolume, pressure, fluid);
    return {
      mass,
      heat:
        (mass + parameter.metalShare! * fluid.referenceDensity! * parameter.volume!) *
        fluid.heatCapacity! *
        (start.oilTemperature! || fluid.temperature!),
      gasTemperature: temperature,
      wallTemperature: temperature,
      gasMass,
    };
  },
  examine: ({ parameter }) => {
    const problems: { parameter: string; what: string; remedy: string }[] = [];
    const most = parameter.maximumAllowable!;
    const ratio = most / parameter.precharge!;
    const greatest = [4, 10, 8][parameter.separator!]!;
    if (most > 0 && ratio > greatest) {
      problems.push({
        parameter: 'precharge',
        what: `maximumAllowable is ${ratio.toFixed(1)} times the precharge, more than this separator bears (${greatest})`,
        remedy: 'raise the precharge, or take another separator',
      });
    }
    if (most > 0 && parameter.precharge! >= most) {
      problems.push({
        parameter: 'precharge',
        what: 'the precharge is not below maximumAllowable',
        remedy: 'lower the precharge to 0.9 of the least working pressure or less',
      });
    }
    if (parameter.gasTemperatureForm === 1 && parameter.heatTransfer === 2) {
      problems.push({
        parameter: 'gasTemperatureForm',
        what: 'the short form goes with a time constant or a conductance, not with natural convection',
        remedy: 'set gasTemperatureForm: state, or another heatTransfer',
      });
    }
    if (parameter.reliefSetting! > most && most > 0) {
      problems.push({
        parameter: 'reliefSetting',
        what: 'the relief setting is above maximumAllowable',
        remedy: 'set the relief valve at or below PS',
      });
    }
    return problems;
  },
});
