import type { InstrumentKind, InstrumentSetup, InstrumentUpdate } from '../../runtime/instrument.js';

/**
 * A driver who follows a target speed with two pedals.
 *
 *   force = road load at the target ahead + mass * (target ahead - target) / previewTime + gain e + integral of gain e / resetTime
 *
 * (proportional-integral with feedforward and preview). A positive force goes to the accelerator, a negative one to
 * the brake, never both; pedals move at a limited rate. The integral rests while the pedals are at their ends or on
 * their way (conditional integration), so it does not wind up. At a target of zero the
 * driver brakes to the end instead of creeping there, holds with the brake and goes to neutral after a while.
 */
export const driver: InstrumentKind = {
  kind: 'driver',
  about: 'driver who follows a target speed with accelerator and brake',
  source: 'PI with preview: common practice, no source',
  stage: 'before',
  inputs: {
    target: { unit: 'm/s', about: 'wanted velocity now' },
    targetAhead: { unit: 'm/s', about: 'wanted velocity in previewTime from now', optional: true },
    velocity: { unit: 'm/s', about: 'velocity of the vehicle' },
  },
  outputs: {
    accelerator: { unit: '1', about: 'accelerator pedal', least: 0, most: 1 },
    brake: { unit: '1', about: 'brake pedal', least: 0, most: 1 },
    direction: { unit: '1', about: 'selector: 1 forward, 0 neutral', least: 0, most: 1 },
    speedError: { unit: 'm/s', about: 'target less velocity' },
  },
  parameters: {
    mass: { unit: 'kg', about: 'mass that the driver reckons with', least: 1 },
    constantLoad: { unit: 'N', about: 'road load that the driver reckons with, constant', default: 0, least: 0 },
    quadraticLoad: { unit: 'N s2/m2', about: 'road load, quadratic', default: 0, least: 0 },
    acceleratorForce: { unit: 'N', about: 'force on the vehicle at full accelerator', least: 1 },
    brakeForce: { unit: 'N', about: 'force on the vehicle at full brake', least: 1 },
    gain: { unit: 'N s/m', about: 'force per speed missing', default: 6000, least: 0 },
    resetTime: { unit: 's', about: 'reset time of the integral', default: 4, least: 0.1 },
    previewTime: { unit: 's', about: 'how far ahead the driver looks', default: 0.5, least: 0.05, usual: [0.3, 1] },
    pedalRate: { unit: '1/s', about: 'greatest rate of a pedal', default: 2, least: 0.1, usual: [1, 3] },
    holdBrake: { unit: '1', about: 'brake pedal at standstill', default: 0.3, least: 0, most: 1 },
    stopBrake: { unit: '1', about: 'least brake pedal on the last way to a stop', default: 0.12, least: 0, most: 1 },
    holdSpeed: { unit: 'm/s', about: 'below this it is standstill', default: 0.15, least: 0.01 },
    neutralAfter: { unit: 's', about: 'standstill until neutral', default: 3, least: 0 },
    brakeThreshold: {
      unit: 'N',
      about: 'retarding force below which the foot stays off the brake',
      default: 200,
      least: 0,
    },
  },
  memory: {
    integral: { unit: 'N', about: 'integral part of the force' },
    accelerator: { unit: '1', about: 'accelerator pedal' },
    brake: { unit: '1', about: 'brake pedal' },
    standing: { unit: 's', about: 'time at standstill' },
  },
  build,
};

function build({ parameter, input, output, memory, step }: InstrumentSetup): InstrumentUpdate {
  const mass = parameter['mass']!;
  const constantLoad = parameter['constantLoad']!;
  const quadraticLoad = parameter['quadraticLoad']!;
  const acceleratorForce = parameter['acceleratorForce']!;
  const brakeForce = parameter['brakeForce']!;
  const gain = parameter['gain']!;
  const resetTime = parameter['resetTime']!;
  const previewTime = parameter['previewTime']!;
  const move = parameter['pedalRate']! * step;
  const slack = 0.02 * acceleratorForce;
  const holdBrake = parameter['holdBrake']!;
  const stopBrake = parameter['stopBrake']!;
  const holdSpeed = parameter['holdSpeed']!;
  const neutralAfter = parameter['neutralAfter']!;
  const threshold = parameter['brakeThreshold']!;
  const inTarget = input['target']!;
  const inAhead = input['targetAhead'] ?? -1;
  const inVelocity = input['velocity']!;
  const { integral, accelerator, brake, standing } = memory as Record<string, number> & {
    integral: number;
    accelerator: number;
    brake: number;
    standing: number;
  };
  const outAccelerator = output['accelerator']!;
  const outBrake = output['brake']!;
  const outDirection = output['direction']!;
  const outError = output['speedError']!;
  return (block, signals) => {
    const target = signals[inTarget]!;
    const ahead = inAhead < 0 ? target : signals[inAhead]!;
    const velocity = signals[inVelocity]!;
    const error = target - velocity;
    const stops = target < holdSpeed && ahead < holdSpeed;
    const stands = stops && velocity < holdSpeed;
    let wantedAccelerator = 0;
    let wantedBrake = holdBrake;
    let force = 0;
    if (!stands) {
      const load = (ahead > holdSpeed ? constantLoad : 0) + quadraticLoad * ahead * ahead;
      force = load + (mass * (ahead - target)) / previewTime + gain * error + block[integral]!;
      wantedAccelerator = force > 0 ? Math.min(force / acceleratorForce, 1) : 0;
      wantedBrake = force < -threshold ? Math.min((-force - threshold) / brakeForce, 1) : 0;
      if (stops) wantedBrake = Math.max(wantedBrake, stopBrake);
    }
    const pressing = block[accelerator]!;
    const braking = block[brake]!;
    // one foot: a pedal is pressed only when the other is released
    const a = braking > 0 && wantedBrake === 0 && wantedAccelerator > 0 ? 0 : wantedAccelerator;
    const b = pressing > 0 ? 0 : wantedBrake;
    const nextAccelerator = Math.min(Math.max(a, pressing - move), pressing + move);
    const nextBrake = Math.min(Math.max(b, braking - move), braking + move);
    block[accelerator] = nextAccelerator;
    block[brake] = nextBrake;
    block[standing] = stands ? block[standing]! + step : 0;
    if (stands) {
      block[integral] = 0;
    } else {
      // while the pedals cannot give what is wanted, the integral does not grow in that direction
      const done = nextAccelerator * acceleratorForce - (nextBrake > 0 ? nextBrake * brakeForce + threshold : 0);
      const coasts = force <= 0 && force >= -threshold && done === 0;
      const lacking = coasts ? 0 : force - done;
      const winds = lacking * error > 0 && Math.abs(lacking) > slack;
      if (!winds) block[integral] = block[integral]! + (step / resetTime) * gain * error;
    }
    signals[outAccelerator] = nextAccelerator;
    signals[outBrake] = nextBrake;
    signals[outDirection] = stands && block[standing]! >= neutralAfter ? 0 : 1;
    signals[outError] = error;
  };
}
