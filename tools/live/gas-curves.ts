import type { AccumulatorFacts } from '../../bridge/live/source.js';
import { prechargeMass } from '../../plants/gas-accumulator-start.js';
import { gasHeatCapacity, gasPressure, gasPressureByTemperature } from '../../plants/laws/gas.js';

const points = 60;
/** Runge-Kutta steps between two points. */
const stepsBetween = 4;

/**
 * Isotherm and adiabat of an accumulator's own gas law from its precharge, down to the least gas volume. The adiabat
 * follows (dT/drho) at constant entropy = T (dp/dT) / (rho^2 c_v).
 */
export function gasCurves(parameter: Readonly<Record<string, number>>): NonNullable<AccumulatorFacts['curves']> {
  const { volume = 0, leastGasShare = 0.25, prechargeTemperature = 293.15 } = parameter;
  const real = parameter['gas'] === 0 ? 1 : 0;
  const mass = prechargeMass(parameter);
  const least = Math.max(0.15, 0.85 * leastGasShare);
  const volumes = Array.from({ length: points + 1 }, (_, i) => volume * (1 - (i / points) * (1 - least)));
  const temperatures = [prechargeTemperature];
  for (let i = 1; i < volumes.length; i += 1)
    temperatures.push(compress(temperatures[i - 1]!, mass / volumes[i - 1]!, mass / volumes[i]!, real));
  return [
    {
      name: 'isotherm',
      volume: volumes,
      pressure: volumes.map((at) => gasPressure(mass / at, prechargeTemperature, real)),
    },
    {
      name: 'adiabat',
      volume: volumes,
      pressure: volumes.map((at, i) => gasPressure(mass / at, temperatures[i]!, real)),
    },
  ];
}

/** Temperature after compression without heat from one density to another, kg/m3; classical Runge-Kutta. */
function compress(temperature: number, from: number, to: number, real: number): number {
  const slope = (density: number, at: number) =>
    (at * gasPressureByTemperature(density, at, real)) / (density * density * gasHeatCapacity(density, at, real));
  const h = (to - from) / stepsBetween;
  let t = temperature;
  for (let i = 0; i < stepsBetween; i += 1) {
    const density = from + i * h;
    const a = slope(density, t);
    const b = slope(density + h / 2, t + (h / 2) * a);
    const c = slope(density + h / 2, t + (h / 2) * b);
    const d = slope(density + h, t + h * c);
    t += (h / 6) * (a + 2 * b + 2 * c + d);
  }
  return t;
}
