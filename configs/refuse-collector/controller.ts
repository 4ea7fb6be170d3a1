import type { ControllerMirror, ControllerModule } from '../../bridge/controller-side.js';

/**
 * The demo controller of the refuse collector. It knows the message map and nothing of the plant: what it reads and
 * writes are values in the map's units. A real control unit does more.
 *
 * The drive unit alone moves and brakes the vehicle; the engine only keeps the accumulator at a pressure that leaves
 * room for the kinetic energy on board. Near full, near standstill and without hydraulics the service brakes take over.
 */

/** The vehicle as the controller's calibration has it. */
const vehicle = {
  tyreRadius: 0.5,
  /** drive unit to wheel */
  ratio: 2.6 * 5.4,
  /** m3 per turn */
  driveDisplacement: 250e-6,
  pumpDisplacement: 140e-6,
  /** N */
  acceleratorForce: 28e3,
  brakeForce: 75e3,
  /** N m at full application */
  frontBrake: 26e3,
  rearBrake: 24e3,
  frontShare: 0.5,
  /** N m */
  engineTorque: 560,
};

/** bar(g) */
const pressures = {
  /** Driving fades out from `low` to `empty`, recovery from `nearFull` to `full`. */
  empty: 165,
  low: 185,
  nearFull: 312,
  full: 328,
  /** What the engine pump works towards at standstill and at `fast`. */
  atRest: 272,
  atFast: 225,
  lowLeast: 7,
};

/** rad/s; `fast` m/s */
const speeds = { firing: 40, idle: 75, working: 150, fast: 8, driveHigh: 330, driveMost: 360 };

/** s */
const period = 0.005;

const start = { pumpTorque: 0, driveTorque: 0, charging: 0 };

export function createController(mirror: ControllerMirror, _step: number): ControllerModule {
  const at = (path: string) => mirror.readIndex(path);
  const to = (path: string) => mirror.writeIndex(path);
  const input = {
    highPressure: at('hydraulicStatus.highPressure'),
    accumulatorPressure: at('hydraulicStatus.accumulatorPressure'),
    lowPressure: at('hydraulicStatus.lowPressure'),
    driveSpeed: at('hydraulicStatus.driveSpeed'),
    hydraulicAge: at('hydraulicStatus.age'),
    speed: at('vehicleStatus.speed'),
    engineSpeed: at('vehicleStatus.engineSpeed'),
    accelerator: at('vehicleStatus.accelerator'),
    brake: at('vehicleStatus.brake'),
    direction: at('vehicleStatus.direction'),
    key: at('vehicleStatus.key'),
    vehicleAge: at('vehicleStatus.age'),
  };
  const output = {
    torque: to('driveRequest.torque'),
    enable: to('driveRequest.enable'),
    isolation: to('driveRequest.isolation'),
    chargeSpeed: to('driveRequest.chargeSpeed'),
    frontBrake: to('driveRequest.frontBrake'),
    rearBrake: to('driveRequest.rearBrake'),
    engineTorque: to('engineRequest.engineTorque'),
    ignition: to('engineRequest.ignition'),
    starter: to('engineRequest.starter'),
    pumpTorque: to('engineRequest.pumpTorque'),
    pumpEnable: to('engineRequest.pumpEnable'),
  };
  const now = { ...start };

  const step = (_tick: number, read: Float64Array, write: Float64Array): void => {
    const awake = read[input.vehicleAge]! < 100;
    const key = awake && read[input.key]! > 0.5;
    const hydraulics = key && read[input.hydraulicAge]! < 50;
    const forward = awake && read[input.direction]! > 0.5;
    const accelerator = awake ? read[input.accelerator]! : 0;
    const brake = awake ? read[input.brake]! : 0.35;
    const speed = read[input.speed]! / 3.6;
    const driveSpeed = radians(read[input.driveSpeed]!);
    const engineSpeed = radians(read[input.engineSpeed]!);
    const accumulator = read[input.accumulatorPressure]!;
    const difference = Math.max(read[input.highPressure]! - read[input.lowPressure]!, 0) * 1e5;

    // drive unit: drives while the accumulator holds, brakes while it has room
    const torquePerForce = vehicle.tyreRadius / vehicle.ratio;
    const open = hydraulics && (forward || Math.abs(speed) > 0.3);
    const reach =
      ((0.95 * vehicle.driveDisplacement * difference) / (2 * Math.PI)) *
      ramp(Math.abs(driveSpeed), speeds.driveMost, speeds.driveHigh);
    const drive = accelerator * vehicle.acceleratorForce * torquePerForce;
    const retard = brake * vehicle.brakeForce * torquePerForce;
    let wanted = 0;
    if (open && retard > 0)
      wanted = -Math.min(retard, reach) * ramp(accumulator, pressures.full, pressures.nearFull) * ramp(speed, 0.6, 1.8);
    else if (open) wanted = Math.min(drive, reach) * ramp(accumulator, pressures.empty, pressures.low);
    now.driveTorque = slew(now.driveTorque, wanted, 5000 * period);

    // engine pump: towards a pressure that leaves room for the kinetic energy; hysteresis keeps the engine from hunting
    const target =
      pressures.atRest + (pressures.atFast - pressures.atRest) * ramp(Math.abs(speed), 0, speeds.fast) ** 2;
    if (!open || accumulator > target) now.charging = 0;
    else if (accumulator < target - 20) now.charging = 1;
    const most = Math.min((0.95 * vehicle.pumpDisplacement * difference) / (2 * Math.PI), 0.85 * vehicle.engineTorque);
    const pump =
      now.charging === 1
        ? most *
          ramp(accumulator, target + 2, target - 10) *
          ramp(engineSpeed, speeds.working - 40, speeds.working - 10)
        : 0;
    now.pumpTorque = slew(now.pumpTorque, pump, 900 * period);
    const goal = now.charging === 1 ? speeds.working : speeds.idle;
    const engine = now.pumpTorque + 12 * (goal - engineSpeed);

    // service brakes: what the drive unit does not take
    const friction = (Math.max(0, retard + Math.min(now.driveTorque, 0)) / torquePerForce) * vehicle.tyreRadius;

    write[output.torque] = now.driveTorque;
    write[output.enable] = open ? 1 : 0;
    write[output.isolation] = open ? 1 : 0;
    write[output.chargeSpeed] = hydraulics
      ? limit(300 + 900 * (pressures.lowLeast - read[input.lowPressure]!), 0, 2400)
      : 0;
    write[output.frontBrake] = limit((friction * vehicle.frontShare) / vehicle.frontBrake, 0, 1);
    write[output.rearBrake] = limit((friction * (1 - vehicle.frontShare)) / vehicle.rearBrake, 0, 1);
    write[output.engineTorque] = key && now.charging === 1 ? limit(engine, 0, vehicle.engineTorque) : 0;
    write[output.ignition] = key ? 1 : 0;
    write[output.starter] = key ? 350 * ramp(engineSpeed, speeds.firing, speeds.firing - 10) : 0;
    write[output.pumpTorque] = -now.pumpTorque;
    write[output.pumpEnable] = hydraulics ? 1 : 0;
  };

  return { step, restart: () => void Object.assign(now, start) };
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
