import { store } from './define.js';

/** A shaft at a prescribed speed, whatever torque it takes: the parameter plus the command. */
export const speedSource = store({
  kind: 'speed-source',
  about: 'shaft at a prescribed speed',
  source: 'definition',
  ports: { shaft: 'shaft' },
  commands: { speed: { unit: 'rad/s', about: 'speed, added to the constant one', rest: 0 } },
  readings: {
    actualSpeed: { unit: 'rad/s', about: 'speed of the shaft' },
    torque: { unit: 'N m', about: 'torque that the circuit puts on it' },
  },
  parameters: { constantSpeed: { unit: 'rad/s', about: 'constant part', default: 0 } },
  heat: 'leaves',
  efforts({ parameter, command, shaft, reading }) {
    shaft.speed = parameter.constantSpeed + command.speed;
    reading.actualSpeed = parameter.constantSpeed + command.speed;
  },
  derivatives({ shaft, reading }) {
    reading.torque = shaft.torque;
  },
  energy() {
    return 0;
  },
  supply({ parameter, command, shaft }) {
    return -shaft.torque * (parameter.constantSpeed + command.speed);
  },
});
