import type { ControllerMirror, ControllerModule } from '../../bridge/controller-side.js';

/**
 * The demo controller of the harbour truck. It knows the message map and nothing of the plant: what it reads and writes
 * are values in the map's units. Written to be read; a real control unit does more.
 *
 * It splits the driver's wish between engine and pump-motor, recovers brake energy and blends it with the service
 * brakes, drives with the engine off while the accumulator holds, recharges with what the engine has to spare, connects
 * the pump-motor at matched speed, gives way near full and near empty, and falls back to engine and brakes when the
 * hydraulic sensors fall silent.
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
  /** N m */
  engineTorque: 600,
  clutchTorque: 1100,
};
/** Force at the wheels to torque at the prop shaft. */
const wheelPerProp = truck.tyreRadius / truck.axleRatio;

/** Pressures in bar(g). */
const pressures = {
  /** Below it the accumulator counts as empty, from `filled` on as worth driving with. */
  empty: 165,
  filled: 205,
  /** Recharging by the engine fades out from here to `enough`. */
  nearEnough: 205,
  enough: 215,
  /** Recovery fades out from `nearFull` to `full`, well below the relief valve. */
  nearFull: 312,
  full: 326,
  lowLeast: 7.5,
};

/** Speeds in rad/s. */
const speeds = {
  /** Below it the engine needs its starter. */
  firing: 55,
  running: 65,
  /** The engine's speed while the clutch slips at a launch. */
  launch: 95,
  /** Gears change down below, and up above; by the accelerator up to `upAtFull` more. */
  down: 88,
  up: 165,
  upAtFull: 70,
  /** The clutch counts as closed within this slip. */
  slip: 8,
  /** The pump-motor lets go from here to `pumpMost`. */
  pumpHigh: 320,
  pumpMost: 350,
};

/** The controller steps once for each of the bench's fastest messages, s. */
const period = 0.005;

/** What drives, and what the gearbox is about. Numbers, since they stand among numbers. */
const source = { engine: 0, accumulator: 1 };
const phase = { inGear: 0, unloading: 1, changing: 2 };

