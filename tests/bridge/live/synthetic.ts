import type {
  Acknowledgement,
  BenchFacts,
  Hand,
  HandCommand,
  LiveEvent,
  LiveSink,
  LiveSource,
  LiveStatus,
  WarningStatus,
} from '../../../bridge/live/source.js';
import type { SignalGroup, SignalInfo } from '../../../runtime/contract.js';
import { syntheticFacts } from './synthetic-facts.js';

/**
 * A bench that does not exist: invented numbers that follow the tick alone, so that the live view can be shown and
 * tested without a plant. Used by tests only; the product never shows it.
 */
export interface SyntheticBench {
  readonly source: LiveSource;
  /** Makes rows up to and including `tick` and hands them over in one batch. */
  advance(toTick: number): void;
  /** Follows the wall clock from now on, until the answer is called. */
  run(speed?: number): () => void;
  readonly tick: number;
  /** Adds `amount` Pa to the high line's pressure in exactly one tick. */
  spike(atTick: number, amount: number): void;
  /** Every command that arrived. */
  readonly commands: { command: HandCommand; hand: Hand }[];
  event(kind: string, subject: string, a: number, b?: number, c?: number): void;
  value(path: string): number;
  /** Text of each signal's value at a tick, as a recording would hold it. */
  valueAt(path: string, tick: number): number;
}

const bar = 1e5;
const atmosphere = 101325;

function signal(
  path: string,
  unit: string,
  about: string,
  group: SignalGroup = 'reading',
  least?: number,
  most?: number,
): SignalInfo {
  return {
    path,
    unit,
    about,
    group,
    ...(least === undefined ? {} : { least }),
    ...(most === undefined ? {} : { most }),
  };
}

/** The invented values at a tick; `set` are hands and faults. */
type Value = (time: number, set: ReadonlyMap<string, number>) => number;

const cycle = 48;
/** 0 .. 1: share of the usable charge, over a cycle of braking, holding, boosting and an overcharge. */
function charge(time: number): number {
  const t = time % cycle;
  const ramp = (from: number, to: number) => {
    const x = Math.min(1, Math.max(0, (t - from) / (to - from)));
    return x * x * (3 - 2 * x);
  };
  return (
    0.12 + 0.7 * ramp(4, 11) - 0.62 * ramp(15, 22) + 0.7 * ramp(26, 33) + 0.06 * ramp(34, 37) - 0.84 * ramp(40, 47)
  );
}
function chargeRate(time: number): number {
  return (charge(time + 0.005) - charge(Math.max(0, time - 0.005))) / 0.01;
}
const gasVolume0 = 0.05;
const volume = (time: number) => 0.0465 - 0.0222 * charge(time);
const pressure = (time: number) => 151 * bar * (gasVolume0 / volume(time)) ** (1.19 + 0.02 * Math.sin(time / 9));
/** Small and deterministic, in place of noise. */
const ripple = (time: number, rate: number) => Math.sin(time * rate) * 0.6 + Math.sin(time * rate * 2.371 + 1) * 0.4;
const flow = (time: number) => 0.0222 * chargeRate(time);
const speed = (time: number) => Math.max(0, 9 - 15 * (charge(time) - 0.4) + 0.6 * Math.sin(time / 5));
const faulty = (set: ReadonlyMap<string, number>, path: string) => set.get(path) ?? 0;

