import type { ControllerMirror, ControllerModule } from '../../bridge/controller-side.js';

/**
 * The demo controller of the shuttle bus. It knows the message map and nothing of the plant: what it reads and writes
 * are values in the map's units. A real control unit does more.
 *
 * In the split, the engine (carrier) drives the prop shaft (ring) only against what unit A holds at the sun. So unit A
 * governs the engine's speed, the engine gives the power that is wanted on average, and unit B makes up at the prop
 * shaft what the pedals ask beyond that, and brakes.
 */

/** The bus as the controller's calibration has it. */
const bus = {
  tyreRadius: 0.42,
  axleRatio: 4.9,
  /** ring teeth over sun teeth */
  split: 2.5,
  /** unit B over prop shaft */
  ratioB: 1.6,
  /** m3 per turn */
  displacementA: 55e-6,
  displacementB: 125e-6,
  /** N */
  acceleratorForce: 17e3,
  brakeForce: 45e3,
  /** W at full accelerator */
  power: 110e3,
  /** N m at full application */
  frontBrake: 13e3,
  rearBrake: 11e3,
  frontShare: 0.55,
  /** N m */
  engineTorque: 340,
};
/** Force at the wheels to torque at the prop shaft. */
const wheelPerProp = bus.tyreRadius / bus.axleRatio;

/** bar(g) */
const pressures = {
  /** Driving fades out from `low` to `empty`, recovery from `nearFull` to `full`. */
  empty: 155,
  low: 172,
  nearFull: 308,
  full: 324,
  /** The engine works towards this at standstill, and towards `atFast` at speed. */
  atRest: 250,
  atFast: 200,
  lowLeast: 7.5,
};

/** rad/s; `fast` m/s */
const speeds = { firing: 45, idle: 90, work: 150, most: 260, fast: 13, sunMost: 440, highB: 340, mostB: 370 };

/** s */
const period = 0.005;

const start = { torqueA: 0, torqueB: 0, engineTorque: 0, goal: speeds.idle, working: 0 };

