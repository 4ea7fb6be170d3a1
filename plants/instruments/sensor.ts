import type { InstrumentKind, InstrumentSetup, InstrumentUpdate } from '../../runtime/instrument.js';
import { gaussian, uniform } from '../../runtime/noise.js';

/** Streams of chance beside the noise of the instruments, which have the low numbers. */
const dropoutStream = 100_000;
const spikeStream = 200_000;

/** What tells one kind of sensor from another; `input` stands for the unit of whatever it is tied to. */
interface SensorSort {
  readonly kind: string;
  readonly about: string;
  readonly unit: string;
}

/**
 * A sensor: first-order lag, calibration error, noise, range, quantisation, then a pure delay. `valid` is 0 while the
 * value is held at an end of the range, while it is lost, and stays 1 when it is stuck: a stuck sensor does not know.
 */
function sensor({ kind, about, unit }: SensorSort): InstrumentKind {
  const anyUnit = unit === 'input';
  return {
    kind,
    about,
    source: 'first-order lag, Gaussian noise and uniform quantisation: common practice, no source',
    stage: 'after',
    inputs: { of: { unit: anyUnit ? '1' : unit, about: 'the true signal', ...(anyUnit ? { anyUnit } : {}) } },
    outputs: {
      value: { unit: anyUnit ? '1' : unit, about: 'what the sensor says', ...(anyUnit ? { unitOf: 'of' } : {}) },
      valid: { unit: '1', about: '1 when the value is inside the range and not lost', least: 0, most: 1 },
    },
    parameters: {
      least: { unit, about: 'lower end of the range' },
      most: { unit, about: 'upper end of the range' },
      lag: { unit: 's', about: 'first-order lag', default: 0, least: 0, usual: [0, 5] },
      noise: { unit, about: 'standard deviation of the noise', default: 0, least: 0, difference: true },
      resolution: { unit, about: 'step of quantisation; 0: none', default: 0, least: 0, difference: true },
      delay: { unit: 's', about: 'pure delay, a whole number of ticks', default: 0, least: 0, most: 2 },
      zeroError: { unit, about: 'constant error', default: 0, difference: true },
      spanError: { unit: '1', about: 'error in proportion to the value', default: 0, least: -0.5, most: 0.5 },
    },
    commands: {
      drift: {
        unit,
        about: 'error added to the value: at once an offset, over a time a drift',
        rest: 0,
        fault: true,
        difference: true,
      },
      stuck: { unit: '1', about: '1: the value stays as it is', rest: 0, least: 0, most: 1, fault: true },
      lost: { unit: '1', about: '1: wire broken, the lower end of the range', rest: 0, least: 0, most: 1, fault: true },
      gainFactor: {
        unit: '1',
        about: 'factor on the value: a wrong scale',
        rest: 1,
        least: -10,
        most: 10,
        fault: true,
      },
      addedNoise: {
        unit,
        about: 'standard deviation of further noise',
        rest: 0,
        least: 0,
        fault: true,
        difference: true,
      },
      addedLag: { unit: 's', about: 'further first-order lag', rest: 0, least: 0, most: 100, fault: true },
      spikes: {
        unit: '1',
        about: 'share of the ticks in which it jumps to the upper end of its range',
        rest: 0,
        least: 0,
        most: 1,
        fault: true,
      },
      dropouts: {
        unit: '1',
        about: 'share of the ticks in which it has no value and keeps the last',
        rest: 0,
        least: 0,
        most: 1,
        fault: true,
      },
      shortToSupply: {
        unit: '1',
        about: '1: shorted to its supply, the upper end of the range',
        rest: 0,
        least: 0,
        most: 1,
        fault: true,
      },
      shortToGround: {
        unit: '1',
        about: '1: shorted to ground, the lower end of the range',
        rest: 0,
        least: 0,
        most: 1,
        fault: true,
      },
    },
    memory: {
      started: { unit: '1', about: '1 after the first tick' },
      filtered: { unit: anyUnit ? '1' : unit, about: 'behind the lag' },
      held: { unit: anyUnit ? '1' : unit, about: 'what it said last' },
      draw: { unit: '1', about: 'the noise drawn last, in standard deviations' },
      slowed: { unit: anyUnit ? '1' : unit, about: 'behind the lag of a fault' },
      chance: { unit: '1', about: 'a number drawn last, 0 to 1' },
    },
    extraMemory: (parameter, step) => Math.round(parameter['delay']! / step),
    build,
  };
}

