import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';
import { dischargeCoefficient, smoothing } from './shared-parameters.js';

/** A fixed orifice; what it dissipates heats the oil that leaves it. */
export const orifice = branch({
  kind: 'orifice',
  about: 'turbulent orifice, smooth around zero',
  source: 'Merritt, Hydraulic Control Systems, 1967',
  ports: { from: 'oil', to: 'oil' },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
  },
  parameters: {
    area: { unit: 'm2', about: 'area of the bore', least: 1e-9, most: 0.01, usual: [1e-7, 1e-3] },
    dischargeCoefficient,
    smoothing,
  },
  commands: {
    blocked: { unit: '1', about: 'share of the bore that is clogged', rest: 0, least: 0, most: 0.9999, fault: true },
  },
  laws: flowLaws,
  flows({ parameter, command, from, to, reading, law }) {
    const massFlow = law.orificeMassFlow(
      from.pressure,
      to.pressure,
      from.density,
      to.density,
      parameter.dischargeCoefficient * parameter.area * (1 - command.blocked),
      parameter.smoothing,
    );
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const lost = massFlow * (from.potential - to.potential);
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow += (massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (massFlow > 0 ? lost : 0) + carried;
    reading.massFlow = massFlow;
    reading.flow = massFlow / (massFlow > 0 ? from.density : to.density);
  },
  loss({ parameter, command, from, to, law }) {
    return (
      law.orificeMassFlow(
        from.pressure,
        to.pressure,
        from.density,
        to.density,
        parameter.dischargeCoefficient * parameter.area * (1 - command.blocked),
        parameter.smoothing,
      ) *
      (from.potential - to.potential)
    );
  },
});
