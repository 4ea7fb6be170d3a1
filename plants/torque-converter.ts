import { branch } from './define.js';
import * as converterLaws from './laws/converter.js';

/**
 * Hydrodynamic torque converter between an engine's shaft (pump) and a gearbox's (turbine). The pump takes
 * K w_p (w_p - w_t), which is K w_p^2 at stall; the turbine gets more than that by a ratio that falls in a straight line
 * from `stallRatio` at stall to 1 at the coupling point. Turned by the turbine it drags the engine as a fluid coupling.
 * A lock-up clutch is an element of its own beside it.
 */
export const torqueConverter = branch({
  kind: 'torque-converter',
  about: 'hydrodynamic torque converter',
  source: 'characteristic as straight lines over the speed ratio (Foettinger); common practice, no source',
  valid: 'steady characteristic; the inertia of its oil is part of the shafts',
  ports: { pump: 'shaft', turbine: 'shaft' },
  states: { slipEnergy: { unit: 'J', about: 'heat so far', scale: 1e5 } },
  readings: {
    pumpTorque: { unit: 'N m', about: 'torque that the pump takes' },
    turbineTorque: { unit: 'N m', about: 'torque that the turbine gives' },
    speedRatio: { unit: '1', about: 'turbine speed over pump speed' },
    heat: { unit: 'W', about: 'power turned into heat', least: 0 },
  },
  parameters: {
    capacity: {
      unit: 'N m s2',
      about: 'torque of the pump at stall over its speed squared',
      least: 1e-5,
      most: 1,
      usual: [2e-3, 3e-2],
    },
    stallRatio: { unit: '1', about: 'torque ratio at stall', default: 2, least: 1, most: 4, usual: [1.6, 2.8] },
    couplingPoint: {
      unit: '1',
      about: 'speed ratio from which the torque ratio is 1',
      default: 0.86,
      least: 0.5,
      most: 0.99,
      usual: [0.8, 0.92],
    },
  },
  laws: converterLaws,
  heat: 'leaves',
  flows({ parameter, pump, turbine, derivative, reading, law }) {
    const taken = law.converterPumpTorque(pump.speed, turbine.speed, parameter.capacity);
    const given = taken * law.converterRatio(pump.speed, turbine.speed, parameter.stallRatio, parameter.couplingPoint);
    const heat = law.converterLoss(
      pump.speed,
      turbine.speed,
      parameter.capacity,
      parameter.stallRatio,
      parameter.couplingPoint,
    );
    pump.torque -= taken;
    turbine.torque += given;
    derivative.slipEnergy = heat;
    reading.pumpTorque = taken;
    reading.turbineTorque = given;
    reading.speedRatio = law.converterSpeedRatio(pump.speed, turbine.speed);
    reading.heat = heat;
  },
  loss({ parameter, pump, turbine, law }) {
    return law.converterLoss(
      pump.speed,
      turbine.speed,
      parameter.capacity,
      parameter.stallRatio,
      parameter.couplingPoint,
    );
  },
  examine: ({ parameter }) => {
    const { stallRatio, couplingPoint } = parameter as { stallRatio: number; couplingPoint: number };
    // efficiency r (s - (s - 1) r / c) has its greatest value at r = s c / (2 (s - 1))
    const best = stallRatio > 1 ? Math.min(couplingPoint, (stallRatio * couplingPoint) / (2 * (stallRatio - 1))) : 0;
    return best * (stallRatio - ((stallRatio - 1) * best) / couplingPoint) <= 1
      ? []
      : [
          {
            parameter: 'stallRatio',
            what: 'the straight line from stall to the coupling point goes over an efficiency of 1',
            remedy: 'lower stallRatio or couplingPoint',
          },
        ];
  },
});
