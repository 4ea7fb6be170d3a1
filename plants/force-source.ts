import { branch } from './define.js';

/** A prescribed force on a body over the road: a tow, a dynamometer, a tailwind. */
export const forceSource = branch({
  kind: 'force-source',
  about: 'prescribed force on a body over the road',
  source: 'definition',
  ports: { road: 'road' },
  commands: { force: { unit: 'N', about: 'forward force, added to the constant one', rest: 0 } },
  readings: { power: { unit: 'W', about: 'power given to the body' } },
  parameters: { constantForce: { unit: 'N', about: 'constant part', default: 0 } },
  heat: 'leaves',
  flows({ parameter, command, road, reading }) {
    const force = parameter.constantForce + command.force;
    road.force += force;
    reading.power = force * road.velocity;
  },
  supply({ parameter, command, road }) {
    return (parameter.constantForce + command.force) * road.velocity;
  },
});