export function createController(mirror: ControllerMirror, _step: number): ControllerModule {
  const at = (path: string) => mirror.readIndex(path);
  const to = (path: string) => mirror.writeIndex(path);
  const input = {
    highPressure: at('hydraulicStatus.highPressure'),
    accumulatorPressure: at('hydraulicStatus.accumulatorPressure'),
    lowPressure: at('hydraulicStatus.lowPressure'),
    hydraulicAge: at('hydraulicStatus.age'),
    propSpeed: at('drivelineStatus.propSpeed'),
    engineSpeed: at('drivelineStatus.engineSpeed'),
    drivelineAge: at('drivelineStatus.age'),
    speed: at('vehicleStatus.speed'),
    accelerator: at('vehicleStatus.accelerator'),
    brake: at('vehicleStatus.brake'),
    direction: at('vehicleStatus.direction'),
    key: at('vehicleStatus.key'),
    vehicleAge: at('vehicleStatus.age'),
  };
  const output = {
    torqueA: to('unitRequest.torqueA'),
    torqueB: to('unitRequest.torqueB'),
    enableA: to('unitRequest.enableA'),
    enableB: to('unitRequest.enableB'),
    isolation: to('unitRequest.isolation'),
    chargeSpeed: to('unitRequest.chargeSpeed'),
    engineTorque: to('drivelineRequest.engineTorque'),
    ignition: to('drivelineRequest.ignition'),
    starter: to('drivelineRequest.starter'),
    frontBrake: to('drivelineRequest.frontBrake'),
    rearBrake: to('drivelineRequest.rearBrake'),
  };
  const now = { ...start };

  const step = (_tick: number, read: Float64Array, write: Float64Array): void => {
    const awake = read[input.vehicleAge]! < 100 && read[input.drivelineAge]! < 100;
    const key = awake && read[input.key]! > 0.5;
    const hydraulics = key && read[input.hydraulicAge]! < 50;
    const forward = awake && read[input.direction]! > 0.5;
    const accelerator = awake ? read[input.accelerator]! : 0;
    const brake = awake ? read[input.brake]! : 0.35;
    const speed = read[input.speed]! / 3.6;
    const propSpeed = radians(read[input.propSpeed]!);
    const engineSpeed = radians(read[input.engineSpeed]!);
    const accumulator = read[input.accumulatorPressure]!;
    const difference = Math.max(read[input.highPressure]! - read[input.lowPressure]!, 0) * 1e5;
    const open = hydraulics && (forward || Math.abs(speed) > 0.3);

    // what the driver wants, as torque at the prop shaft
    const most = Math.min(bus.acceleratorForce, bus.power / Math.max(Math.abs(speed), 2));
    const drive = accelerator * most * wheelPerProp;
    const retard = brake * bus.brakeForce * wheelPerProp;

    // engine: works while the accumulator is below what the speed leaves room for, or while much is wanted
    const target =
      pressures.atRest + (pressures.atFast - pressures.atRest) * ramp(Math.abs(speed), 0, speeds.fast) ** 2;
    if (!open || retard > 0 || accumulator > target + 12) now.working = 0;
    else if (accumulator < target - 2) now.working = 1;
    const wish = now.working === 1 ? Math.max(drive * propSpeed, 0) + 600 * limit(target + 12 - accumulator, 0, 40) : 0;
    // the sun is the fastest member: at low speed of the road it bounds the engine's
    const room = (speeds.sunMost + bus.split * propSpeed) / (1 + bus.split);
    const goal =
      now.working === 1 ? Math.min(limit(speeds.work + wish / 700, speeds.work, speeds.most), room) : speeds.idle;
    now.goal = slew(now.goal, goal, 120 * period);
    const reachA = (0.95 * bus.displacementA * difference) / (2 * Math.PI);
    const held = Math.min(bus.engineTorque, reachA * (1 + bus.split) * 0.9);
    const engineWanted = now.working === 1 ? limit(wish / Math.max(now.goal, speeds.idle), 60, held) : 0;
    now.engineTorque = slew(now.engineTorque, engineWanted, 900 * period);

    // unit A holds the engine's torque at the sun and governs its speed
    const hold = now.engineTorque / (1 + bus.split);
    const governs = now.working === 1 || now.engineTorque > 5;
    const torqueA = governs ? -hold - 1.2 * (engineSpeed - now.goal) : 0;
    now.torqueA = slew(now.torqueA, limit(torqueA, -reachA, 0.2 * reachA), 1500 * period);

    // unit B makes up what the ring does not bring
    const ring = -bus.split * now.torqueA;
    const fast = ramp(Math.abs(propSpeed * bus.ratioB), speeds.mostB, speeds.highB);
    const reachB = ((0.95 * bus.displacementB * difference) / (2 * Math.PI)) * fast;
    let wanted = 0;
    if (open && retard > 0) {
      const share = ramp(accumulator, pressures.full, pressures.nearFull) * ramp(speed, 0.6, 1.8);
      wanted = -Math.min((retard + ring) / bus.ratioB, reachB) * share;
    } else if (open) {
      wanted = limit((drive - ring) / bus.ratioB, -reachB, reachB);
      if (wanted > 0) wanted *= ramp(accumulator, pressures.empty, pressures.low);
    }
    now.torqueB = slew(now.torqueB, wanted, 5000 * period);

    // service brakes: what the prop shaft does not take
    const done = Math.min(now.torqueB * bus.ratioB + ring, 0);
    const friction = (Math.max(0, retard + done) / wheelPerProp) * bus.tyreRadius;

    write[output.torqueA] = now.torqueA;
    write[output.torqueB] = now.torqueB;
    write[output.enableA] = open ? 1 : 0;
    write[output.enableB] = open ? 1 : 0;
    write[output.isolation] = open ? 1 : 0;
    write[output.chargeSpeed] = hydraulics
      ? limit(300 + 900 * (pressures.lowLeast - read[input.lowPressure]!), 0, 2400)
      : 0;
    write[output.engineTorque] = key ? now.engineTorque : 0;
    write[output.ignition] = key ? 1 : 0;
    write[output.starter] = key ? 220 * ramp(engineSpeed, speeds.firing, speeds.firing - 10) : 0;
    write[output.frontBrake] = limit((friction * bus.frontShare) / bus.frontBrake, 0, 1);
    write[output.rearBrake] = limit((friction * (1 - bus.frontShare)) / bus.rearBrake, 0, 1);
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