const table: readonly [SignalInfo, Value][] = [
  [signal('highAccumulator.gasPressure', 'Pa', 'gas pressure, absolute', 'reading', 0, 400 * bar), (t) => pressure(t)],
  [signal('highAccumulator.gasVolume', 'm3', 'gas volume', 'reading', 0, 0.05), (t) => volume(t)],
  [
    signal('highAccumulator.gasTemperature', 'K', 'gas temperature', 'state', 230, 420),
    (t) => 296 + 34 * charge(t) - 5 * Math.sin(t / 7),
  ],
  [signal('highAccumulator.oilVolume', 'm3', 'oil volume', 'reading', 0, 0.05), (t) => gasVolume0 - volume(t)],
  [
    signal('highLine.pressure', 'Pa', 'pressure, absolute', 'reading', 0, 420 * bar),
    (t) => pressure(t) + flow(t) * 2.2e8 + 0.5 * bar * ripple(t, 140),
  ],
  [signal('highLine.temperature', 'K', 'oil temperature', 'state', 250, 400), (t) => 318 + 4 * Math.sin(t / 31)],
  [
    signal('lowLine.pressure', 'Pa', 'pressure, absolute', 'reading', 0, 40 * bar),
    (t) => 9 * bar - 3.2 * bar * charge(t) - flow(t) * 6e7 + 0.05 * bar * ripple(t, 90),
  ],
  [
    signal('lowAccumulator.gasPressure', 'Pa', 'gas pressure, absolute', 'reading', 0, 40 * bar),
    (t) => 9 * bar - 3.2 * bar * charge(t),
  ],
  [signal('lowAccumulator.gasVolume', 'm3', 'gas volume', 'reading', 0, 0.06), (t) => 0.021 + 0.0206 * charge(t)],
  [
    signal('caseVolume.pressure', 'Pa', 'case pressure, absolute', 'reading', 0, 10 * bar),
    (t) => 1.6 * bar + 0.1 * bar * ripple(t, 31),
  ],
  [signal('isolation.opening', '1', 'opening', 'state', 0, 1), (_t, set) => faulty(set, 'isolation.command.held') || 1],
  [
    signal('isolation.volumeFlow', 'm3/s', 'flow from the accumulator to the line', 'reading', -0.005, 0.005),
    (t) => -flow(t),
  ],
  [
    signal('isolation.stuck', '1', 'fault: stuck where it is', 'command', 0, 1),
    (_t, set) => faulty(set, 'isolation.stuck'),
  ],
  [
    signal('mainRelief.volumeFlow', 'm3/s', 'flow through the relief valve', 'reading', 0, 0.004),
    (t) => Math.max(0, pressure(t) - 330 * bar) * 4e-10,
  ],
  [
    signal('mainRelief.opening', '1', 'opening', 'reading', 0, 1),
    (t) => Math.min(1, Math.max(0, pressure(t) - 330 * bar) / (15 * bar)),
  ],
  [signal('lowRelief.volumeFlow', 'm3/s', 'flow through the relief valve', 'reading', 0, 0.004), () => 0],
  [
    signal('pumpMotor.displacement', '1', 'share of full displacement', 'state', -1, 1),
    (t) => Math.max(-1, Math.min(1, flow(t) * 260)),
  ],
  [signal('pumpMotor.torque', 'N m', 'torque on the shaft', 'reading', -700, 700), (t) => -flow(t) * 1.62e5],
  [signal('pumpMotor.volumeFlow', 'm3/s', 'flow from low to high', 'reading', -0.005, 0.005), (t) => flow(t)],
  [signal('pumpMotor.leak', '1', 'fault: leak factor', 'command', 0, 20), (_t, set) => set.get('pumpMotor.leak') ?? 1],
  [
    signal('pumpMotor.displacementCommand', '1', 'commanded displacement', 'command', -1, 1),
    (t, set) => set.get('pumpMotor.displacementCommand') ?? Math.max(-1, Math.min(1, flow(t) * 266)),
  ],
  [signal('clutch.engagement', '1', 'engagement', 'state', 0, 1), (t) => (speed(t) > 1.2 ? 1 : 0)],
  [signal('clutch.torque', 'N m', 'torque', 'reading', -900, 900), (t) => -flow(t) * 2.2e5],
  [signal('propShaft.speed', 'rad/s', 'speed', 'state', 0, 300), (t) => speed(t) * 11.2],
  [signal('wheels.force', 'N', 'force at the wheels', 'reading', -20000, 20000), (t) => -flow(t) * 4.6e6],
  [signal('vehicle.velocity', 'm/s', 'velocity', 'state', 0, 30), (t) => speed(t)],
  [
    signal('driver.brakePedal', '1', 'brake pedal', 'instrument', 0, 1),
    (t, set) => set.get('driver.brakePedal') ?? Math.max(0, Math.min(1, flow(t) * 220)),
  ],
  [
    signal('driver.acceleratorPedal', '1', 'accelerator pedal', 'instrument', 0, 1),
    (t, set) => set.get('driver.acceleratorPedal') ?? Math.max(0, Math.min(1, -flow(t) * 220)),
  ],
  [signal('driver.gear', '1', 'selector', 'instrument', -1, 1), (_t, set) => set.get('driver.gear') ?? 1],
  [
    signal('highPressureSensor.value', 'Pa', 'sensed pressure, absolute', 'instrument', 0, 401 * bar),
    (t) => Math.round((pressure(t - 0.004) + flow(t) * 2.2e8 + 0.3 * bar * ripple(t, 611)) / 5e4) * 5e4,
  ],
  [signal('supply.on', '1', 'supply', 'run', 0, 1), (_t, set) => set.get('supply.on') ?? 1],
  [signal('key.on', '1', 'key', 'run', 0, 1), (_t, set) => set.get('key.on') ?? 1],
  [
    signal('ledger.roadPower', 'W', 'power from the road', 'ledger'),
    (t) => Math.max(-9e4, Math.min(9e4, flow(t) * pressure(t) * 1.16)),
  ],
  [signal('ledger.gasPower', 'W', 'power into the gas', 'ledger'), (t) => flow(t) * pressure(t)],
  [
    signal('ledger.pumpMotorLoss', 'W', 'loss of the pump-motor', 'ledger', 0),
    (t) => Math.abs(flow(t)) * pressure(t) * 0.09 + 420,
  ],
  [signal('ledger.isolationLoss', 'W', 'loss of the isolation valve', 'ledger', 0), (t) => flow(t) ** 2 * 9e8],
  [
    signal('ledger.reliefLoss', 'W', 'loss of the relief valve', 'ledger', 0),
    (t) => Math.max(0, pressure(t) - 330 * bar) * 4e-10 * pressure(t),
  ],
  [signal('ledger.gasToWall', 'W', 'heat from the gas to the wall', 'ledger'), (t) => 900 * (charge(t) - 0.3)],
  [signal('ledger.residual', 'W', 'power that does not balance', 'ledger'), (t) => 0.02 * Math.sin(t * 3)],
  [signal('clock.lateness', 's', 'lateness of the tick', 'timing', 0), (t) => 8e-6 + 5e-6 * Math.abs(ripple(t, 777))],
];

