import { branch } from './define.js';
import * as flowLaws from './laws/flow.js';

/**
 * Round pipe with friction whose oil column has mass: (L/A) m' = rho (h_from - h_to) - dp_friction. The column is
 * driven by the difference of pressure potentials, which keeps the energy exact. A column that draws from a store that has
 * run empty parts: it passes the share that is left there. What brakes it meanwhile beyond that
 * share is lost. With a volume V at one end it swings
 * at sqrt(K A / (rho L V))/(2 pi) Hz; keep it only where that is below 0.4/(2 pi substep), 255 Hz at 0.25 ms.
 */
export const inertialPipe = branch({
  kind: 'inertial-pipe',
  about: 'round pipe with friction and the inertia of its oil column',
  source: 'Merritt, Hydraulic Control Systems, 1967; Darcy and Weisbach; Blasius',
  valid: 'one lump: length well below a tenth of the wave length; smooth pipe, Reynolds number below 1e5',
  ports: { from: 'oil', to: 'oil' },
  fluid: true,
  states: { massFlow: { unit: 'kg/s', about: 'mass flow from `from` to `to`', scale: 1 } },
  readings: {
    flow: { unit: 'm3/s', about: 'volume flow at the reference density' },
    friction: { unit: 'Pa', about: 'pressure loss' },
  },
  parameters: {
    length: { unit: 'm', about: 'length', least: 0.05, most: 100, usual: [0.2, 10] },
    diameter: { unit: 'm', about: 'inner diameter', least: 0.002, most: 0.2, usual: [0.006, 0.06] },
  },
  starts: { massFlow: { unit: 'kg/s', about: 'mass flow', default: 0 } },
  laws: flowLaws,
  flows({ parameter, fluid, from, to, state, derivative, reading, law }) {
    const area = 0.25 * law.CIRCLE_RATIO * parameter.diameter * parameter.diameter;
    const friction = law.pipeLoss(
      state.massFlow,
      fluid.referenceDensity,
      state.massFlow > 0 ? from.viscosity : to.viscosity,
      parameter.length,
      parameter.diameter,
    );
    const share = law.columnShare(
      from.density / fluid.referenceDensity,
      to.density / fluid.referenceDensity,
      state.massFlow / (fluid.referenceDensity * area),
    );
    const passed = share * state.massFlow;
    const carried = law.heatCarried(passed, from.heatCapacity * from.temperature, to.heatCapacity * to.temperature);
    const fall = from.potential - to.potential;
    const acting = state.massFlow * fall < 0 ? 1 : share;
    const lost = (state.massFlow * friction) / fluid.referenceDensity + (share - acting) * state.massFlow * fall;
    derivative.massFlow = (area / parameter.length) * (fluid.referenceDensity * acting * fall - friction);
    from.massFlow -= passed;
    to.massFlow += passed;
    from.heatFlow += (state.massFlow > 0 ? 0 : lost) - carried;
    to.heatFlow += (state.massFlow > 0 ? lost : 0) + carried;
    reading.flow = passed / fluid.referenceDensity;
    reading.friction = friction;
  },
  energy({ parameter, fluid, state, law }) {
    const area = 0.25 * law.CIRCLE_RATIO * parameter.diameter * parameter.diameter;
    return (0.5 * state.massFlow * state.massFlow * parameter.length) / (fluid.referenceDensity * area);
  },
  loss({ parameter, fluid, from, to, state, law }) {
    const area = 0.25 * law.CIRCLE_RATIO * parameter.diameter * parameter.diameter;
    const friction = law.pipeLoss(
      state.massFlow,
      fluid.referenceDensity,
      state.massFlow > 0 ? from.viscosity : to.viscosity,
      parameter.length,
      parameter.diameter,
    );
    const share = law.columnShare(
      from.density / fluid.referenceDensity,
      to.density / fluid.referenceDensity,
      state.massFlow / (fluid.referenceDensity * area),
    );
    const fall = from.potential - to.potential;
    const acting = state.massFlow * fall < 0 ? 1 : share;
    return (state.massFlow * friction) / fluid.referenceDensity + (share - acting) * state.massFlow * fall;
  },
  initial: ({ start }) => ({ massFlow: start.massFlow! }),
});
