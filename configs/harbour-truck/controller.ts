import type { ControllerMirror, ControllerModule } from '../../bridge/controller-side.js';

/**
 * The demo controller of the harbour truck. It knows the message map and nothing of the plant: what it reads and writes
 * are values in the map's units. Written to be read; a real control unit does more.
 *
 * It splits the driver's wish between engine and pump-motor, recovers brake energy and blends it with the service
 * brakes, drives with the engine off while the accumulator holds, recharges while cruising, connects the pump-motor at
 * matched speed, gives way near full and near empty, and falls back to engine and brakes when the hydraulic sensors
 * fall silent.
 */

/** The truck as the controller's calibration has it. */
const truck = {
  tyreRadius: 0.4,
  axleRatio: 3.9,
  pumpRatio: 2.2,
  /** m3 per turn */
  displacement: 110e-6,
  gears: [6.2, 3.6, 2.2, 1.4, 1, 0.78],
  /** N at full accelerator, at most `power` W */
  acceleratorForce: 20e3,
  power: 115e3,
  brakeForce: 40e3,
  /** N m at full application */
  frontBrake: 11500,
  rearBrake: 9500,
  frontShare: 0.55,
};

/** Pressures in bar(g). */
const pressures = {
  /** Below it the accumulator counts as empty, from `filling` on as worth using. */
  empty: 165,
  filling: 190,
  /** Recharging while cruising ends here. */
  enough: 215,
  /** Recovery fades out from `nearFull` to `full`, well below the relief valve. */
  nearFull: 312,
  full: 326,
  lowLeast: 7.5,
};

const period = 0.005;

type Driving = 'hydraulic' | 'engine';

