import { accumulatorPressure, gasPressure } from './laws/gas.js';

/** Start values of an accumulator, by plain bisection of the laws that the element uses. */

type Numbers = Readonly<Record<string, number>>;

/** Oil volume below which the poppet closes, m3. */
export function poppetWidth(parameter: Numbers): number {
  return parameter.closingShare! * parameter.volume!;
}

/** Gas mass, kg, that gives the precharge at its temperature with no oil. */
export function prechargeMass(parameter: Numbers): number {
  const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
  const density = bisect(
    1e-3,
    900,
    (at) => gasPressure(at, parameter.prechargeTemperature!, real) - parameter.precharge!,
  );
  return density * parameter.volume!;
}

/** Oil volume, m3, and pressure, Pa, at rest: by `start.pressure`, else by `start.charge`, never below 0.3 bar. */
export function restOilVolume(
  parameter: Numbers,
  gasMass: number,
  temperature: number,
  start: Numbers,
): readonly [number, number] {
  const volume = parameter.volume!;
  const end = (1 - parameter.leastGasShare!) * volume;
  const pressureAt = (oilVolume: number) =>
    accumulatorPressure(
      oilVolume,
      temperature,
      gasMass,
      parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2,
      volume,
      poppetWidth(parameter),
      end,
      parameter.stopPressure!,
    );
  const byPressure = (pressure: number) => bisect(0, 0.99 * volume, (at) => pressureAt(at) - pressure);
  const least = start.pressure! > 0 ? 0 : byPressure(0.3e5);
  const oilVolume = start.pressure! > 0 ? byPressure(start.pressure!) : Math.max(start.charge! * end, least);
  return [oilVolume, pressureAt(oilVolume)];
}

/** Root of a rising function between two bounds. */
function bisect(low: number, high: number, f: (x: number) => number): number {
  let a = low;
  let b = high;
  for (let i = 0; i < 200 && b - a > 0; i += 1) {
    const middle = 0.5 * (a + b);
    if (middle === a || middle === b) break;
    if (f(middle) < 0) a = middle;
    else b = middle;
  }
  return 0.5 * (a + b);
}
