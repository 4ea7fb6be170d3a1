import type {
  AccumulatorFacts,
  BenchFacts,
  ChartFacts,
  HandFacts,
  PowerFacts,
  PressureFacts,
  RequirementFacts,
} from '../../bridge/live/source.js';
import type { BenchSpec, WatchedSignal } from '../../configs/bench-spec.js';
import type { SignalInfo } from '../../runtime/contract.js';
import type { ScriptSpec } from '../../runtime/script.js';
import { pressureSettings } from '../../runtime/watch-settings.js';
import { elementFacts } from './element-facts.js';
import { gasCurves } from './gas-curves.js';

/** s after the last sign of the page at which a hand lets go. */
const usualDeadMan = 0.6;

export interface BenchFactsOptions {
  readonly spec: BenchSpec;
  readonly script: ScriptSpec;
  /** The signals of a row. */
  readonly recorded: readonly SignalInfo[];
  readonly requirements?: readonly RequirementFacts[];
  /** Whether hands may act. */
  readonly control?: boolean;
}

/** What the live page has to know of a bench, from its checked file. Names only signals that are recorded. */
export function benchFacts({
  spec,
  script,
  recorded,
  requirements = [],
  control = false,
}: BenchFactsOptions): BenchFacts {
  const byPath = new Map(recorded.map((info) => [info.path, info]));
  const pressures = spec.watched
    .flatMap((watched) =>
      byPath.has(watched.path) && isNode(watched, spec) ? pressureFacts(watched, spec, byPath) : [],
    )
    .sort((a, b) => b.scaleMost - a.scaleMost);
  return {
    name: spec.name,
    about: spec.about,
    step: spec.step,
    ambientPressure: spec.ambient.pressure,
    invented: /\binvented\b/i.test(spec.about),
    elements: spec.circuit.elements.map((element) => elementFacts(element, byPath)),
    pressures,
    accumulators: accumulators(spec, byPath),
    messages: spec.map.messages.map((message) => ({
      name: message.name,
      about: message.about,
      link: message.link,
      direction: message.direction,
      period: message.every * spec.step,
      ...(message.direction === 'received' ? { timeout: message.timeout * spec.step } : {}),
    })),
    scenario: {
      name: script.name,
      about: script.about,
      steps: script.steps.map((step) => ({ name: step.name, about: step.target, at: step.at * spec.step })),
    },
    requirements,
    powers: powers(spec, byPath),
    hands: control ? hands(spec, byPath) : [],
    charts: charts(pressures, recorded),
  };
}

/** `highLine.pressure` becomes `High line`, `pumpMotor.inletPressure` becomes `Pump motor inlet pressure`. */
export function nameInWords(path: string): string {
  const words = path
    .replace(/\.pressure$/, '')
    .replaceAll('.', ' ')
    .replace(/([a-z0-9])([A-Z])/g, '$1 $2')
    .toLowerCase();
  return words.charAt(0).toUpperCase() + words.slice(1);
}

/** A store's own pressure, or the inlet of a machine; not what the watch sees of the same oil under another name. */
function isNode(watched: WatchedSignal, spec: BenchSpec): boolean {
  const element = spec.circuit.elements.find(({ name }) => watched.path.startsWith(`${name}.`));
  if (element?.kind.role === 'branch') return watched.limits.some((limit) => limit.level === 'below least inlet');
  return (
    !watched.path.endsWith('.gasPressure') || !spec.watched.some((other) => other.path === `${element?.name}.pressure`)
  );
}

/** Top of the scale for a pressure without upper setting: that of the lower side of the machine, else 20 bar. */
function scaleOf(watched: WatchedSignal, spec: BenchSpec): number {
  const element = spec.circuit.elements.find(({ name }) => watched.path.startsWith(`${name}.`));
  const low = element?.connections['low'] ?? element?.connections['inlet'];
  const other = spec.watched.find((candidate) => candidate.path === `${low?.store}.pressure`);
  const { relief, maximumAllowable } = other === undefined ? {} : pressureSettings(other);
  return maximumAllowable ?? relief ?? spec.ambient.pressure + 20e5;
}

function pressureFacts(
  watched: WatchedSignal,
  spec: BenchSpec,
  byPath: ReadonlyMap<string, SignalInfo>,
): PressureFacts[] {
  if (watched.unit !== 'Pa') return [];
  const { precharge, leastInlet, casePressure, ...settings } = pressureSettings(watched);
  const base = spec.ambient.pressure;
  const relief = settings.relief;
  const maximum = settings.maximumAllowable ?? casePressure;
  const highest = Math.max(
    maximum ?? 0,
    relief ?? 0,
    (precharge ?? base) * 1.5,
    maximum === undefined && relief === undefined ? scaleOf(watched, spec) : 0,
  );
  const least = precharge ?? leastInlet;
  // the pressures about which the watch has nothing to say
  const most = relief === undefined ? maximum : base + (relief - base) * (1 - watched.vicinity);
  const timeToRelief = `watch.${watched.path}.timeToRelief`;
  return [
    {
      name: nameInWords(watched.path),
      path: watched.path,
      ...(precharge === undefined ? {} : { precharge }),
      ...(leastInlet === undefined ? {} : { leastInlet }),
      ...(least === undefined || most === undefined ? {} : { workingLeast: least, workingMost: most }),
      ...(relief === undefined ? {} : { relief }),
      ...(maximum === undefined ? {} : { maximumAllowable: maximum }),
      scaleMost: base + (highest - base) * 1.15,
      ...(byPath.has(timeToRelief) ? { timeToRelief } : {}),
    },
  ];
}

