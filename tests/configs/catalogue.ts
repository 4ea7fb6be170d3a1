import type { Catalogue } from '../../configs/bench-spec.js';
import { branch, store } from '../../plants/define.js';
import type { FluidKind } from '../../plants/fluids.js';
import { portKinds } from '../../plants/ports.js';
import type { InstrumentKind } from '../../runtime/instrument.js';

/** A small catalogue of invented kinds: enough for each thing that a bench file can say. Their functions do nothing. */

const volume = store({
  kind: 'volume',
  about: 'oil volume',
  source: 'test',
  ports: { oil: 'oil' },
  fluid: true,
  states: { mass: { unit: 'kg', about: 'oil mass' } },
  readings: { pressure: { unit: 'Pa', about: 'pressure' }, inflow: { unit: 'kg/s', about: 'inflow' } },
  parameters: {
    volume: { unit: 'm3', about: 'volume of the oil', least: 1e-5, most: 1, usual: [1e-4, 0.05] },
    maximumAllowable: { unit: 'Pa', about: 'maximum allowable pressure PS', default: 0 },
  },
  starts: {
    pressure: { unit: 'Pa', about: 'pressure', default: 101325 },
    temperature: { unit: 'K', about: 'oil temperature' },
  },
  limits: [
    {
      reading: 'pressure',
      side: 'above',
      level: 'above maximum',
      parameter: 'maximumAllowable',
      meaning: 'a pipe may burst',
    },
    {
      reading: 'pressure',
      side: 'above',
      level: 'above 1.1 maximum',
      parameter: 'maximumAllowable',
      share: 1.1,
      meaning: 'take it out of service',
    },
  ],
  efforts() {},
});

const accumulator = store({
  kind: 'accumulator',
  about: 'gas accumulator',
  source: 'test',
  ports: { oil: 'oil', wall: 'heat' },
  fluid: true,
  states: { gasTemperature: { unit: 'K', about: 'gas temperature' } },
  readings: { pressure: { unit: 'Pa', about: 'oil pressure' }, gasPressure: { unit: 'Pa', about: 'gas pressure' } },
  parameters: {
    volume: { unit: 'm3', about: 'gas volume when empty', least: 1e-4 },
    precharge: { unit: 'Pa', about: 'precharge pressure' },
    prechargeTemperature: { unit: 'K', about: 'temperature at precharge', default: 293.15 },
    separator: { unit: '1', about: 'separator', choices: ['bladder', 'piston', 'diaphragm'], default: 0 },
    maximumAllowable: { unit: 'Pa', about: 'maximum allowable pressure PS', default: 0 },
  },
  starts: { temperature: { unit: 'K', about: 'gas temperature' } },
  limits: [
    {
      reading: 'pressure',
      side: 'below',
      level: 'below precharge',
      parameter: 'precharge',
      meaning: 'the separator sits on its stop',
    },
  ],
  efforts() {},
  examine: ({ parameter }) =>
    parameter.precharge! < 2e5
      ? [{ parameter: 'precharge', what: 'precharge below what a bladder bears', remedy: 'use at least 2 bar(a)' }]
      : [],
});

const shaft = store({
  kind: 'shaft',
  about: 'rotating inertia',
  source: 'test',
  ports: { shaft: 'shaft' },
  states: { speed: { unit: 'rad/s', about: 'speed' } },
  parameters: { inertia: { unit: 'kg m2', about: 'moment of inertia' } },
  efforts() {},
});

const joint = store({
  kind: 'joint',
  about: 'two shafts joined',
  source: 'test',
  ports: { input: 'shaft', output: 'shaft' },
  efforts() {},
});

const valve = branch({
  kind: 'valve',
  about: 'isolation valve',
  source: 'test',
  ports: { from: 'oil', to: 'oil' },
  commands: { opening: { unit: '1', about: 'opening wanted', rest: 0, least: 0, most: 1 } },
  readings: { flow: { unit: 'm3/s', about: 'flow' }, drop: { unit: 'Pa', about: 'pressure drop', difference: true } },
  parameters: {
    opens: { unit: 's', about: 'opening time', least: 1e-3 },
    leak: { unit: 'm3/s', about: 'leakage', default: 0 },
  },
  flows() {},
});

const relief = branch({
  kind: 'relief',
  about: 'relief valve',
  source: 'test',
  ports: { from: 'oil', to: 'oil' },
  parameters: {
    cracking: { unit: 'Pa', about: 'cracking pressure' },
    fullFlow: { unit: 'Pa', about: 'pressure at full flow' },
    fullFlowRate: { unit: 'm3/s', about: 'full flow' },
    hysteresis: { unit: 'Pa', about: 'reseat below cracking', default: 1e5, difference: true },
  },
  flows() {},
});

const machine = branch({
  kind: 'machine',
  about: 'pump-motor',
  source: 'test',
  ports: { high: 'oil', low: 'oil', case: 'oil', shaft: 'shaft' },
  optionalPorts: ['case'],
  commands: { torqueRequest: { unit: 'N m', about: 'torque wanted', rest: 0 } },
  readings: { torque: { unit: 'N m', about: 'shaft torque' } },
  parameters: { displacement: { unit: 'm3', about: 'displacement per revolution' } },
  flows() {},
});

const sensor: InstrumentKind = {
  kind: 'sensor',
  about: 'sensor',
  source: 'test',
  stage: 'after',
  parameters: {
    least: { unit: 'input', about: 'lower end of the range' },
    most: { unit: 'input', about: 'upper end of the range' },
    lag: { unit: 's', about: 'lag', default: 0 },
  },
  inputs: { of: { unit: '1', about: 'what it senses', anyUnit: true } },
  outputs: { value: { unit: '1', about: 'sensed value', unitOf: 'of' } },
  memory: {},
  build: () => () => {},
};

const stage: InstrumentKind = {
  kind: 'stage',
  about: 'power stage',
  source: 'test',
  stage: 'before',
  parameters: {},
  inputs: { request: { unit: '1', about: 'request' } },
  outputs: { output: { unit: '1', about: 'output' } },
  memory: {},
  build: () => () => {},
};

const oil: FluidKind = {
  kind: 'oil',
  about: 'oil',
  source: 'test',
  parameters: {
    grade: { unit: '1', about: 'grade', choices: ['VG 32', 'VG 46'], default: 1 },
    air: { unit: '1', about: 'entrained air', default: 0.005, least: 0, most: 0.2 },
  },
  values: (parameter) => ({ air: parameter.air! }),
  examine: (parameter) =>
    parameter.air! > 0.1 ? [{ path: 'air', what: 'more foam than oil', remedy: 'bleed it' }] : [],
};

export const catalogue: Catalogue = {
  portKinds,
  elements: [volume, accumulator, shaft, joint, valve, relief, machine],
  instruments: [sensor, stage],
  fluids: [oil],
};