export function createController(mirror: ControllerMirror, _step: number): ControllerModule {
  const at = (path: string) => mirror.readIndex(path);
  const to = (path: string) => mirror.writeIndex(path);
  const input = {
    highPressure: at('hydraulicStatus.highPressure'),
    accumulatorPressure: at('hydraulicStatus.accumulatorPressure'),
    lowPressure: at('hydraulicStatus.lowPressure'),
    pumpSpeed: at('hydraulicStatus.pumpSpeed'),
    hydraulicAge: at('hydraulicStatus.age'),
    speed: at('vehicleStatus.speed'),
    accelerator: at('vehicleStatus.accelerator'),
    brake: at('vehicleStatus.brake'),
    direction: at('vehicleStatus.direction'),
    key: at('vehicleStatus.key'),
    vehicleAge: at('vehicleStatus.age'),
    engineSpeed: at('drivelineStatus.engineSpeed'),
    propSpeed: at('drivelineStatus.propSpeed'),
    gear: at('drivelineStatus.gear'),
    shifting: at('drivelineStatus.shifting'),
    drivelineAge: at('drivelineStatus.age'),
  };
  const output = {
    torque: to('hydraulicRequest.torque'),
    enable: to('hydraulicRequest.enable'),
    isolation: to('hydraulicRequest.isolation'),
    connect: to('hydraulicRequest.connect'),
    chargeSpeed: to('hydraulicRequest.chargeSpeed'),
    engineTorque: to('drivelineRequest.engineTorque'),
    ignition: to('drivelineRequest.ignition'),
    starter: to('drivelineRequest.starter'),
    clutch: to('drivelineRequest.clutch'),
    gear: to('drivelineRequest.gear'),
    frontBrake: to('drivelineRequest.frontBrake'),
    rearBrake: to('drivelineRequest.rearBrake'),
  };

  let driving: Driving = 'engine';
  let connected = 0;
  let wantedGear = 1;
  let clutch = 0;
  let pumpTorque = 0;
  let engineTorque = 0;
  let ignition = 1;
  let idleFor = 0;
  let recharging = 0;

  const restart = () => {
    driving = 'engine';
    connected = 0;
    wantedGear = 1;
    clutch = 0;
    pumpTorque = 0;
    engineTorque = 0;
    ignition = 1;
    idleFor = 0;
    recharging = 0;
  };

  const step = (_tick: number, read: Float64Array, write: Float64Array): void => {
    const awake = read[input.vehicleAge]! < 100 && read[input.drivelineAge]! < 100;
    const hydraulicsSeen = read[input.hydraulicAge]! < 50;
    const key = awake && read[input.key]! > 0.5;
    const speed = read[input.speed]! / 3.6;
    const forward = awake && read[input.direction]! > 0.5;
    const accelerator = awake ? read[input.accelerator]! : 0;
    const brake = awake ? read[input.brake]! : 0.35;
    const accumulator = read[input.accumulatorPressure]!;
    const pumpSpeed = (read[input.pumpSpeed]! * Math.PI) / 30;
    const propSpeed = (read[input.propSpeed]! * Math.PI) / 30;
    const engineSpeed = (read[input.engineSpeed]! * Math.PI) / 30;

    // what the driver wants at the prop shaft
    const wheelPerProp = truck.tyreRadius / truck.axleRatio;
    const drive = accelerator * Math.min(truck.acceleratorForce, truck.power / Math.max(Math.abs(speed), 2)) * wheelPerProp;
    const retard = brake * truck.brakeForce * wheelPerProp;

    // the accumulator: worth using, full, empty
    if (accumulator < pressures.empty) driving = 'engine';
    else if (accumulator > pressures.filling) driving = 'hydraulic';
    const nearEmpty = ramp(accumulator, pressures.empty - 5, pressures.empty + 12);
    const nearFull = ramp(accumulator, pressures.full, pressures.nearFull);
    const usable = key && hydraulicsSeen;

    // isolation valve and pump-motor
    const open = usable && (forward || Math.abs(speed) > 0.3);
    const target = propSpeed * truck.pumpRatio;
    const tooFast = Math.abs(target) > 350;
    const wanted = open && !tooFast;
    if (!wanted) connected = 0;
    else if (connected === 0 && Math.abs(pumpSpeed - target) < 6) connected = 1;
    const range = ((truck.displacement * Math.max(read[input.highPressure]! - read[input.lowPressure]!, 0) * 1e5) / (2 * Math.PI)) * 0.95;
    let pumpWanted = 0;
    if (connected === 1) {
      if (retard > 0) pumpWanted = -Math.min(retard / truck.pumpRatio, range) * nearFull * ramp(speed, 0.8, 2.2);
      else if (drive > 0 && driving === 'hydraulic') pumpWanted = Math.min(drive / truck.pumpRatio, range) * nearEmpty;
      else if (recharging === 1) pumpWanted = -60 * ramp(accumulator, pressures.enough, pressures.enough - 10);
    } else if (wanted) pumpWanted = limit((target - pumpSpeed) * 0.9, -45, 45);
    pumpTorque = slew(pumpTorque, pumpWanted, 4000 * period);

    // engine: off while the accumulator drives, on again in time
    const hydraulicShare = connected === 1 && pumpTorque > 0 ? pumpTorque * truck.pumpRatio : 0;
    const missing = retard > 0 ? 0 : Math.max(0, drive - hydraulicShare);
    const needsEngine = driving === 'engine' || missing > 0.12 * drive + 25;
    if (!key) ignition = 0;
    else if (needsEngine && accelerator > 0.02) {
      ignition = 1;
      idleFor = 0;
    } else if (driving === 'engine') ignition = 1;
    else {
      idleFor += period;
      if (idleFor > 1.5) ignition = 0;
    }
    recharging = ignition === 1 && driving === 'engine' && retard === 0 && speed > 3 ? 1 : 0;
    write[output.starter] = ignition === 1 && engineSpeed < 55 ? 320 * ramp(engineSpeed, 55, 45) : 0;

    // gear by speed, with a gap between shifting up and down
    const running = ignition === 1 && engineSpeed > 60;
    const gear = Math.round(read[input.gear]!);
    const shifting = read[input.shifting]! > 0.5;
    wantedGear = chooseGear(wantedGear, propSpeed, clutch > 0.05 || shifting);
    const ratio = truck.gears[wantedGear - 1]!;
    const inGear = gear === wantedGear && !shifting;
    const launching = propSpeed * ratio < 75;
    let clutchWanted = 0;
    let engineWanted = 0;
    if (running && inGear && forward && missing > 0) {
      engineWanted = limit(missing / ratio, 0, 620);
      clutchWanted = launching ? limit(0.12 + 0.5 * (engineWanted / 620), 0, 0.65) : 1;
      if (recharging === 1 && !launching) engineWanted = limit(engineWanted + (-pumpTorque * truck.pumpRatio) / ratio, 0, 620);
      if (launching && engineSpeed < 78) clutchWanted *= ramp(engineSpeed, 62, 78);
    } else if (running && inGear && forward && recharging === 1 && !launching) {
      engineWanted = limit((-pumpTorque * truck.pumpRatio) / ratio, 0, 400);
      clutchWanted = clutch > 0 || accelerator > 0 ? 1 : 0;
    }
    if (retard > 0 || !inGear) clutchWanted = 0;
    clutch = slew(clutch, clutchWanted, clutchWanted > clutch ? 2.5 * period : 12 * period);
    // the engine comes to the gearbox's speed before the clutch takes it along
    if (clutchWanted > 0 && clutch < 0.3 && !launching && engineSpeed < propSpeed * ratio - 5) engineWanted = Math.max(engineWanted, 160);
    engineTorque = slew(engineTorque, clutch > 0.05 || clutchWanted > 0 ? engineWanted : 0, 8000 * period);

    // service brakes: what the pump-motor does not take
    const recovered = connected === 1 && pumpTorque < 0 ? -pumpTorque * truck.pumpRatio : 0;
    const friction = (Math.max(0, retard - recovered) / wheelPerProp) * truck.tyreRadius;
    const front = (friction * truck.frontShare) / truck.frontBrake;
    const rear = (friction * (1 - truck.frontShare)) / truck.rearBrake;

    write[output.torque] = pumpTorque;
    write[output.enable] = open ? 1 : 0;
    write[output.isolation] = open ? 1 : 0;
    write[output.connect] = connected;
    write[output.chargeSpeed] = usable ? limit(300 + 900 * (pressures.lowLeast + 0.8 - read[input.lowPressure]!), 0, 2400) : 0;
    write[output.engineTorque] = ignition === 1 ? engineTorque : 0;
    write[output.ignition] = ignition;
    write[output.clutch] = clutch;
    write[output.gear] = key && (forward || Math.abs(speed) > 0.5) ? wantedGear : 0;
    write[output.frontBrake] = limit(front, 0, 1);
    write[output.rearBrake] = limit(rear, 0, 1);
  };

  return { step, restart };
}

/** 0 at `from`, 1 at `to`, straight between; either may be the larger. */
function ramp(value: number, from: number, to: number): number {
  return limit((value - from) / (to - from), 0, 1);
}

function limit(value: number, least: number, most: number): number {
  return value < least ? least : value > most ? most : value;
}

function slew(value: number, wanted: number, most: number): number {
  return value + limit(wanted - value, -most, most);
}

function chooseGear(gear: number, propSpeed: number, busy: boolean): number {
  if (busy) {
    // with the clutch closed only a clear reason changes the gear
    if (propSpeed * truck.gears[gear - 1]! > 235 && gear < 6) return gear + 1;
    if (propSpeed * truck.gears[gear - 1]! < 70 && gear > 1) return gear - 1;
    return gear;
  }
  let best = 1;
  for (let candidate = 2; candidate <= 6; candidate += 1) if (propSpeed * truck.gears[candidate - 1]! > 125) best = candidate;
  return best;
}
