import { branch } from './define.js';

/** A prescribed torque on a shaft: the parameter plus the command. */
export const torqueSource = branch({
  kind: 'torque-source',
  about: 'prescribed torque on a shaft',
  source: 'definition',
  ports: { shaft: 'shaft' },
  commands: { torque: { unit: 'N m', about: 'torque on the shaft, added to the constant one', rest: 0 } },
  readings: { power: { unit: 'W', about: 'power given to the shaft' } },
  parameters: { constantTorque: { unit: 'N m', about: 'constant part', default: 0 } },
  heat: 'leaves',
  flows({ parameter, command, shaft, reading }) {
    const torque = parameter.constantTorque + command.torque;
    shaft.torque += torque;
    reading.power = torque * shaft.speed;
  },
  supply({ parameter, command, shaft }) {
    return (parameter.constantTorque + command.torque) * shaft.speed;
  },
});