/** Signals that make the list as long as a large bench's. */
function fillers(count: number): [SignalInfo, Value][] {
  return Array.from({ length: count }, (_, i) => [
    signal(`spare${i + 1}.value`, 'K', `invented temperature ${i + 1}`, 'reading', 250, 400),
    (t: number) => 300 + 20 * Math.sin(t / (3 + i)),
  ]);
}

const kinds = [
  { name: 'scenarioStep', severity: 'note', text: 'scenario step {subject} begins' },
  { name: 'nearRelief', severity: 'warning', text: '{subject} is near its relief setting: {a:Pa}, setting {b:Pa}' },
  { name: 'reliefPassing', severity: 'alarm', text: 'the relief valve of {subject} passes: {a:Pa}, setting {b:Pa}' },
  { name: 'messageLost', severity: 'warning', text: 'message {subject} timed out after {a:s}' },
  { name: 'hand', severity: 'note', text: 'a hand set {subject} to {a:1}' },
  { name: 'note', severity: 'note', text: 'note: {subject}' },
  { name: 'acknowledged', severity: 'note', text: 'warning of {subject} acknowledged' },
] as const;

export interface SyntheticOptions {
  readonly control?: boolean;
  readonly extraSignals?: number;
  readonly facts?: (facts: BenchFacts) => BenchFacts;
}

