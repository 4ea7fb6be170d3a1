import type { BenchSpec } from '../../configs/bench-spec.js';
import { standardAtmosphere, tradeUnit } from '../../configs/units.js';
import type { EventKind } from '../../runtime/journal.js';
import type { ScriptSpec } from '../../runtime/script.js';
import { laddersOf } from '../../runtime/watch-ladders.js';
import { watchLevelNames } from '../../runtime/watch-levels.js';
import { pressureSettings } from '../../runtime/watch-settings.js';
import { eventText } from './event-text.js';
import type {
  TerminalCharge,
  TerminalFrame,
  TerminalHeadline,
  TerminalLink,
  TerminalNote,
  TerminalPressure,
  TerminalStep,
  TerminalTiming,
} from './frame.js';

export interface FeedOptions {
  readonly spec: BenchSpec;
  readonly script: ScriptSpec;
  /** Columns of the rows. */
  readonly signals: readonly { readonly path: string; readonly unit: string }[];
  readonly events: { readonly kinds: readonly EventKind[]; readonly subjects: readonly string[] };
  readonly pace: 'live' | 'fast';
  /** Planned length, ticks. */
  readonly ticks: number;
}

/**
 * What is shown of a signal at the top: element or instrument kind, signal, label, unit, in the order of the view. Where
 * a bench has several of the kind, the element's name goes before the label.
 */
const headlineTable: readonly (readonly [kind: string, signal: string, label: string, unit: string])[] = [
  ['vehicle', 'velocity', 'speed', 'km/h'],
  ['vehicle', 'grade', 'grade', '%'],
  ['stepped-gearbox', 'gear', 'gear', '1'],
  ['driver', 'accelerator', 'accelerator', '%'],
  ['driver', 'brake', 'brake pedal', '%'],
  ['pump-motor', 'torque', 'pump-motor', 'N m'],
  ['pump-motor', 'displacement', 'displacement', '%'],
  ['combustion-engine', 'torque', 'engine', 'N m'],
];
const mostHeadlines = 9;
/** The rate of messages is counted over this time, s. */
const rateWindow = 1;

/**
 * Makes frames and notes of any bench from what the host thread sees of it: rows of recorded signals and events. Shows
 * what is recorded of the vehicle, the driver and the machines, every pressure with settings, every accumulator's charge,
 * every link.
 */
export class TerminalFeed {
  private readonly at = new Map<string, number>();
  private readonly headlines: readonly { label: string; path: string; unit: string }[];
  private readonly pressures: readonly ((values: ArrayLike<number>) => TerminalPressure)[];
  private readonly charges: readonly { label: string; charge: string; gas: string }[];
  private readonly largest = new Map<string, number>();
  private readonly counted = new Map<string, { time: number; count: number; rate: number }>();

  constructor(private readonly options: FeedOptions) {
    options.signals.forEach(({ path }, i) => {
      this.at.set(path, i);
    });
    this.headlines = this.chooseHeadlines();
    this.pressures = options.spec.watched
      .filter((input) => this.at.has(input.path) && Object.keys(pressureSettings(input)).length > 0)
      .filter((input) => input.path.endsWith('.pressure'))
      .map((input) => this.pressure(input));
    this.charges = options.spec.circuit.elements
      .filter((element) => this.at.has(`${element.name}.stateOfCharge`))
      .map(({ name }) => ({
        label: words(name),
        charge: `${name}.stateOfCharge`,
        gas: `${name}.gasTemperature`,
      }));
  }

