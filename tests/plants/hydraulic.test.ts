import * as library from '../../plants/library.js';
import { element } from '../support/circuit.js';
import { bar, litre, litresPerMinute, oil, rpm } from '../support/oil.js';
import { checkOilCircuits, type OilCircuit } from './oil-circuit-suite.js';

const fluid = oil();
const line = (name: string, volume: number, pressure: number, temperature = 323.15) =>
  element(name, library.oilVolume, {
    fluid,
    parameters: { volume: volume * litre },
    start: { pressure: pressure * bar, temperature },
  });
const accumulator = (name: string, given: Record<string, number>, start: Record<string, number>) =>
  element(name, library.gasAccumulator, { fluid, parameters: { ambientTemperature: 293.15, ...given }, start });
const tank = (name = 'tank') =>
  element(name, library.tank, {
    fluid,
    parameters: { volume: 20 * litre, ambientPressure: 101325, ambientTemperature: 293.15 },
    start: { level: 0.6, temperature: 318 },
  });
const highAccumulator = (start: Record<string, number> = { pressure: 250 * bar }) =>
  accumulator('accumulator', { volume: 32 * litre, precharge: 140 * bar }, start);
const reservoir = () =>
  accumulator('reservoir', { volume: 40 * litre, precharge: 6 * bar, leastGasShare: 0.1 }, { pressure: 10 * bar });

