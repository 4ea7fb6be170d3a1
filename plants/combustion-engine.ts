import { branch } from './define.js';
import * as engineLaws from './laws/engine.js';
import * as frictionLaws from './laws/friction.js';

/**
 * Mean-value combustion engine on a shaft (its inertia is an element of its own).
 *
 * The indicated (gross) torque follows the request plus drag with the lag of the air path, between nothing and the
 * full-load curve; fuel after the Willans line, fuel power = gross torque * speed / e. It burns only with ignition on
 * and above `firingSpeed`: it starts by being turned, and stalls when pulled below. An idle governor (PI with
 * automatic reset) adds what holds `idleSpeed`. A request of zero is overrun: no fuel down to idle; from there the
 * drag is made up for over the first few `requestWidth`, so that a real request is the torque at the shaft.
 */
export const combustionEngine = branch({
  kind: 'combustion-engine',
  about: 'combustion engine: full-load curve, air-path lag, drag, idle governor, Willans fuel',
  source: 'Willans 1888; Guzzella & Onder, Introduction to Modeling and Control of Internal Combustion Engine Systems',
  valid: 'mean value over a working cycle; warm engine. The default curve is invented.',
  ports: { shaft: 'shaft' },
  states: {
    indicatedTorque: { unit: 'N m', about: 'gross torque of combustion', least: -1, scale: 500 },
    idleTorque: { unit: 'N m', about: 'integral part of the idle governor', scale: 50 },
    fuelMass: { unit: 'kg', about: 'fuel burnt so far', least: -1e-9, scale: 0.1 },
  },
  commands: {
    torqueRequest: { unit: 'N m', about: 'wanted torque at the shaft; 0: overrun', rest: 0, least: 0, most: 5000 },
    ignition: { unit: '1', about: '1: fuel and ignition on', rest: 0, least: 0, most: 1 },
    derate: { unit: '1', about: 'share of the full-load torque that is left', rest: 1, least: 0, most: 1, fault: true },
  },
  readings: {
    torque: { unit: 'N m', about: 'torque at the shaft' },
    fullLoad: { unit: 'N m', about: 'greatest torque at the present speed', least: 0 },
    drag: { unit: 'N m', about: 'drag torque', least: 0 },
    fuelFlow: { unit: 'kg/s', about: 'fuel burnt per time', least: 0 },
    fuelPower: { unit: 'W', about: 'heating value of the fuel burnt per time', least: 0 },
    speedMagnitude: { unit: 'rad/s', about: 'speed without its sign', least: 0 },
  },
  parameters: {
    sweptVolume: { unit: 'm3', about: 'swept volume, four-stroke', least: 1e-4, usual: [0.001, 0.015] },
    efficiency: {
      unit: '1',
      about: 'indicated efficiency e of the Willans line',
      default: 0.43,
      least: 0.1,
      most: 0.6,
      usual: [0.33, 0.48],
    },
    dragPressure: {
      unit: 'Pa',
      about: 'mean effective pressure of drag at standstill',
      default: 1.5e5,
      least: 0,
      usual: [0.8e5, 2.5e5],
      difference: true,
    },
    dragRise: { unit: 'Pa s', about: 'its rise per speed', default: 0, least: 0 },
    heatingValue: {
      unit: 'J/kg',
      about: 'lower heating value of the fuel',
      default: 42.8e6,
      least: 1e6,
      usual: [42e6, 44e6],
    },
    airPathTime: { unit: 's', about: 'lag of rising torque', default: 0.15, least: 0.01, usual: [0.05, 1.5] },
    cutTime: { unit: 's', about: 'lag of falling torque', default: 0.06, least: 0.01, usual: [0.02, 0.3] },
    requestWidth: { unit: 'N m', about: 'request over which the drag is made up for', default: 8, least: 0.1 },
    idleSpeed: { unit: 'rad/s', about: 'idle speed', default: 73.3, least: 10, usual: [55, 110] },
    idleGain: { unit: 'N m s', about: 'idle governor: torque per speed missing', default: 4, least: 0 },
    idleTime: { unit: 's', about: 'its reset time', default: 0.8, least: 0.05 },
    idleLimit: { unit: 'N m', about: 'most torque that it adds to the drag', default: 150, least: 0 },
    firingSpeed: { unit: 'rad/s', about: 'speed above which it burns', default: 25, least: 1, usual: [10, 40] },
    fullLoadSpeed1: { unit: 'rad/s', about: 'full-load curve, first point', default: 73.3, least: 0 },
    fullLoadSpeed2: { unit: 'rad/s', about: 'second point', default: 125.7, least: 0 },
    fullLoadSpeed3: { unit: 'rad/s', about: 'third point', default: 178, least: 0 },
    fullLoadSpeed4: { unit: 'rad/s', about: 'fourth point: rated speed', default: 261.8, least: 0 },
    fullLoadSpeed5: { unit: 'rad/s', about: 'fifth point: end of governing', default: 293.2, least: 0 },
    fullLoadTorque1: { unit: 'N m', about: 'full-load torque at the first point', default: 420, least: 0 },
    fullLoadTorque2: { unit: 'N m', about: 'at the second', default: 700, least: 0 },
    fullLoadTorque3: { unit: 'N m', about: 'at the third', default: 700, least: 0 },
    fullLoadTorque4: { unit: 'N m', about: 'at the fourth', default: 560, least: 0 },
    fullLoadTorque5: { unit: 'N m', about: 'at the fifth', default: 0, least: 0 },
    maximumSpeed: { unit: 'rad/s', about: 'highest permitted speed; 0: not watched', default: 0, least: 0 },
  },
  starts: { running: { unit: '1', about: '1: idling at the start', default: 0, least: 0, most: 1 } },
  laws: { ...engineLaws, ...frictionLaws },
  heat: 'leaves',
  limits: [
    {
      reading: 'speedMagnitude',
      side: 'above',
      level: 'over speed',
      parameter: 'maximumSpeed',
      meaning: 'the engine turns faster than its valve train and pistons are built for',
    },
  ],
  flows({ parameter, shaft, state, command, derivative, reading, law }) {
    const speed = shaft.speed;
    const forward = Math.max(speed, 0);
    const drag = law.meanEffectiveTorque(
      parameter.dragPressure + parameter.dragRise * Math.abs(speed),
      parameter.sweptVolume,
    );
    const fullLoad =
      command.derate *
      law.fullLoadTorque(
        forward,
        parameter.fullLoadSpeed1,
        parameter.fullLoadSpeed2,
        parameter.fullLoadSpeed3,
        parameter.fullLoadSpeed4,
        parameter.fullLoadSpeed5,
        parameter.fullLoadTorque1,
        parameter.fullLoadTorque2,
        parameter.fullLoadTorque3,
        parameter.fullLoadTorque4,
        parameter.fullLoadTorque5,
        5,
      );
    const governor = law.between(
      state.idleTorque + parameter.idleGain * (parameter.idleSpeed - speed),
      -drag,
      parameter.idleLimit,
    );
    const request = Math.max(command.torqueRequest, 0);
    const requested = request + drag * (1 - Math.exp(-request / parameter.requestWidth));
    const demand = command.ignition * law.between(Math.max(requested, governor + drag), 0, fullLoad + drag);
    const gross = state.indicatedTorque * law.smoothSwitch(speed, parameter.firingSpeed, 3);
    const torque = gross - law.slidingTorque(drag, speed, 1);
    const fuelPower = law.willansFuelPower(gross - drag, drag, forward, parameter.efficiency);
    shaft.torque += torque;
    derivative.indicatedTorque =
      (demand - state.indicatedTorque) / (demand > state.indicatedTorque ? parameter.airPathTime : parameter.cutTime);
    derivative.idleTorque =
      (command.ignition * law.between(governor, -0.1 * parameter.idleLimit, parameter.idleLimit) - state.idleTorque) /
      parameter.idleTime;
    derivative.fuelMass = fuelPower / parameter.heatingValue;
    reading.torque = torque;
    reading.fullLoad = fullLoad;
    reading.drag = drag;
    reading.fuelFlow = fuelPower / parameter.heatingValue;
    reading.fuelPower = fuelPower;
    reading.speedMagnitude = Math.abs(speed);
  },
  /** The indicated work; the heat that combustion sends elsewhere does not enter the circuit. */
  supply({ parameter, shaft, state, law }) {
    return state.indicatedTorque * law.smoothSwitch(shaft.speed, parameter.firingSpeed, 3) * shaft.speed;
  },
  loss({ parameter, shaft, law }) {
    const drag = law.meanEffectiveTorque(
      parameter.dragPressure + parameter.dragRise * Math.abs(shaft.speed),
      parameter.sweptVolume,
    );
    return law.slidingTorque(drag, shaft.speed, 1) * shaft.speed;
  },
  initial: ({ parameter, start }) => ({
    indicatedTorque:
      start.running! > 0.5
        ? ((parameter.dragPressure! + parameter.dragRise! * parameter.idleSpeed!) * parameter.sweptVolume!) /
          (4 * Math.PI)
        : 0,
  }),
  examine: ({ parameter }) => {
    const rising = [1, 2, 3, 4].every((i) => parameter[`fullLoadSpeed${i + 1}`]! > parameter[`fullLoadSpeed${i}`]! + 1);
    return rising
      ? []
      : [
          {
            parameter: 'fullLoadSpeed5',
            what: 'the speeds of the full-load curve do not rise from point to point',
            remedy: 'give five speeds in rising order, at least 1 rad/s apart',
          },
        ];
  },
});
