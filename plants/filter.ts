import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { smoothing } from './shared-parameters.js';

/**
 * Filter with clogging and a bypass valve. Loss of the element: dp = a mu q + b rho q^2, from its clean difference at
 * the rated flow; the viscous part grows with `loading`, which what flows through it adds to. Above its cracking
 * difference the bypass opens, with a lag, for flow from `from` to `to` only.
 */
export const filter = branch({
  kind: 'filter',
  about: 'oil filter with clogging and bypass',
  source: 'dp = a mu q + b rho q^2: common form, no source; terms of ISO 3968',
  ports: { from: 'oil', to: 'oil' },
  states: {
    loading: { unit: '1', about: 'viscous resistance as a multiple of that of a clean element', least: 0.99, scale: 1 },
    bypass: { unit: '1', about: 'opening of the bypass', least: -0.01, most: 1.01 },
  },
  commands: {
    clogging: { unit: '1', about: 'further multiple of the resistance', rest: 1, least: 1, most: 1000, fault: true },
    bypassStuckAt: {
      unit: '1',
      about: 'opening at which the bypass sticks; below 0: free',
      rest: -1,
      least: -1,
      most: 1,
      fault: true,
    },
  },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    bypassFlow: { unit: 'm3/s', about: 'volume flow through the bypass: not filtered' },
    difference: { unit: 'Pa', about: 'pressure of from less that of to' },
  },
  parameters: {
    ratedFlow: {
      unit: 'm3/s',
      about: 'flow at which the clean difference is given',
      least: 1e-6,
      most: 0.1,
      usual: [1e-4, 0.02],
    },
    cleanDifference: {
      unit: 'Pa',
      about: 'difference of the clean filter at the rated flow',
      default: 0.5e5,
      least: 100,
      most: 20e5,
      difference: true,
      usual: [0.2e5, 2e5],
    },
    viscousShare: { unit: '1', about: 'share of it that is viscous', default: 0.7, least: 0.05, most: 1 },
    ratedViscosity: {
      unit: 'Pa s',
      about: 'dynamic viscosity at which it is given',
      default: 0.0264,
      least: 1e-3,
      most: 1,
      usual: [0.02, 0.04],
    },
    ratedDensity: { unit: 'kg/m3', about: 'density at which it is given', default: 860, least: 500, most: 1300 },
    loadingRate: {
      unit: '1/m3',
      about: 'relative growth of its resistance per volume that it filters',
      default: 0,
      least: 0,
      most: 1e4,
    },
    bypassCracking: {
      unit: 'Pa',
      about: 'difference at which the bypass begins to open',
      default: 3.5e5,
      least: 0.1e5,
      most: 50e5,
      difference: true,
      usual: [1.5e5, 7e5],
    },
    bypassOpensOver: {
      unit: 'Pa',
      about: 'further difference at which it is open',
      default: 1e5,
      least: 0.1e5,
      most: 50e5,
      difference: true,
    },
    bypassArea: {
      unit: 'm2',
      about: 'effective area of the bypass when open; 0: no bypass',
      default: 1e-4,
      least: 0,
      most: 0.01,
    },
    bypassLag: { unit: 's', about: 'lag of the bypass', default: 0.005, least: 0.0005, most: 1 },
    greatestDifference: {
      unit: 'Pa',
      about: 'difference at which the clogging indicator comes; 0: not watched',
      default: 2.5e5,
      least: 0,
      difference: true,
    },
    smoothing,
  },
  starts: {
    loading: {
      unit: '1',
      about: 'viscous resistance as a multiple of the clean one',
      default: 1,
      least: 1,
      most: 1000,
    },
  },
  laws: flowLaws,
  limits: [
    {
      reading: 'difference',
      side: 'above',
      level: 'above maximum',
      parameter: 'greatestDifference',
      meaning:
        'the filter is clogged: the bypass will open and unfiltered oil reach the units, or the element collapse',
    },
  ],
  flows({ parameter, from, to, state, command, derivative, reading, law }) {
    const upstream = from.pressure > to.pressure ? 1 : 0;
    const density = upstream > 0 ? from.density : to.density;
    const viscosity = upstream > 0 ? from.viscosity : to.viscosity;
    const viscous =
      (parameter.viscousShare * parameter.cleanDifference * viscosity) /
      (parameter.ratedFlow * parameter.ratedViscosity);
    const inertial =
      ((1 - parameter.viscousShare) * parameter.cleanDifference * density) /
      (parameter.ratedFlow * parameter.ratedFlow * parameter.ratedDensity);
    const filtered = law.filterFlow(
      from.pressure - to.pressure,
      state.loading * command.clogging * viscous,
      inertial,
      parameter.smoothing,
    );
    const bypassed = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.bypassArea * Math.max(state.bypass, 0),
      parameter.smoothing,
    );
    const wanted = law.smoothStep((from.pressure - to.pressure - parameter.bypassCracking) / parameter.bypassOpensOver);
    derivative.bypass =
      ((command.bypassStuckAt < 0 ? wanted : command.bypassStuckAt) - state.bypass) / parameter.bypassLag;
    derivative.loading = state.loading * parameter.loadingRate * Math.abs(filtered);
    const massFlow = filtered * density + bypassed;
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const lost = massFlow * (from.potential - to.potential);
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow += (massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (massFlow > 0 ? lost : 0) + carried;
    reading.massFlow = massFlow;
    reading.flow = massFlow / (massFlow > 0 ? from.density : to.density);
    reading.bypassFlow = bypassed / density;
    reading.difference = from.pressure - to.pressure;
  },
  loss({ parameter, from, to, state, command, law }) {
    const upstream = from.pressure > to.pressure ? 1 : 0;
    const density = upstream > 0 ? from.density : to.density;
    const viscosity = upstream > 0 ? from.viscosity : to.viscosity;
    const viscous =
      (parameter.viscousShare * parameter.cleanDifference * viscosity) /
      (parameter.ratedFlow * parameter.ratedViscosity);
    const inertial =
      ((1 - parameter.viscousShare) * parameter.cleanDifference * density) /
      (parameter.ratedFlow * parameter.ratedFlow * parameter.ratedDensity);
    const filtered = law.filterFlow(
      from.pressure - to.pressure,
      state.loading * command.clogging * viscous,
      inertial,
      parameter.smoothing,
    );
    const bypassed = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.bypassArea * Math.max(state.bypass, 0),
      parameter.smoothing,
    );
    return (filtered * density + bypassed) * (from.potential - to.potential);
  },
  initial: ({ start }) => ({ loading: start.loading! }),
});
