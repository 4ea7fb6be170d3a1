import { branch } from './define.js';

/** Air-blown cooler at the thermal contact of an oil store; its heat leaves to the surroundings. */
export const oilCooler = branch({
  kind: 'oil-cooler',
  about: 'air-blown oil cooler with a fan',
  source: "Newton's law of cooling",
  ports: { oil: 'heat' },
  commands: { fan: { unit: '1', about: 'fan speed as a share', rest: 0, least: 0, most: 1 } },
  readings: { heatFlow: { unit: 'W', about: 'heat given to the air' } },
  parameters: {
    conductance: {
      unit: 'W/K',
      about: 'conductance with the fan at full speed',
      least: 0,
      most: 1e5,
      usual: [50, 1000],
    },
    stillShare: { unit: '1', about: 'share of it with the fan at rest', default: 0.1, least: 0, most: 1 },
    ambientTemperature: { unit: 'K', about: 'temperature of the air', least: 220, most: 340 },
  },
  flows({ parameter, oil, command, reading }) {
    const conductance = parameter.conductance * (parameter.stillShare + (1 - parameter.stillShare) * command.fan);
    const heatFlow = conductance * (oil.temperature - parameter.ambientTemperature);
    oil.heatFlow -= heatFlow;
    reading.heatFlow = heatFlow;
  },
  supply({ parameter, oil, command }) {
    const conductance = parameter.conductance * (parameter.stillShare + (1 - parameter.stillShare) * command.fan);
    return -conductance * (oil.temperature - parameter.ambientTemperature);
  },
});