  /** The run as it is at `tick`. `realTimeFactor` is shown at fast pace, `timing` when live. */
  frame(now: {
    readonly phase: string;
    readonly tick: number;
    /** The last row; absent before the first. */
    readonly values?: ArrayLike<number>;
    readonly timing?: TerminalTiming;
    readonly realTimeFactor?: number;
  }): TerminalFrame {
    const { spec, script, pace, ticks } = this.options;
    const { values } = now;
    const elapsed = Math.max(0, now.tick) * spec.step;
    const pressures = values === undefined ? [] : this.pressures.map((one) => one(values));
    const present = values === undefined ? [] : this.present(values, pressures);
    const open = values === undefined ? 0 : (this.value(values, 'watch.count') ?? 0);
    const step = this.step(now.tick);
    return {
      bench: spec.name,
      scenario: script.name,
      pace,
      phase: now.phase,
      elapsed,
      total: ticks * spec.step,
      ...(now.realTimeFactor === undefined ? {} : { realTimeFactor: now.realTimeFactor }),
      ...(step === undefined ? {} : { step }),
      headlines: values === undefined ? [] : this.headlineValues(values),
      pressures,
      charges: values === undefined ? [] : this.chargeValues(values),
      links: values === undefined ? [] : spec.map.links.flatMap(({ name }) => this.link(name, values, elapsed)),
      ...(now.timing === undefined ? {} : { timing: now.timing }),
      warnings: { open: Math.max(open, present.length), present },
    };
  }

  /** An event for the scrolling notes. */
  note(event: { tick: number; code: number; subject: number; a: number; b: number; c: number }): TerminalNote {
    const { events, spec } = this.options;
    const kind = events.kinds[event.code] ?? { name: '', severity: 'note', text: `event ${event.code} of {subject}` };
    const subject = events.subjects[event.subject] ?? String(event.subject);
    return {
      time: event.tick * spec.step,
      severity: kind.severity,
      text: eventText(kind, subject, event.a, event.b, event.c),
    };
  }

  private value(values: ArrayLike<number>, path: string): number | undefined {
    const index = this.at.get(path);
    return index === undefined ? undefined : values[index];
  }

  private chooseHeadlines(): { label: string; path: string; unit: string }[] {
    const { spec, signals, script } = this.options;
    const named = [
      ...spec.circuit.elements.map(({ name, kind }) => ({ name, kind: kind.kind })),
      ...spec.instruments.map(({ name, kind }) => ({ name, kind: kind.kind })),
    ];
    const found = headlineTable.flatMap(([kind, signal, label, unit]) => {
      const some = named.filter((one) => one.kind === kind && this.at.has(`${one.name}.${signal}`));
      return some.map(({ name }) => ({
        label: some.length > 1 ? `${words(name)} ${label}` : label,
        path: `${name}.${signal}`,
        unit,
      }));
    });
    if (script.drive.length > 0 && this.at.has('scenario.targetSpeed'))
      found.splice(1, 0, { label: 'wanted speed', path: 'scenario.targetSpeed', unit: 'km/h' });
    if (found.length > 0) return found.slice(0, mostHeadlines);
    // A bench without a vehicle: what its file names as peaks, pressures aside.
    return spec.record.peaks
      .map((path) => signals.find((one) => one.path === path))
      .filter((one) => one !== undefined && one.unit !== 'Pa')
      .slice(0, mostHeadlines)
      .map((one) => ({ label: words(one!.path), path: one!.path, unit: tradeUnit(one!.unit) }));
  }

  private headlineValues(values: ArrayLike<number>): TerminalHeadline[] {
    return this.headlines.map(({ label, path, unit }) => ({
      label,
      value: this.value(values, path) ?? Number.NaN,
      unit,
    }));
  }

  private chargeValues(values: ArrayLike<number>): TerminalCharge[] {
    return this.charges.map(({ label, charge, gas }) => {
      const gasTemperature = this.value(values, gas);
      return {
        label,
        charge: this.value(values, charge) ?? 0,
        ...(gasTemperature === undefined ? {} : { gasTemperature }),
      };
    });
  }