function build({
  parameter,
  input,
  output,
  memory,
  extra,
  command,
  seed,
  identity,
  step,
}: InstrumentSetup): InstrumentUpdate {
  const least = parameter['least']!;
  const most = parameter['most']!;
  const lag = parameter['lag']!;
  const noise = parameter['noise']!;
  const resolution = parameter['resolution']!;
  const zeroError = parameter['zeroError']!;
  const gain = 1 + parameter['spanError']!;
  const share = lag > 0 ? 1 - Math.exp(-step / lag) : 1;
  const length = Math.round(parameter['delay']! / step);
  const from = input['of']!;
  const value = output['value']!;
  const valid = output['valid']!;
  const started = memory['started']!;
  const filtered = memory['filtered']!;
  const held = memory['held']!;
  const draw = memory['draw']!;
  const drift = command['drift']!;
  const stuck = command['stuck']!;
  const lost = command['lost']!;
  const gainFactor = command['gainFactor']!;
  const addedNoise = command['addedNoise']!;
  const addedLag = command['addedLag']!;
  const spikes = command['spikes']!;
  const dropouts = command['dropouts']!;
  const shortToSupply = command['shortToSupply']!;
  const shortToGround = command['shortToGround']!;
  const slowed = memory['slowed']!;
  const chance = memory['chance']!;
  return (block, signals, tick) => {
    const first = block[started] === 0;
    const truth = signals[from]!;
    const smooth = first ? truth : block[filtered]! + share * (truth - block[filtered]!);
    block[filtered] = smooth;
    const slow = block[addedLag]!;
    block[slowed] =
      first || slow <= 0 ? smooth : block[slowed]! + (1 - Math.exp(-step / slow)) * (smooth - block[slowed]!);
    const further = block[addedNoise]!;
    const spread = further > 0 ? Math.sqrt(noise * noise + further * further) : noise;
    if (spread > 0) gaussian(seed, identity, tick, block, draw);
    const raw = block[slowed]! * gain * block[gainFactor]! + zeroError + block[drift]! + spread * block[draw]!;
    const inside = raw >= least && raw <= most;
    // not a choice between `raw` and a captured constant: V8 boxes the outcome of one
    const clipped = Math.min(Math.max(raw, least), most);
    const said = resolution > 0 ? least + Math.round((clipped - least) / resolution) * resolution : clipped;
    const isHigh = block[shortToSupply]! >= 0.5;
    const isLost = block[lost]! >= 0.5 || block[shortToGround]! >= 0.5;
    let isOut = isLost || isHigh;
    if (isOut) block[held] = isLost ? least : most;
    else if (first || block[stuck]! < 0.5) {
      if (block[dropouts]! > 0) {
        uniform(seed, identity + dropoutStream, tick, block, chance);
        if (block[chance]! < block[dropouts]!) isOut = true;
      }
      if (!isOut || first) block[held] = said;
      if (block[spikes]! > 0) {
        uniform(seed, identity + spikeStream, tick, block, chance);
        if (block[chance]! < block[spikes]!) block[held] = most;
      }
    }
    let shown = block[held]!;
    if (length > 0) {
      const at = extra + (tick % length);
      if (first) for (let i = 0; i < length; i += 1) block[extra + i] = shown;
      const before = block[at]!;
      block[at] = shown;
      shown = before;
    }
    block[started] = 1;
    signals[value] = shown;
    signals[valid] = isOut || !(inside || block[stuck]! >= 0.5) ? 0 : 1;
  };
}

export const pressureSensor = sensor({ kind: 'pressure-sensor', about: 'pressure sensor', unit: 'Pa' });
export const speedSensor = sensor({ kind: 'speed-sensor', about: 'sensor of an angular speed', unit: 'rad/s' });
export const velocitySensor = sensor({ kind: 'velocity-sensor', about: 'sensor of a velocity', unit: 'm/s' });
export const temperatureSensor = sensor({ kind: 'temperature-sensor', about: 'temperature sensor', unit: 'K' });
export const torqueSensor = sensor({ kind: 'torque-sensor', about: 'torque sensor', unit: 'N m' });
export const positionSensor = sensor({
  kind: 'position-sensor',
  about: 'sensor of a position, angle or share',
  unit: 'input',
});
export const anySensor = sensor({ kind: 'sensor', about: 'sensor of any signal', unit: 'input' });
