import type { PortKinds } from '../runtime/contract.js';

/**
 * The port kinds of the plant library. A store writes the efforts, branches add the flows, counted into the store.
 *
 * Oil carries its mechanical energy as pressure potential h = integral dp/rho and its thermal energy as heat flow, so
 * that the power through a port is massFlow * potential + heatFlow, exactly.
 */
export interface OilPort {
  /** absolute pressure, Pa */ pressure: number;
  /** K */ temperature: number;
  /** kg/m3 */ density: number;
  /** pressure potential integral dp/rho, J/kg */ potential: number;
  /** dynamic viscosity, Pa s */ viscosity: number;
  /** J/(kg K) */ heatCapacity: number;
  /** into the store, kg/s */ massFlow: number;
  /** thermal power into the store: heat carried by the oil and heat of losses, W */ heatFlow: number;
}
export interface GasPort {
  /** absolute pressure, Pa */ pressure: number;
  /** K */ temperature: number;
  /** specific gas constant, J/(kg K) */ gasConstant: number;
  /** cp/cv */ heatRatio: number;
  /** into the store, kg/s */ massFlow: number;
  /** enthalpy flow into the store (cp T massFlow of what flows, and heat), W */ enthalpyFlow: number;
}
export interface ShaftPort {
  /** rad/s */ speed: number;
  /** into the store, N m */ torque: number;
}
export interface RoadPort {
  /** m/s */ velocity: number;
  /** weight of the body normal to the road, N */ weight: number;
  /** load that pitching has moved from the front to the rear axle, N */ loadShift: number;
  /** on the body, N */ force: number;
}
export interface HeatPort {
  /** K */ temperature: number;
  /** into the store, W */ heatFlow: number;
}
export interface PortVariables {
  oil: OilPort;
  gas: GasPort;
  shaft: ShaftPort;
  road: RoadPort;
  heat: HeatPort;
}
export type PortKindName = keyof PortVariables;

export const portKinds = {
  oil: {
    about: 'oil under pressure',
    efforts: {
      pressure: { unit: 'Pa', about: 'absolute pressure' },
      temperature: { unit: 'K', about: 'temperature' },
      density: { unit: 'kg/m3', about: 'density' },
      potential: { unit: 'J/kg', about: 'pressure potential, integral dp/rho' },
      viscosity: { unit: 'Pa s', about: 'dynamic viscosity' },
      heatCapacity: { unit: 'J/(kg K)', about: 'specific heat capacity' },
    },
    flows: {
      massFlow: { unit: 'kg/s', about: 'mass flow into the store' },
      heatFlow: { unit: 'W', about: 'thermal power into the store' },
    },
    power: [['massFlow', 'potential'], ['heatFlow']],
  },
  gas: {
    about: 'gas',
    efforts: {
      pressure: { unit: 'Pa', about: 'absolute pressure' },
      temperature: { unit: 'K', about: 'temperature' },
      gasConstant: { unit: 'J/(kg K)', about: 'specific gas constant' },
      heatRatio: { unit: '1', about: 'ratio of specific heats' },
    },
    flows: {
      massFlow: { unit: 'kg/s', about: 'mass flow into the store' },
      enthalpyFlow: { unit: 'W', about: 'enthalpy flow into the store' },
    },
    power: [['enthalpyFlow']],
  },
  shaft: {
    about: 'rotating shaft',
    efforts: { speed: { unit: 'rad/s', about: 'angular speed' } },
    flows: { torque: { unit: 'N m', about: 'torque into the store' } },
    power: [['torque', 'speed']],
    scaled: { effort: 'speed', flow: 'torque' },
  },
  road: {
    about: 'contact of a wheel with the body over the road',
    efforts: {
      velocity: { unit: 'm/s', about: 'forward velocity' },
      weight: { unit: 'N', about: 'weight of the body normal to the road' },
      loadShift: { unit: 'N', about: 'load that pitching has moved from the front to the rear axle' },
    },
    flows: { force: { unit: 'N', about: 'forward force on the body' } },
    power: [['force', 'velocity']],
  },
  heat: {
    about: 'thermal contact',
    efforts: { temperature: { unit: 'K', about: 'temperature' } },
    flows: { heatFlow: { unit: 'W', about: 'heat flow into the store' } },
    power: [['heatFlow']],
  },
} as const satisfies PortKinds;
