import { branch } from './define.js';
import * as frictionLaws from './laws/friction.js';

/**
 * Stepped gearbox with reverse, neutral and up to six gears between two shafts.
 *
 * The gear that is engaged is a bristle between the input and the output times the ratio. A request for another gear
 * first lets go (the capacity runs down), waits `shiftTime` in neutral, takes the new ratio, synchronises with
 * `synchroniserTorque`, grows firm as the slip comes to rest and locks with `lockTorque`. The ratio changes only while nothing is transmitted. A gear
 * with ratio 0 is not there: a request for it means neutral.
 *
 * Losses are additive: drag on the input, and `meshLoss` of the transmitted torque against the output's motion.
 *
 * Fast mode: locked bristles against the inertias of both shafts. With bristleAngle at the output the stiffness at the
 * input is k = lockTorque / (bristleAngle |ratio|), the reduced inertia J = 1 / (1/Jin + ratio^2/Jout), w = sqrt(k/J):
 * 2500 N m, 0.05 rad, ratio 6.2, 0.1 and 0.15 kg m2 give 1460 rad/s; substeps of 0.25 ms resolve up to 1600 rad/s.
 */
export const steppedGearbox = branch({
  kind: 'stepped-gearbox',
  about: 'gearbox with reverse, neutral and up to six gears, changed through neutral',
  source: 'additive gear losses and synchronising: common practice, no source',
  ports: { input: 'shaft', output: 'shaft' },
  states: {
    capacity: { unit: 'N m', about: 'torque at the input that the engaged gear can take', scale: 1000 },
    deflection: { unit: '1', about: 'bristle deflection of the engaged gear', scale: 1 },
  },
  memory: {
    gear: { unit: '1', about: 'engaged gear: -1 reverse, 0 neutral, 1 to 6' },
    ratio: { unit: '1', about: 'ratio of the gear engaged last', initial: 1 },
    neutralTime: { unit: 's', about: 'time since the last gear was let go', initial: 10, gradual: true },
    locked: { unit: '1', about: '1 when the gear is synchronised and locked' },
  },
  commands: {
    gearRequest: { unit: '1', about: 'wanted gear: -1 reverse, 0 neutral, 1 to 6', rest: 0, least: -1, most: 6 },
    jammed: { unit: '1', about: '1: the gear stays as it is', rest: 0, least: 0, most: 1, fault: true },
  },
  readings: {
    inputTorque: { unit: 'N m', about: 'torque taken from the input shaft' },
    outputTorque: { unit: 'N m', about: 'torque given to the output shaft' },
    slip: { unit: 'rad/s', about: 'speed of the input less ratio times output' },
    speedMagnitude: { unit: 'rad/s', about: 'speed of the input without its sign', least: 0 },
    shifting: { unit: '1', about: '1 while the wanted gear is not locked', least: 0, most: 1 },
  },
  parameters: {
    ratio1: { unit: '1', about: 'ratio of the first gear, input over output speed', least: 0, usual: [2, 10] },
    ratio2: { unit: '1', about: 'second gear; 0: not there', default: 0, least: 0 },
    ratio3: { unit: '1', about: 'third gear', default: 0, least: 0 },
    ratio4: { unit: '1', about: 'fourth gear', default: 0, least: 0 },
    ratio5: { unit: '1', about: 'fifth gear', default: 0, least: 0 },
    ratio6: { unit: '1', about: 'sixth gear', default: 0, least: 0 },
    reverseRatio: { unit: '1', about: 'reverse, given positive', default: 0, least: 0 },
    shiftTime: { unit: 's', about: 'time in neutral between gears', default: 0.3, least: 0.01, usual: [0.1, 1] },
    engagementTime: { unit: 's', about: 'lag with which a gear takes hold and lets go', default: 0.015, least: 0.003 },
    synchroniserTorque: { unit: 'N m', about: 'torque of synchronising at the input', default: 150, least: 1 },
    synchronousSpeed: { unit: 'rad/s', about: 'slip within which the gear grows firm', default: 4, least: 0.1 },
    lockTorque: { unit: 'N m', about: 'torque that a locked gear takes at the input', default: 2500, least: 10 },
    bristleAngle: {
      unit: 'rad',
      about: 'wind-up of a locked gear at lockTorque, at the output',
      default: 0.05,
      least: 0.002,
      most: 0.2,
    },
    bristleDamping: { unit: 's/rad', about: 'damping of sticking, at the output', default: 0.03, least: 0, most: 1 },
    maximumSpeed: { unit: 'rad/s', about: 'highest speed of the input; 0: not watched', default: 0, least: 0 },
    dragTorque: { unit: 'N m', about: 'drag of bearings and oil at the input', default: 2, least: 0, usual: [0, 20] },
    meshLoss: { unit: '1', about: 'share of the transmitted torque that is lost', default: 0.02, least: 0, most: 0.3 },
  },
  starts: { gear: { unit: '1', about: 'engaged gear', default: 0, least: -1, most: 6 } },
  laws: frictionLaws,
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'gears and synchronisers turn faster than they are built for, as after a wrong shift down',
    },
  ],
  update({ parameter, memory, state, command, step }) {
    const wanted = Math.floor(command.gearRequest + 0.5);
    const wantedRatio =
      wanted === 1
        ? parameter.ratio1
        : wanted === 2
          ? parameter.ratio2
          : wanted === 3
            ? parameter.ratio3
            : wanted === 4
              ? parameter.ratio4
              : wanted === 5
                ? parameter.ratio5
                : wanted === 6
                  ? parameter.ratio6
                  : wanted === -1
                    ? -parameter.reverseRatio
                    : 0;
    const free = command.jammed < 0.5;
    const target = wantedRatio === 0 ? 0 : wanted;
    const idle = memory.gear === 0 ? Math.min(memory.neutralTime + step, 10) : 0;
    const takes =
      free && memory.gear === 0 && target !== 0 && idle + 1e-9 >= parameter.shiftTime && state.capacity < 0.01;
    const leaves = free && memory.gear !== 0 && memory.gear !== target;
    // the lock falls in when the torque has settled: what it changes then is next to nothing
    const synchronised = memory.locked > 0.5 || state.capacity > 0.98 * parameter.lockTorque;
    const holds = memory.gear !== 0 && !leaves && synchronised;
    memory.gear = takes ? target : leaves ? 0 : memory.gear;
    memory.ratio = takes ? wantedRatio : memory.ratio;
    memory.neutralTime = idle;
    memory.locked = holds ? 1 : 0;
  },
  flows({ parameter, input, output, state, memory, command, derivative, reading, law }) {
    const slip = input.speed - memory.ratio * output.speed;
    const torque = law.bristleTorque(
      state.capacity,
      slip,
      state.deflection,
      1,
      parameter.bristleDamping / Math.abs(memory.ratio),
    );
    const drag = law.slidingTorque(parameter.dragTorque, input.speed, 1);
    const mesh = law.slidingTorque(parameter.meshLoss * Math.abs(memory.ratio * torque), output.speed, 0.5);
    const goal =
      memory.gear === 0
        ? 0
        : memory.locked > 0.5
          ? parameter.lockTorque
          : law.settlingTorque(slip, parameter.synchronousSpeed, parameter.synchroniserTorque, parameter.lockTorque);
    input.torque -= torque + drag;
    output.torque += memory.ratio * torque - mesh;
    derivative.capacity = (goal - state.capacity) / parameter.engagementTime;
    derivative.deflection = law.bristleRate(slip, state.deflection, 1, parameter.bristleAngle * Math.abs(memory.ratio));
    reading.inputTorque = torque + drag;
    reading.outputTorque = memory.ratio * torque - mesh;
    reading.slip = slip;
    reading.speedMagnitude = Math.abs(input.speed);
    reading.shifting =
      memory.gear === Math.floor(command.gearRequest + 0.5) && (memory.gear === 0 || memory.locked > 0.5) ? 0 : 1;
  },
  energy({ parameter, state, memory, law }) {
    return law.bristleEnergy(state.capacity, state.deflection, parameter.bristleAngle * Math.abs(memory.ratio));
  },
  supply({ parameter, input, output, state, memory, law }) {
    const slip = input.speed - memory.ratio * output.speed;
    const goal =
      memory.gear === 0
        ? 0
        : memory.locked > 0.5
          ? parameter.lockTorque
          : law.settlingTorque(slip, parameter.synchronousSpeed, parameter.synchroniserTorque, parameter.lockTorque);
    const rate = (goal - state.capacity) / parameter.engagementTime;
    return law.bristleEnergy(Math.max(rate, 0), state.deflection, parameter.bristleAngle * Math.abs(memory.ratio));
  },
  loss({ parameter, input, output, state, memory, law }) {
    const slip = input.speed - memory.ratio * output.speed;
    const torque = law.bristleTorque(
      state.capacity,
      slip,
      state.deflection,
      1,
      parameter.bristleDamping / Math.abs(memory.ratio),
    );
    const goal =
      memory.gear === 0
        ? 0
        : memory.locked > 0.5
          ? parameter.lockTorque
          : law.settlingTorque(slip, parameter.synchronousSpeed, parameter.synchroniserTorque, parameter.lockTorque);
    const rate = (goal - state.capacity) / parameter.engagementTime;
    return (
      law.bristleLoss(state.capacity, slip, state.deflection, 1, parameter.bristleDamping / Math.abs(memory.ratio)) +
      law.bristleEnergy(Math.max(-rate, 0), state.deflection, parameter.bristleAngle * Math.abs(memory.ratio)) +
      law.slidingTorque(parameter.dragTorque, input.speed, 1) * input.speed +
      law.slidingTorque(parameter.meshLoss * Math.abs(memory.ratio * torque), output.speed, 0.5) * output.speed
    );
  },
  initial: ({ parameter, start }) => {
    const gear = Math.round(start.gear!);
    const ratio = gear === 0 ? 1 : gear < 0 ? -parameter.reverseRatio! : parameter[`ratio${gear}`]!;
    return gear === 0 || ratio === 0
      ? { gear: 0, ratio: 1, locked: 0, capacity: 0 }
      : { gear, ratio, neutralTime: 0, locked: 1, capacity: parameter.lockTorque! };
  },
});