/** All that is remembered from one step to the next. */
const start = {
  source: source.engine,
  phase: phase.inGear,
  gear: 1,
  connected: 0,
  ignition: 1,
  /** N m; share; N m: as asked for in the last step. */
  engineTorque: 0,
  clutch: 0,
  pumpTorque: 0,
  /** s */
  engineWantedFor: 0,
  engineIdleFor: 0,
};

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
  const now = { ...start };

  const step = (_tick: number, read: Float64Array, write: Float64Array): void => {
    // what is known: a silent message leaves its part of the truck out
    const awake = read[input.vehicleAge]! < 100 && read[input.drivelineAge]! < 100;
    const key = awake && read[input.key]! > 0.5;
    const hydraulics = key && read[input.hydraulicAge]! < 50;
    const forward = awake && read[input.direction]! > 0.5;
    const accelerator = awake ? read[input.accelerator]! : 0;
    const brake = awake ? read[input.brake]! : 0.35;
    const speed = read[input.speed]! / 3.6;
    const propSpeed = radians(read[input.propSpeed]!);
    const pumpSpeed = radians(read[input.pumpSpeed]!);
    const engineSpeed = radians(read[input.engineSpeed]!);
    const accumulator = read[input.accumulatorPressure]!;

    // what the driver wants, as torque at the prop shaft
    const most = Math.min(truck.acceleratorForce, truck.power / Math.max(Math.abs(speed), 2));
    const drive = accelerator * most * wheelPerProp;
    const retard = brake * truck.brakeForce * wheelPerProp;

    // pump-motor: first to brake, and to drive while the accumulator holds
    if (accumulator < pressures.empty || !hydraulics) now.source = source.engine;
    else if (accumulator > pressures.filled) now.source = source.accumulator;
    const nearEmpty = ramp(accumulator, pressures.empty - 5, pressures.empty + 15);
    const nearFull = ramp(accumulator, pressures.full, pressures.nearFull);
    const open = hydraulics && (forward || Math.abs(speed) > 0.3);
    const matched = propSpeed * truck.pumpRatio;
    if (!open || Math.abs(matched) > speeds.pumpMost) now.connected = 0;
    else if (Math.abs(pumpSpeed - matched) < 6) now.connected = 1;
    const difference = Math.max(read[input.highPressure]! - read[input.lowPressure]!, 0) * 1e5;
    const reach =
      ((0.95 * truck.displacement * difference) / (2 * Math.PI)) *
      ramp(Math.abs(matched), speeds.pumpMost, speeds.pumpHigh);
    const spare = spareTorque(now, drive, accelerator);
    let pumpWanted = 0;
    if (!open) pumpWanted = 0;
    else if (now.connected === 0) pumpWanted = limit(0.9 * (matched - pumpSpeed), -45, 45);
    else if (retard > 0) pumpWanted = -Math.min(retard / truck.pumpRatio, reach) * nearFull * ramp(speed, 0.8, 2.2);
    else if (drive > 0 && now.source === source.accumulator)
      pumpWanted = Math.min(drive / truck.pumpRatio, reach) * nearEmpty;
    else if (speed > 4)
      pumpWanted = -Math.min(spare / truck.pumpRatio, 70) * ramp(accumulator, pressures.enough, pressures.nearEnough);
    const gentle = retard > 0 || now.source === source.accumulator ? 4000 : 300;
    now.pumpTorque = slew(now.pumpTorque, pumpWanted, gentle * period);
    const hydraulicShare = now.connected === 1 ? now.pumpTorque * truck.pumpRatio : 0;

    // engine: gives what is missing and what recharges; off while the accumulator drives alone
    const missing = retard > 0 ? 0 : Math.max(0, drive - hydraulicShare);
    const wanted = accelerator > 0.02 && (now.source === source.engine || missing > 0.1 * drive + 30);
    now.engineWantedFor = wanted ? now.engineWantedFor + period : 0;
    now.engineIdleFor = wanted || now.source === source.engine ? 0 : now.engineIdleFor + period;
    if (now.source === source.engine || now.engineWantedFor > 0.15) now.ignition = 1;
    if (!key || now.engineIdleFor > 1.5) now.ignition = 0;
    const running = now.ignition === 1 && engineSpeed > speeds.running;

    // gears: unload the engine, open the clutch, change, match, close
    const coupled = running && forward && retard === 0 && missing > 0;
    const inGear = Math.round(read[input.gear]!) === now.gear && read[input.shifting]! < 0.5;
    const better = betterGear(now.gear, propSpeed, accelerator);
    if (now.phase === phase.inGear && better !== now.gear && inGear) now.phase = phase.unloading;
    if (now.phase === phase.unloading && now.clutch < 0.02) {
      now.gear = better;
      now.phase = phase.changing;
    } else if (now.phase === phase.changing && inGear) now.phase = phase.inGear;
    const ratio = truck.gears[now.gear - 1]!;
    const input1 = propSpeed * ratio;
    const wish = limit(missing / ratio, 0, truck.engineTorque);
    let engineWanted = 0;
    let clutchWanted = 0;
    if (now.phase === phase.unloading) clutchWanted = now.engineTorque > 40 ? 1 : 0;
    else if (now.phase === phase.changing) engineWanted = coupled ? limit(5 * (input1 - engineSpeed), 0, 250) : 0;
    else if (coupled) {
      const goal = Math.max(input1, speeds.launch);
      if (input1 > speeds.launch - 10 && Math.abs(engineSpeed - input1) < speeds.slip) {
        engineWanted = wish;
        clutchWanted = 1;
      } else {
        // the engine comes to the speed of the gearbox or of a launch; a clutch that slips passes what is wanted
        engineWanted = limit(wish + 6 * (goal - engineSpeed), 0, truck.engineTorque);
        if (engineSpeed > input1 - speeds.slip)
          clutchWanted =
            limit(wish / truck.clutchTorque, 0.05, 0.5) * ramp(engineSpeed, speeds.running, speeds.launch - 10);
      }
    }
    now.clutch = slew(now.clutch, clutchWanted, (clutchWanted > now.clutch ? 4 : 12) * period);
    now.engineTorque = slew(now.engineTorque, engineWanted, 4000 * period);

    // service brakes: what the pump-motor does not take
    const friction = (Math.max(0, retard + Math.min(hydraulicShare, 0)) / wheelPerProp) * truck.tyreRadius;

    write[output.torque] = now.pumpTorque;
    write[output.enable] = open ? 1 : 0;
    write[output.isolation] = open ? 1 : 0;
    write[output.connect] = now.connected;
    write[output.chargeSpeed] = hydraulics
      ? limit(300 + 900 * (pressures.lowLeast + 0.8 - read[input.lowPressure]!), 0, 2400)
      : 0;
    write[output.engineTorque] = now.ignition === 1 ? now.engineTorque : 0;
    write[output.ignition] = now.ignition;
    write[output.starter] = now.ignition === 1 ? 320 * ramp(engineSpeed, speeds.firing, speeds.firing - 10) : 0;
    write[output.clutch] = now.clutch;
    write[output.gear] = key && (forward || Math.abs(speed) > 0.5) ? now.gear : 0;
    write[output.frontBrake] = limit((friction * truck.frontShare) / truck.frontBrake, 0, 1);
    write[output.rearBrake] = limit((friction * (1 - truck.frontShare)) / truck.rearBrake, 0, 1);
  };

  return { step, restart: () => void Object.assign(now, start) };
}

/** Torque at the prop shaft that the engine can give beyond what the driver wants, for recharging. */
function spareTorque(now: Readonly<typeof start>, drive: number, accelerator: number): number {
  if (now.source === source.accumulator || now.phase !== phase.inGear || now.clutch < 0.95) return 0;
  return Math.max(0, 0.8 * truck.engineTorque * truck.gears[now.gear - 1]! - drive) * ramp(accelerator, 0.75, 0.55);
}

/** The gear for a speed: one up or down from the present one at most. */
function betterGear(gear: number, propSpeed: number, accelerator: number): number {
  const speed = propSpeed * truck.gears[gear - 1]!;
  if (gear < 6 && speed > speeds.up + speeds.upAtFull * accelerator) return gear + 1;
  if (gear > 1 && speed < speeds.down) return gear - 1;
  return gear;
}

function radians(turnsPerMinute: number): number {
  return (turnsPerMinute * Math.PI) / 30;
}

/** 0 at `from`, 1 at `to`, straight between; either may be the larger. */
function ramp(value: number, from: number, to: number): number {
  return limit((value - from) / (to - from), 0, 1);
}

function limit(value: number, least: number, most: number): number {
  return Math.min(Math.max(value, least), most);
}

function slew(value: number, wanted: number, most: number): number {
  return value + limit(wanted - value, -most, most);
}