  /** What the watch says where it is recorded; otherwise the settings alone, without its hysteresis and memory. */
  private pressure(input: BenchSpec['watched'][number]): (values: ArrayLike<number>) => TerminalPressure {
    const { path } = input;
    const settings = pressureSettings(input);
    const ladders = laddersOf(input, this.options.spec.ambient.pressure);
    const levelAlone = (value: number) => {
      let level = 0;
      for (const { side, rungs } of ladders) {
        const sign = side === 'above' ? 1 : -1;
        for (const rung of rungs) if (sign * value > sign * rung.begins) level = Math.max(level, rung.number);
      }
      return level;
    };
    const label = words(path.replace(/\.pressure$/, ''));
    return (values) => {
      const value = this.value(values, path) ?? standardAtmosphere;
      const peak = this.value(values, `watch.${path}.peak`) ?? Math.max(value, this.largest.get(path) ?? 0);
      this.largest.set(path, peak);
      const timeToRelief = this.value(values, `watch.${path}.timeToRelief`);
      return {
        label,
        value,
        peak,
        level: this.value(values, `watch.${path}.level`) ?? levelAlone(value),
        ...(timeToRelief === undefined ? {} : { timeToRelief }),
        settings,
      };
    };
  }

  /** Of everything watched where the levels are recorded, otherwise of the shown pressures. The most urgent first. */
  private present(values: ArrayLike<number>, pressures: readonly TerminalPressure[]): string[] {
    const levels = this.options.spec.watched.map(({ path }) => ({
      label: words(path.replace(/\.pressure$/, '')),
      level: this.value(values, `watch.${path}.level`) ?? 0,
    }));
    const known = this.at.has('watch.count') ? levels : pressures;
    return known
      .filter((one) => one.level > 0)
      .sort((a, b) => b.level - a.level)
      .map((one) => `${one.label} ${watchLevelNames[one.level]}`);
  }

  /** From the counts of the link's received messages, where they are recorded. */
  private link(name: string, values: ArrayLike<number>, time: number): TerminalLink[] {
    const messages = this.options.spec.map.messages.filter(
      (message) => message.link === name && message.direction === 'received' && this.at.has(`${message.name}.received`),
    );
    if (messages.length === 0) return [];
    const sum = (counts: readonly string[]) =>
      messages.reduce(
        (total, message) =>
          total + counts.reduce((of, count) => of + (this.value(values, `${message.name}.${count}`) ?? 0), 0),
        0,
      );
    const received = sum(['received']);
    const bad = ['malformed', 'wrongChecksum', 'wrongLength', 'wrongMap'];
    const missed =
      sum(['lost', 'late']) + bad.reduce((of, count) => of + (this.value(values, `${name}.${count}`) ?? 0), 0);
    const silent = sum(['timedOut']) > 0;
    return [
      {
        name,
        state: received === 0 ? 'not heard yet' : silent ? 'silent' : 'alive',
        age: Math.max(...messages.map((message) => this.value(values, `${message.name}.age`) ?? 0)),
        rate: this.rate(name, received, time),
        missed,
      },
    ];
  }

  private rate(name: string, count: number, time: number): number {
    const last = this.counted.get(name);
    if (last === undefined || count < last.count || time < last.time) {
      this.counted.set(name, { time, count, rate: 0 });
      return 0;
    }
    if (time - last.time < rateWindow) return last.rate;
    const rate = (count - last.count) / (time - last.time);
    this.counted.set(name, { time, count, rate });
    return rate;
  }

  private step(tick: number): TerminalStep | undefined {
    const { steps } = this.options.script;
    if (steps.length === 0) return undefined;
    const done = steps.filter((step) => step.at <= tick).length;
    const last = steps[done - 1];
    const next = steps[done];
    return {
      done,
      of: steps.length,
      ...(last === undefined ? {} : { name: last.name }),
      ...(next === undefined
        ? {}
        : { next: { name: next.name, in: (next.at - Math.max(0, tick)) * this.options.spec.step } }),
    };
  }
}

/** `highAccumulator.gas` -> `high accumulator gas` */
function words(name: string): string {
  return name
    .replace(/\./g, ' ')
    .replace(/([a-z0-9])([A-Z])/g, '$1 $2')
    .toLowerCase();
}