/** Each fluid element on a small circuit of its own, with the commands that make it work hard. */
const circuits: Record<string, OilCircuit> = {
  'gas-accumulator, isolation-valve, oil-volume, orifice, tank': {
    elements: () => [
      highAccumulator(),
      line('line', 0.5, 200),
      tank(),
      element('valve', library.isolationValve, {
        parameters: { area: 2e-4, leak: 1e-9, deadTime: 0.005 },
        start: { position: 1 },
        to: { from: 'accumulator.oil', to: 'line.oil' },
      }),
      element('orifice', library.orifice, { parameters: { area: 1.5e-5 }, to: { from: 'line.oil', to: 'tank.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('valve.open', Math.floor(time / 0.1) % 2 === 0 ? 1 : 0.05);
      bench.set('valve.power', time > 0.55 && time < 0.65 ? 0 : 1);
      bench.set('valve.speedFactor', time > 0.8 ? 0.3 : 1);
      bench.set('accumulator.gasLeak', time > 0.7 ? 0.05 : 0);
      bench.set('line.leakArea', time > 0.4 ? 3e-6 : 0);
    },
  },
  'gas-accumulator with reference nitrogen and foam': {
    elements: () => [
      accumulator(
        'accumulator',
        { volume: 10 * litre, precharge: 150 * bar, gas: 2, foamHeatCapacity: 500 },
        { charge: 0.3 },
      ),
      line('line', 0.5, 200),
      tank(),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
      element('neck', library.orifice, { parameters: { area: 1e-4 }, to: { from: 'line.oil', to: 'accumulator.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('pump.flowRequest', 150 * litresPerMinute * Math.sin(7 * time));
      bench.set('accumulator.gasLeak', time > 0.7 ? 0.02 : 0);
    },
  },
  'relief-valve, check-valve, flow-source': {
    elements: () => [
      line('line', 0.5, 30),
      line('other', 0.3, 12, 330),
      tank(),
      element('pump', library.flowSource, { to: { from: 'tank.oil', to: 'line.oil' } }),
      element('relief', library.reliefValve, {
        parameters: { cracking: 200 * bar, fullFlow: 220 * bar, fullFlowRate: 60 * litresPerMinute },
        to: { from: 'line.oil', to: 'tank.oil' },
      }),
      element('check', library.checkValve, { parameters: { area: 2e-5 }, to: { from: 'other.oil', to: 'line.oil' } }),
      element('bleed', library.checkValve, { parameters: { area: 1e-6 }, to: { from: 'line.oil', to: 'other.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('pump.flowRequest', 40 * litresPerMinute * Math.sin(9 * time));
      bench.set('check.leakArea', time > 0.6 ? 1e-8 : 0);
      bench.set('relief.settingFactor', time > 0.5 ? 0.9 : 1);
    },
  },
  'pipe, inertial-pipe, pressure-source, oil-cooler, heat-conductance': {
    elements: () => [
      element('supply', library.pressureSource, { fluid, parameters: { pressure: 60 * bar, temperature: 340 } }),
      line('a', 1, 55),
      line('b', 1, 50, 310),
      element('return', library.pressureSource, { fluid, parameters: { pressure: 3 * bar } }),
      element('inlet', library.pipe, {
        parameters: { length: 2, diameter: 0.012 },
        to: { from: 'supply.oil', to: 'a.oil' },
      }),
      element('column', library.inertialPipe, {
        fluid,
        parameters: { length: 3, diameter: 0.016 },
        to: { from: 'a.oil', to: 'b.oil' },
      }),
      element('outlet', library.pipe, {
        parameters: { length: 4, diameter: 0.01 },
        to: { from: 'b.oil', to: 'return.oil' },
      }),
      element('cooler', library.oilCooler, {
        parameters: { conductance: 400, ambientTemperature: 293.15 },
        to: { oil: 'b.wall' },
      }),
      element('wall', library.heatConductance, { parameters: { conductance: 50 }, to: { a: 'a.wall', b: 'b.wall' } }),
    ],
    drive: (bench, time) => {
      bench.set('supply.pressureChange', 50 * bar * Math.sin(20 * time));
      bench.set('cooler.fan', time > 0.4 ? 1 : 0.2);
    },
  },
  'pump-motor between accumulators, charge-pump': {
    elements: () => [
      highAccumulator({ charge: 0.45 }),
      reservoir(),
      line('high', 0.4, 200),
      line('low', 0.8, 10),
      line('housing', 0.5, 1.5),
      tank(),
      element('shaft', library.inertia, { parameters: { inertia: 3 }, start: { speed: 150 } }),
      element('neck', library.orifice, { parameters: { area: 3e-4 }, to: { from: 'accumulator.oil', to: 'high.oil' } }),
      element('lowNeck', library.orifice, { parameters: { area: 6e-4 }, to: { from: 'reservoir.oil', to: 'low.oil' } }),
      element('unit', library.pumpMotor, {
        parameters: { displacement: 110e-6, maximumSpeed: 3000 * rpm },
        to: { high: 'high.oil', low: 'low.oil', caseDrain: 'housing.oil', shaft: 'shaft.shaft' },
      }),
      element('drain', library.orifice, { parameters: { area: 3e-5 }, to: { from: 'housing.oil', to: 'tank.oil' } }),
      element('charge', library.chargePump, {
        parameters: { displacement: 12e-6, cracking: 15 * bar, fullFlow: 18 * bar, fullFlowRate: 30 * litresPerMinute },
        to: { inlet: 'tank.oil', outlet: 'low.oil', shaft: 'shaft.shaft' },
      }),
    ],
    drive: (bench, time) => {
      bench.set('unit.torqueRequest', 300 * Math.sin(12 * time));
      bench.set('unit.wear', time > 0.5 ? 3 : 1);
      bench.set('unit.enable', time > 0.8 ? 0 : 1);
      bench.set('unit.runawayTo', time > 0.6 && time < 0.75 ? -0.6 : -2);
      bench.set('low.leakArea', time > 0.3 ? 5e-6 : 0);
    },
  },
  'electric-charge-pump': {
    elements: () => [
      line('low', 0.8, 2),
      tank(),
      element('charge', library.electricChargePump, {
        parameters: { displacement: 8e-6, cracking: 12 * bar, fullFlow: 14 * bar, fullFlowRate: 20 * litresPerMinute },
        to: { inlet: 'tank.oil', outlet: 'low.oil' },
      }),
      element('leak', library.orifice, { parameters: { area: 1e-6 }, to: { from: 'low.oil', to: 'tank.oil' } }),
    ],
    drive: (bench, time) => {
      bench.set('charge.speedRequest', 250);
      bench.set('charge.power', time > 0.7 ? 0 : 1);
    },
  },
};

checkOilCircuits(circuits);
