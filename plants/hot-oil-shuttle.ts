import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing } from './shared-parameters.js';

/**
 * Hot-oil shuttle of a closed circuit: the side with the lower pressure is connected, over a flushing valve, to `drain`,
 * so that charge oil replaces hot oil. Near equal pressures both sides are shut.
 */
export const hotOilShuttle = branch({
  kind: 'hot-oil-shuttle',
  about: 'shuttle that flushes hot oil out of the low side of a closed circuit',
  source: 'common practice, no source',
  ports: { a: 'oil', b: 'oil', drain: 'oil' },
  states: {
    shuttle: { unit: '1', about: 'position: 1 with the higher pressure at a, -1 at b', least: -1.01, most: 1.01 },
  },
  commands: {
    stuckAt: {
      unit: '1',
      about: 'position at which it sticks; above 1: free',
      rest: 2,
      least: -1,
      most: 2,
      fault: true,
    },
  },
  readings: {
    flow: { unit: 'm3/s', about: 'volume flow into the drain' },
    aMassFlow: { unit: 'kg/s', about: 'mass flow out of a' },
    bMassFlow: { unit: 'kg/s', about: 'mass flow out of b' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area to the drain', least: 1e-8, most: 1e-3, usual: [2e-6, 1e-4] },
    dischargeCoefficient,
    switching: {
      unit: 'Pa',
      about: 'difference between the sides at which it is three quarters over',
      default: 4e5,
      least: 1e4,
      most: 1e7,
      difference: true,
      usual: [1e5, 1e6],
    },
    flushingPressure: {
      unit: 'Pa',
      about: 'pressure above which the flushing valve passes',
      least: 1.1e5,
      most: 1e7,
      usual: [8e5, 3e6],
    },
    opensOver: {
      unit: 'Pa',
      about: 'further pressure at which it is open',
      default: 2e5,
      least: 1e4,
      most: 1e7,
      difference: true,
    },
    lag: { unit: 's', about: 'lag of the shuttle', default: 0.01, least: 0.001, most: 1, usual: [0.005, 0.05] },
    smoothing,
  },
  laws: flowLaws,
  flows({ parameter, a, b, drain, state, command, derivative, reading, law }) {
    const aShare = law.smoothStep((-state.shuttle - 0.2) / 0.6);
    const bShare = law.smoothStep((state.shuttle - 0.2) / 0.6);
    const aMass = law.orificeMassFlow(
      a.pressure,
      drain.pressure,
      a.density,
      drain.density,
      parameter.dischargeCoefficient *
        parameter.area *
        aShare *
        law.smoothStep((a.pressure - parameter.flushingPressure) / parameter.opensOver),
      parameter.smoothing,
    );
    const bMass = law.orificeMassFlow(
      b.pressure,
      drain.pressure,
      b.density,
      drain.density,
      parameter.dischargeCoefficient *
        parameter.area *
        bShare *
        law.smoothStep((b.pressure - parameter.flushingPressure) / parameter.opensOver),
      parameter.smoothing,
    );
    const aLost = aMass * (a.potential - drain.potential);
    const bLost = bMass * (b.potential - drain.potential);
    const aCarried = law.heatCarried(aMass, a.heatCapacity * a.temperature, drain.heatCapacity * drain.temperature);
    const bCarried = law.heatCarried(bMass, b.heatCapacity * b.temperature, drain.heatCapacity * drain.temperature);
    a.massFlow -= aMass;
    b.massFlow -= bMass;
    drain.massFlow += aMass + bMass;
    a.heatFlow += (aMass > 0 ? 0 : aLost) - aCarried;
    b.heatFlow += (bMass > 0 ? 0 : bLost) - bCarried;
    drain.heatFlow += (aMass > 0 ? aLost : 0) + (bMass > 0 ? bLost : 0) + aCarried + bCarried;
    const difference = (a.pressure - b.pressure) / parameter.switching;
    const wanted = Math.tanh(difference);
    derivative.shuttle = ((command.stuckAt > 1 ? wanted : command.stuckAt) - state.shuttle) / parameter.lag;
    reading.flow = (aMass + bMass) / drain.density;
    reading.aMassFlow = aMass;
    reading.bMassFlow = bMass;
  },
  loss({ parameter, a, b, drain, state, law }) {
    const aShare = law.smoothStep((-state.shuttle - 0.2) / 0.6);
    const bShare = law.smoothStep((state.shuttle - 0.2) / 0.6);
    const aMass = law.orificeMassFlow(
      a.pressure,
      drain.pressure,
      a.density,
      drain.density,
      parameter.dischargeCoefficient *
        parameter.area *
        aShare *
        law.smoothStep((a.pressure - parameter.flushingPressure) / parameter.opensOver),
      parameter.smoothing,
    );
    const bMass = law.orificeMassFlow(
      b.pressure,
      drain.pressure,
      b.density,
      drain.density,
      parameter.dischargeCoefficient *
        parameter.area *
        bShare *
        law.smoothStep((b.pressure - parameter.flushingPressure) / parameter.opensOver),
      parameter.smoothing,
    );
    return aMass * (a.potential - drain.potential) + bMass * (b.potential - drain.potential);
  },
});
