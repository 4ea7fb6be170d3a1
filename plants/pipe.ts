import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';

/** Straight round pipe with friction and no inertia; see inertial-pipe for one whose oil column has mass. */
export const pipe = branch({
  kind: 'pipe',
  about: 'round pipe with laminar and turbulent friction, without inertia',
  source: 'Hagen and Poiseuille; Blasius; Darcy and Weisbach',
  valid: 'smooth pipe, Reynolds number below 1e5; the step from 2300 to 4000 is a convention',
  ports: { from: 'oil', to: 'oil' },
  readings: {
    massFlow: { unit: 'kg/s', about: 'mass flow' },
    flow: { unit: 'm3/s', about: 'volume flow at the density upstream' },
    reynolds: { unit: '1', about: 'Reynolds number' },
  },
  parameters: {
    length: { unit: 'm', about: 'length', least: 0.01, most: 100, usual: [0.2, 10] },
    diameter: { unit: 'm', about: 'inner diameter', least: 0.001, most: 0.2, usual: [0.006, 0.06] },
  },
  laws: flowLaws,
  flows({ parameter, from, to, reading, law }) {
    const difference = from.pressure - to.pressure;
    const massFlow = law.pipeMassFlow(
      difference,
      difference > 0 ? from.density : to.density,
      difference > 0 ? from.viscosity : to.viscosity,
      parameter.length,
      parameter.diameter,
    );
    const carried = law.heatCarried(massFlow, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const lost = massFlow * (from.potential - to.potential);
    from.massFlow -= massFlow;
    to.massFlow += massFlow;
    from.heatFlow += (massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (massFlow > 0 ? lost : 0) + carried;
    reading.massFlow = massFlow;
    reading.flow = massFlow / (massFlow > 0 ? from.density : to.density);
    reading.reynolds =
      (4 * massFlow) / (law.CIRCLE_RATIO * parameter.diameter * (massFlow > 0 ? from.viscosity : to.viscosity));
  },
  loss({ parameter, from, to, law }) {
    const difference = from.pressure - to.pressure;
    return (
      law.pipeMassFlow(
        difference,
        difference > 0 ? from.density : to.density,
        difference > 0 ? from.viscosity : to.viscosity,
        parameter.length,
        parameter.diameter,
      ) *
      (from.potential - to.potential)
    );
  },
});
