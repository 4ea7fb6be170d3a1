import type { BenchSpec } from '../../configs/bench-spec.js';
import { prechargeMass } from '../../plants/gas-accumulator-start.js';
import { gasHeatCapacity, gasPressureByTemperature } from '../../plants/laws/gas.js';

/**
 * Flow into an accumulator, m3/s, at which the short form of its gas temperature has no solution: m c_v/(tau dp/dT), for
 * an ideal gas V/((kappa - 1) tau), at the least gas volume and the temperature of the surroundings.
 */
export function singularFlow(parameter: Readonly<Record<string, number>>): number {
  const real = parameter.gas === 1 ? 0 : parameter.gas === 0 ? 1 : 2;
  const mass = prechargeMass(parameter);
  const density = mass / (parameter.leastGasShare! * parameter.volume!);
  const temperature = parameter.ambientTemperature!;
  const capacity = mass * gasHeatCapacity(density, temperature, real);
  const time = parameter.heatTransfer === 1 ? capacity / parameter.gasConductance! : parameter.timeConstant!;
  return capacity / (time * gasPressureByTemperature(density, temperature, real));
}

/** Why a bench must not use the short form: its units can deliver the singular flow. Empty when they cannot. */
export function shortFormFaults(spec: Pick<BenchSpec, 'circuit'>): string[] {
  const { elements } = spec.circuit;
  // what displaces oil, at its greatest speed; without one given, there is no bound
  const units = elements
    .filter((element) => ['pump-motor', 'charge-pump', 'electric-charge-pump'].includes(element.kind.kind))
    .map(({ parameters }) =>
      parameters.maximumSpeed! > 0
        ? (parameters.displacement! * parameters.maximumSpeed!) / (2 * Math.PI)
        : Number.POSITIVE_INFINITY,
    );
  const sources = elements
    .filter((element) => element.kind.kind === 'flow-source')
    .map((element) => element.kind.commands.flowRequest!.most ?? Number.POSITIVE_INFINITY);
  const delivered = [...units, ...sources].reduce((sum, flow) => sum + flow, 0);
  const litres = (flow: number) => (Number.isFinite(flow) ? `${(flow * 60_000).toPrecision(4)} L/min` : 'any flow');
  return elements
    .filter((element) => element.kind.kind === 'gas-accumulator' && element.parameters.gasTemperatureForm === 1)
    .flatMap((element) => {
      const singular = singularFlow(element.parameters);
      return delivered < singular
        ? []
        : [
            `${element.name}: the short form of its gas temperature has no solution from ${litres(singular)} into it, and what pumps here can deliver ${litres(delivered)}: set gasTemperatureForm: state`,
          ];
    });
}