function accumulators(spec: BenchSpec, byPath: ReadonlyMap<string, SignalInfo>): AccumulatorFacts[] {
  return spec.circuit.elements.flatMap(({ name, kind, parameters }) => {
    const [pressure, volume, temperature] = [`${name}.gasPressure`, `${name}.gasVolume`, `${name}.gasTemperature`];
    const { precharge, volume: gasVolume, maximumAllowable } = parameters;
    if (!byPath.has(pressure) || !byPath.has(volume) || precharge === undefined || gasVolume === undefined) return [];
    return [
      {
        name: nameInWords(name),
        pressure,
        volume,
        ...(byPath.has(temperature) ? { temperature } : {}),
        precharge,
        prechargeTemperature: parameters['prechargeTemperature'] ?? 293.15,
        gasVolume,
        ...(kind.kind === 'gas-accumulator' ? { curves: gasCurves(parameters) } : {}),
        ...(maximumAllowable === undefined || maximumAllowable === 0 ? {} : { maximumAllowable }),
      },
    ];
  });
}

function powers(spec: BenchSpec, byPath: ReadonlyMap<string, SignalInfo>): PowerFacts[] {
  const found: PowerFacts[] = [];
  const add = (name: string, path: string, role: PowerFacts['role']) => {
    if (byPath.get(path)?.unit === 'W') found.push({ name, path, role });
  };
  add('All that comes in', 'ledger.supply', 'supply');
  for (const { name } of spec.circuit.elements) add(nameInWords(name), `${name}.supply`, 'supply');
  for (const { name, kind } of spec.circuit.elements)
    if (kind.heat === 'kept') add(nameInWords(name), `${name}.loss`, 'kept loss');
  add('All that leaves', 'ledger.leaving', 'leaving loss');
  for (const { name, kind } of spec.circuit.elements)
    if (kind.heat === 'leaves') add(nameInWords(name), `${name}.loss`, 'leaving loss');
  add('Does not balance', 'ledger.residual', 'residual');
  return found;
}

/** Commands of valves, clutches, brakes and displacements, pedals of a driver, faults, key and supply. */
function hands(spec: BenchSpec, byPath: ReadonlyMap<string, SignalInfo>): HandFacts[] {
  const found: HandFacts[] = [];
  for (const instrument of spec.instruments) {
    for (const [output, { unit, least, most }] of Object.entries(instrument.kind.outputs)) {
      if (instrument.kind.kind !== 'driver' || least === undefined || most === undefined || unit !== '1') continue;
      const path = `${instrument.name}.${output}`;
      const gear = /direction|gear/.test(output);
      if (byPath.has(path))
        found.push({
          path,
          name: nameInWords(path),
          kind: gear ? 'gear' : 'pedal',
          unit,
          least,
          most,
          rest: 0,
          increment: gear ? 1 : 0.01,
          deadMan: usualDeadMan,
        });
    }
  }
  for (const { name, kind } of spec.circuit.elements) {
    for (const [command, { unit, rest, least, most, fault }] of Object.entries(kind.commands)) {
      const path = `${name}.${command}`;
      if (!byPath.has(path) || least === undefined || most === undefined) continue;
      const base = { path, name: `${nameInWords(path)}`, unit, least, most, rest, increment: (most - least) / 100 };
      if (fault) found.push({ ...base, kind: 'fault' });
      else if (unit === '1')
        found.push({ ...base, kind: /displacement/i.test(command) ? 'displacement' : 'valve', deadMan: usualDeadMan });
    }
  }
  const switches = [
    ['life.key', 'Key', 'key'],
    ['life.supply', 'Supply', 'supply'],
  ] as const;
  for (const [path, name, kind] of switches)
    if (byPath.has(path)) found.push({ path, name, kind, unit: '1', least: 0, most: 1, rest: 1 });
  return found;
}

/** Charts to begin with: the highest pressures, the flows, velocity, shafts. */
function charts(pressures: readonly PressureFacts[], recorded: readonly SignalInfo[]): ChartFacts[] {
  const sorted = [...pressures].sort((a, b) => b.scaleMost - a.scaleMost);
  const high = sorted.filter((pressure) => pressure.scaleMost > sorted[0].scaleMost * 0.5);
  const low = sorted.filter((pressure) => !high.includes(pressure));
  const of = (unit: string, pattern: RegExp) =>
    recorded.filter((info) => info.unit === unit && pattern.test(info.path)).map((info) => info.path);
  const all: ChartFacts[] = [
    { name: 'High pressure', paths: high.slice(0, 4).map((pressure) => pressure.path) },
    { name: 'Flow', paths: of('m3/s', /\.flow$/).slice(0, 4) },
    { name: 'Velocity', paths: of('m/s', /velocity$|targetSpeed$/).slice(0, 3) },
    { name: 'Low pressure', paths: low.slice(0, 4).map((pressure) => pressure.path) },
    { name: 'Torque', paths: of('N m', /\.torque$/).slice(0, 4) },
  ];
  return all.filter((chart) => chart.paths.length > 0);
}
