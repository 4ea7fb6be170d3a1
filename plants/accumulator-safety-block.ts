import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing } from './shared-parameters.js';

/**
 * Safety block of an accumulator: shut-off valve, equaliser, discharge valve, relief valve.
 *
 * Asked to open, the small equaliser opens first; the shut-off valve follows when the pressures are within
 * `equalisedWithin` of one another, so that no oil column hammers. Asked to shut, both shut. The discharge valve empties
 * the accumulator into the tank: by command, without supply, and when the block has been shut for `dischargeAfter`.
 */
export const accumulatorSafetyBlock = branch({
  kind: 'accumulator-safety-block',
  about: 'shut-off with equalisation, discharge at rest and on power loss, and relief of an accumulator',
  source: 'functions after ISO 4413 and EN 14359; their dynamics common practice, no source',
  ports: { accumulator: 'oil', system: 'oil', tank: 'oil' },
  states: {
    main: { unit: '1', about: 'position of the shut-off valve, 0 shut to 1 open', least: -0.01, most: 1.01 },
    equaliser: { unit: '1', about: 'position of the equaliser', least: -0.01, most: 1.01 },
    discharge: { unit: '1', about: 'position of the discharge valve', least: -0.01, most: 1.01 },
    lift: {
      unit: '1',
      about: 'opening of the relief valve, 1 at its rated point',
      least: -0.01,
      errorWeight: () => 200,
    },
  },
  memory: {
    asked: { unit: '1', about: '1 while it is asked to be open and supplied' },
    equalised: { unit: '1', about: '1 once the pressures have met since it was asked' },
    shutFor: { unit: 's', about: 'time since it was last asked to be open', gradual: true },
    discharging: { unit: '1', about: '1 while the discharge valve is to be open' },
  },
  commands: {
    open: { unit: '1', about: 'opens above 0.5', rest: 0, least: 0, most: 1 },
    dump: { unit: '1', about: 'above 0.5 discharges into the tank', rest: 0, least: 0, most: 1 },
    power: { unit: '1', about: 'supply, on above 0.5', rest: 1, least: 0, most: 1 },
    mainStuckAt: {
      unit: '1',
      about: 'position at which the shut-off valve sticks; below 0: free',
      rest: -1,
      least: -1,
      most: 1,
      fault: true,
    },
    dischargeStuckAt: {
      unit: '1',
      about: 'position at which the discharge valve sticks; below 0: free',
      rest: -1,
      least: -1,
      most: 1,
      fault: true,
    },
  },
  readings: {
    flow: { unit: 'm3/s', about: 'volume flow to the system' },
    dischargeFlow: { unit: 'm3/s', about: 'volume flow through the discharge valve' },
    reliefFlow: { unit: 'm3/s', about: 'volume flow through the relief valve' },
    difference: { unit: 'Pa', about: 'pressure of the accumulator less that of the system' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area of the shut-off valve when open', least: 1e-7, most: 0.01, usual: [2e-5, 1e-3] },
    equaliserArea: { unit: 'm2', about: 'area of the equaliser', default: 3e-6, least: 1e-8, most: 1e-4 },
    dischargeArea: { unit: 'm2', about: 'area of the discharge valve', default: 5e-6, least: 1e-8, most: 1e-4 },
    dischargeCoefficient,
    travelTime: {
      unit: 's',
      about: 'time of each valve from end to end',
      default: 0.04,
      least: 0.002,
      most: 10,
      usual: [0.02, 0.1],
    },
    lag: { unit: 's', about: 'lag at the ends of their way', default: 0.004, least: 0.0005, most: 1 },
    equalisedWithin: {
      unit: 'Pa',
      about: 'difference below which the shut-off valve opens',
      default: 5e5,
      least: 1e4,
      most: 1e8,
      difference: true,
      usual: [2e5, 2e6],
    },
    dischargeAfter: { unit: 's', about: 'time shut after which it discharges; 0: never', default: 0, least: 0 },
    cracking: { unit: 'Pa', about: 'pressure at which its relief valve begins to open', least: 1.1e5, most: 1e8 },
    fullFlow: { unit: 'Pa', about: 'pressure at the rated flow of its relief valve', least: 1.2e5, most: 1.5e8 },
    fullFlowRate: { unit: 'm3/s', about: 'that rated flow', least: 1e-6, most: 0.1, usual: [1e-4, 0.02] },
    reliefLag: { unit: 's', about: 'lag of its relief valve', default: 0.005, least: 0.0005, most: 0.5 },
    passingFlow: {
      unit: 'm3/s',
      about: 'flow from which the relief valve counts as passing; 0: not watched',
      default: 1.6667e-5,
      least: 0,
    },
    smoothing,
  },
  starts: {
    open: { unit: '1', about: '1: open at the start', default: 0, least: 0, most: 1 },
  },
  laws: flowLaws,
  limits: [
    {
      reading: 'reliefFlow',
      side: 'above',
      level: 'relief passing',
      parameter: 'passingFlow',
      meaning: 'the relief valve passes oil: energy is lost and the oil heats up quickly',
    },
  ],
  update({ parameter, accumulator, system, memory, command, step }) {
    const asked = command.power > 0.5 && command.open > 0.5 ? 1 : 0;
    const near = Math.abs(accumulator.pressure - system.pressure) < parameter.equalisedWithin;
    const shutFor = asked > 0.5 ? 0 : memory.shutFor + step;
    const rested = parameter.dischargeAfter > 0 && shutFor > parameter.dischargeAfter;
    memory.asked = asked;
    memory.equalised = asked > 0.5 && (near || memory.equalised > 0.5) ? 1 : 0;
    memory.shutFor = shutFor;
    memory.discharging = command.power <= 0.5 || command.dump > 0.5 || rested ? 1 : 0;
  },
  flows({ parameter, accumulator, system, tank, state, memory, command, derivative, reading, law }) {
    const mainWanted = command.mainStuckAt < 0 ? memory.asked * memory.equalised : command.mainStuckAt;
    const dischargeWanted = command.dischargeStuckAt < 0 ? memory.discharging : command.dischargeStuckAt;
    const most = 1 / parameter.travelTime;
    derivative.main = Math.max(-most, Math.min(most, (mainWanted - state.main) / parameter.lag));
    derivative.equaliser = Math.max(-most, Math.min(most, (memory.asked - state.equaliser) / parameter.lag));
    derivative.discharge = Math.max(-most, Math.min(most, (dischargeWanted - state.discharge) / parameter.lag));
    const share = law.reliefShare(accumulator.pressure, parameter.cracking, parameter.fullFlow, 1e4);
    const rated = parameter.fullFlow - 101325;
    const wanted = law.reliefLift(share, accumulator.pressure - tank.pressure, rated);
    derivative.lift = (wanted - state.lift) / parameter.reliefLag;

    const mainArea =
      parameter.area * law.minimumJerk(state.main) + parameter.equaliserArea * law.minimumJerk(state.equaliser);
    const mainMass = law.orificeMassFlow(
      accumulator.pressure,
      system.pressure,
      accumulator.density,
      system.density,
      parameter.dischargeCoefficient * mainArea,
      parameter.smoothing,
    );
    const dischargeMass = law.orificeMassFlow(
      accumulator.pressure,
      tank.pressure,
      accumulator.density,
      tank.density,
      parameter.dischargeCoefficient * parameter.dischargeArea * law.minimumJerk(state.discharge),
      parameter.smoothing,
    );
    const reliefFlow =
      (parameter.fullFlowRate *
        Math.max(state.lift, 0) *
        law.signedRoot(accumulator.pressure - tank.pressure, parameter.smoothing)) /
      Math.sqrt(rated);
    const reliefMass = reliefFlow * (reliefFlow > 0 ? accumulator.density : tank.density);
    const tankMass = dischargeMass + reliefMass;
    const mainLost = mainMass * (accumulator.potential - system.potential);
    const tankLost = tankMass * (accumulator.potential - tank.potential);
    const content = accumulator.heatCapacity * accumulator.temperature;
    const mainCarried = law.heatCarried(mainMass, content, system.heatCapacity * system.temperature);
    const tankCarried = law.heatCarried(tankMass, content, tank.heatCapacity * tank.temperature);
    accumulator.massFlow -= mainMass + tankMass;
    system.massFlow += mainMass;
    tank.massFlow += tankMass;
    accumulator.heatFlow += (mainMass > 0 ? 0 : mainLost) + (tankMass > 0 ? 0 : tankLost) - mainCarried - tankCarried;
    system.heatFlow += (mainMass > 0 ? mainLost : 0) + mainCarried;
    tank.heatFlow += (tankMass > 0 ? tankLost : 0) + tankCarried;
    reading.flow = mainMass / (mainMass > 0 ? accumulator.density : system.density);
    reading.dischargeFlow = dischargeMass / (dischargeMass > 0 ? accumulator.density : tank.density);
    reading.reliefFlow = reliefFlow;
    reading.difference = accumulator.pressure - system.pressure;
  },
  loss({ parameter, accumulator, system, tank, state, law }) {
    const mainArea =
      parameter.area * law.minimumJerk(state.main) + parameter.equaliserArea * law.minimumJerk(state.equaliser);
    const mainMass = law.orificeMassFlow(
      accumulator.pressure,
      system.pressure,
      accumulator.density,
      system.density,
      parameter.dischargeCoefficient * mainArea,
      parameter.smoothing,
    );
    const dischargeMass = law.orificeMassFlow(
      accumulator.pressure,
      tank.pressure,
      accumulator.density,
      tank.density,
      parameter.dischargeCoefficient * parameter.dischargeArea * law.minimumJerk(state.discharge),
      parameter.smoothing,
    );
    const reliefFlow =
      (parameter.fullFlowRate *
        Math.max(state.lift, 0) *
        law.signedRoot(accumulator.pressure - tank.pressure, parameter.smoothing)) /
      Math.sqrt(parameter.fullFlow - 101325);
    const reliefMass = reliefFlow * (reliefFlow > 0 ? accumulator.density : tank.density);
    return (
      mainMass * (accumulator.potential - system.potential) +
      (dischargeMass + reliefMass) * (accumulator.potential - tank.potential)
    );
  },
  initial: ({ start }) => ({
    main: start.open!,
    equaliser: start.open!,
    asked: start.open!,
    equalised: start.open!,
  }),
  examine: ({ parameter }) =>
    parameter.fullFlow! > parameter.cracking!
      ? []
      : [
          {
            parameter: 'fullFlow',
            what: 'the full-flow pressure of its relief valve is not above the cracking pressure',
            remedy: 'raise fullFlow, or lower cracking',
          },
        ],
});
