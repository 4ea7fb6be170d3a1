import { store } from './define.js';

/** A body moving over the road at a prescribed velocity and weight: a tyre test stand. */
export const velocitySource = store({
  kind: 'velocity-source',
  about: 'body at a prescribed velocity over the road',
  source: 'definition',
  ports: { road: 'road' },
  commands: { velocity: { unit: 'm/s', about: 'velocity, added to the constant one', rest: 0 } },
  readings: {
    actualVelocity: { unit: 'm/s', about: 'velocity of the body' },
    force: { unit: 'N', about: 'force that the circuit puts on it' },
  },
  parameters: {
    constantVelocity: { unit: 'm/s', about: 'constant part', default: 0 },
    weight: { unit: 'N', about: 'weight on the road', default: 10000, least: 0 },
  },
  heat: 'leaves',
  efforts({ parameter, command, road, reading }) {
    road.velocity = parameter.constantVelocity + command.velocity;
    road.weight = parameter.weight;
    road.loadShift = 0;
    reading.actualVelocity = parameter.constantVelocity + command.velocity;
  },
  derivatives({ road, reading }) {
    reading.force = road.force;
  },
  energy() {
    return 0;
  },
  supply({ parameter, command, road }) {
    return -road.force * (parameter.constantVelocity + command.velocity);
  },
});