export function syntheticBench(options: SyntheticOptions = {}): SyntheticBench {
  const rows = [...table, ...fillers(options.extraSignals ?? 0)];
  const signals = rows.map((row) => row[0]);
  const index = new Map(signals.map((info, i) => [info.path, i]));
  const facts = options.facts?.(syntheticFacts) ?? syntheticFacts;
  const sinks = new Set<LiveSink>();
  const set = new Map<string, number>();
  const spikes = new Map<number, number>();
  const commands: { command: HandCommand; hand: Hand }[] = [];
  const subjects: string[] = facts.scenario.steps.map((candidate) => candidate.name);
  const warnings = new Map<string, WarningStatus>();
  let tick = -1;
  let step = -1;
  let stepSince = 0;
  let held: 'not started' | 'running' | 'held' | 'ended' = 'running';
  let identifier = 0;
  const present = new Float32Array(signals.length);

  const valueAt = (path: string, at: number): number => {
    const i = index.get(path);
    if (i === undefined) throw new Error(`no signal ${path}`);
    const spike = path === 'highLine.pressure' ? (spikes.get(at) ?? 0) : 0;
    return Math.fround(rows[i][1](at * 0.001, set) + spike);
  };
  const subjectNumber = (name: string) => {
    const known = subjects.indexOf(name);
    return known >= 0 ? known : subjects.push(name) - 1;
  };
  const raise = (event: LiveEvent) => {
    for (const sink of sinks) sink.event(event);
  };
  const event = (kind: string, subject: string, a: number, b = 0, c = 0) =>
    raise({
      tick: Math.max(0, tick),
      kind: kinds.findIndex((k) => k.name === kind),
      subject: subjectNumber(subject),
      a,
      b,
      c,
    });

  function watch(level: string, severity: 'warning' | 'alarm', setting: number, meaning: string, kind: string): void {
    const path = 'highLine.pressure';
    const value = present[index.get(path)!];
    const known = warnings.get(level);
    const active = value > setting;
    if (active && (known === undefined || (known.acknowledged && !known.active))) {
      identifier += 1;
      warnings.set(level, {
        identifier,
        path,
        level,
        severity,
        unit: 'Pa',
        setting,
        peak: value,
        sinceTick: tick,
        active,
        acknowledged: false,
        meaning,
      });
      event(kind, 'highLine', value, setting);
    } else if (known !== undefined) {
      if (!active && known.acknowledged) warnings.delete(level);
      else warnings.set(level, { ...known, active, peak: Math.max(known.peak, value) });
    }
  }

  function advance(toTick: number): void {
    const count = toTick - tick;
    if (count <= 0) return;
    const ticks = new Float64Array(count);
    const values = new Float32Array(count * signals.length);
    for (let r = 0; r < count; r += 1) {
      tick += 1;
      ticks[r] = tick;
      for (let i = 0; i < signals.length; i += 1) {
        const spike = signals[i].path === 'highLine.pressure' ? (spikes.get(tick) ?? 0) : 0;
        present[i] = rows[i][1](tick * 0.001, set) + spike;
      }
      values.set(present, r * signals.length);
      watch(
        'near relief',
        'warning',
        315 * bar + atmosphere,
        'The controller should stop charging now; a little later the relief valve would turn the charge into heat.',
        'nearRelief',
      );
      watch(
        'relief passing',
        'alarm',
        330 * bar + atmosphere,
        'The relief valve passes oil at full pressure: the braking energy becomes heat, and the valve and oil get hot within seconds.',
        'reliefPassing',
      );
      const t = (tick * 0.001) % cycle;
      const now = facts.scenario.steps.reduce((last, candidate, i) => (t >= (candidate.at ?? 0) ? i : last), -1);
      if (now !== step) {
        step = now;
        stepSince = tick;
        if (now >= 0) event('scenarioStep', facts.scenario.steps[now].name, now);
      }
    }
    for (const sink of sinks) sink.rows(ticks, values, count);
  }

  async function command(order: HandCommand, hand: Hand): Promise<Acknowledgement> {
    commands.push({ command: order, hand });
    if (order.kind === 'set') {
      set.set(order.path, order.value);
      event('hand', order.path, order.value);
    } else if (order.kind === 'release') set.delete(order.path);
    else if (order.kind === 'note') event('note', order.text, 0);
    else if (order.kind === 'scenario')
      held = order.action === 'hold' ? 'held' : order.action === 'end' ? 'ended' : 'running';
    else {
      const found = [...warnings.values()].find((warning) => warning.identifier === order.warning);
      if (found === undefined) return { ok: false, tick: -1, text: `there is no warning ${order.warning}` };
      if (found.active) warnings.set(found.level, { ...found, acknowledged: true });
      else warnings.delete(found.level);
      event('acknowledged', 'highLine', order.warning);
    }
    return { ok: true, tick, text: 'done' };
  }

  const status = (): LiveStatus => ({
    run: {
      phase: held === 'ended' ? 'ended' : 'running',
      pace: 'live',
      tick,
      wallClock: 1_767_225_600_000 + Math.max(0, tick),
      notValid: [],
      hands: commands.length,
      droppedRows: 0,
    },
    scenario: { state: held, step, sinceTick: stepSince },
    warnings: [...warnings.values()],
    messages: facts.messages.map((message, i) => ({
      age: ((tick + i * 3) % Math.round(message.period * 1000)) / 1000,
      rate: 1 / message.period,
      count: Math.floor(tick / (message.period * 1000)),
      lost: i === 1 ? 2 : 0,
      late: i === 1 ? 1 : 0,
      malformed: 0,
      timedOut: false,
    })),
    timing: {
      lateness: histogram([2, 5, 10, 20, 50, 100, 200, 500], tick, 9, 3e-4),
      stepTime: histogram([10, 15, 20, 30, 50, 100, 200, 500], tick, 14, 5e-4),
      overruns: 0,
      collections: 3,
      drift: 0,
    },
    requirements: facts.requirements.map((_, i) =>
      i === 3
        ? { verdict: 'not yet judged', margin: Number.NaN, atTick: -1 }
        : i === 1
          ? { verdict: 'violated', margin: -2.4 * bar, atTick: 34_100 }
          : {
              verdict: 'holds so far',
              margin: [14.2 * bar, 0, 0.31][i] ?? 0.08,
              atTick: Math.max(0, Math.min(tick, 33_000)),
            },
    ),
  });

  const source: LiveSource = {
    bench: options.control ? facts : { ...facts, hands: [] },
    signals,
    events: { kinds, subjects },
    attach(sink) {
      sinks.add(sink);
      return () => sinks.delete(sink);
    },
    status,
    ...(options.control ? { command } : {}),
  };
  return {
    source,
    advance,
    run(speed = 1) {
      const started = Date.now();
      const from = tick;
      const timer = setInterval(() => advance(Math.floor(from + (Date.now() - started) * speed)), 10);
      return () => clearInterval(timer);
    },
    get tick() {
      return tick;
    },
    spike: (at, amount) => void spikes.set(at, amount),
    commands,
    event,
    value: (path) => present[index.get(path) ?? -1],
    valueAt,
  };
}

function histogram(microseconds: number[], tick: number, typical: number, budget: number) {
  const edges = microseconds.map((value) => value * 1e-6);
  const weight = [...microseconds, 1000].map((edge) => Math.exp(-((Math.log(edge / typical) / 0.55) ** 2)));
  const sum = weight.reduce((a, b) => a + b, 0);
  return { edges, counts: weight.map((share) => Math.floor((share / sum) * Math.max(0, tick))), most: 118e-6, budget };
}
