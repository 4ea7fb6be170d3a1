import { quietHandEvents } from '../../runtime/hand-events.js';
import type { EventKind } from '../../runtime/journal.js';
import { watchLevelNames } from '../../runtime/watch-levels.js';
import { pressureSettings } from '../../runtime/watch-settings.js';
import type { TerminalFrame, TerminalHeadline, TerminalNote, TerminalPressure } from '../terminal/frame.js';
import type { JournaledEvent, RunView } from './host-run.js';

/** Makes what the terminal shows out of the rows and events that a run hands over. */
export class Frames {
  private readonly index = new Map<string, number>();
  private readonly counts = new Map<string, { tick: number; count: number; rate: number }>();
  private readonly began = performance.now();

  constructor(private readonly view: RunView) {
    view.ready?.signals.forEach((signal, i) => {
      this.index.set(signal.path, i);
    });
  }

  frame(): TerminalFrame {
    const { view } = this;
    const { plan, ready } = view;
    const { spec, script } = plan;
    const elapsed = Math.max(0, view.tick) * spec.step;
    const total = plan.ticks * spec.step;
    const stepsDone = Math.round(this.value('scenario.step') ?? 0);
    const next = script.steps[stepsDone];
    const live = plan.wish.pace === 'live';
    const timing = view.timing.summary();
    const wall = (performance.now() - this.began) / 1000;
    return {
      bench: spec.name,
      scenario: script.name,
      pace: plan.wish.pace,
      phase: ready === undefined ? 'building' : view.phase,
      elapsed,
      total,
      ...(live || wall < 0.2 ? {} : { realTimeFactor: elapsed / wall }),
      ...(script.steps.length === 0
        ? {}
        : {
            step: {
              done: stepsDone,
              of: script.steps.length,
              ...(stepsDone > 0 ? { name: script.steps[stepsDone - 1]!.name } : {}),
              ...(next ? { next: { name: next.name, in: next.at * spec.step - elapsed } } : {}),
            },
          }),
      headlines: this.headlines(),
      pressures: this.pressures(),
      charges: this.charges(),
      links: this.links(),
      ...(live && timing.lateness.max > 0
        ? { timing: { lateness: timing.lateness, step: timing.step, overruns: timing.overruns, drift: timing.drift } }
        : {}),
      warnings: { open: this.value('watch.count') ?? 0, present: this.present() },
    };
  }

  note(
    event: JournaledEvent,
    text: (kind: EventKind, subject: string, a: number, b: number, c: number) => string,
  ): TerminalNote | undefined {
    const { ready, plan } = this.view;
    const kind = ready?.events.kinds[event.code];
    if (!ready || !kind || quietHandEvents.includes(kind.name)) return undefined;
    return {
      time: event.tick * plan.spec.step,
      severity: kind.severity,
      text: text(kind, ready.events.subjects[event.subject] ?? '?', event.a, event.b, event.c),
    };
  }

  private value(path: string): number | undefined {
    const i = this.index.get(path);
    return i === undefined ? undefined : this.view.values?.[i];
  }

  /** What the levels that are present say. */
  private present(): string[] {
    return this.view.plan.spec.watched.flatMap((input) => {
      const level = watchLevelNames[Math.round(this.value(`watch.${input.path}.level`) ?? 0)];
      return level === undefined || level === watchLevelNames[0] ? [] : [`${input.path} ${level}`];
    });
  }

  private headlines(): TerminalHeadline[] {
    const elements = this.view.plan.spec.circuit.elements;
    const found: TerminalHeadline[] = [];
    const add = (label: string, path: string, unit: string) => {
      const value = this.value(path);
      if (value !== undefined) found.push({ label, value, unit });
    };
    for (const { name, kind } of elements) {
      if (kind.kind === 'vehicle') {
        add('speed', `${name}.velocity`, 'km/h');
        add('wanted', 'scenario.targetSpeed', 'km/h');
        add('grade', `${name}.grade`, '%');
      }
    }
    for (const { name, kind } of this.view.plan.spec.instruments) {
      if (kind.kind !== 'driver') continue;
      add('accelerator', `${name}.accelerator`, '%');
      add('brake pedal', `${name}.brake`, '%');
    }
    for (const { name, kind } of elements) {
      if (kind.kind === 'stepped-gearbox') add('gear', `${name}.gear`, '1');
      if (kind.kind === 'pump-motor') add('pump torque', `${name}.torque`, 'N m');
      if (kind.kind === 'combustion-engine') add('engine torque', `${name}.torque`, 'N m');
    }
    return found;
  }

  private pressures(): TerminalPressure[] {
    return this.view.plan.spec.watched
      .filter((input) => input.unit === 'Pa')
      .flatMap((input) => {
        const value = this.value(input.path);
        if (value === undefined) return [];
        const timeToRelief = this.value(`watch.${input.path}.timeToRelief`);
        return [
          {
            label: input.path.replace(/\.pressure$/, ''),
            value,
            peak: this.value(`watch.${input.path}.peak`) ?? value,
            level: Math.min(
              watchLevelNames.length - 1,
              Math.max(0, Math.round(this.value(`watch.${input.path}.level`) ?? 0)),
            ),
            ...(timeToRelief === undefined || timeToRelief > 1e5 ? {} : { timeToRelief }),
            settings: pressureSettings(input),
          },
        ];
      });
  }

  private charges(): TerminalFrame['charges'] {
    return this.view.plan.spec.circuit.elements
      .filter((element) => element.kind.kind === 'gas-accumulator')
      .flatMap(({ name }) => {
        const charge = this.value(`${name}.stateOfCharge`);
        const gasTemperature = this.value(`${name}.gasTemperature`);
        return charge === undefined
          ? []
          : [{ label: name, charge, ...(gasTemperature === undefined ? {} : { gasTemperature }) }];
      });
  }

  private links(): TerminalFrame['links'] {
    const { spec } = this.view.plan;
    const tick = this.view.tick;
    return spec.map.links.map((link) => {
      const received = spec.map.messages.filter(
        (message) => message.link === link.name && message.direction === 'received',
      );
      const ages = received
        .map((message) => this.value(`${message.name}.age`))
        .filter((age): age is number => age !== undefined);
      const sum = (name: string) =>
        received.reduce((total, message) => total + (this.value(`${message.name}.${name}`) ?? 0), 0);
      const count = sum('received');
      const before = this.counts.get(link.name);
      let rate = before?.rate ?? 0;
      if (!before || tick - before.tick >= 1 / spec.step || count < before.count) {
        rate =
          before && tick > before.tick && count >= before.count
            ? (count - before.count) / ((tick - before.tick) * spec.step)
            : rate;
        this.counts.set(link.name, { tick, count, rate });
      }
      const silent = received.some((message) => (this.value(`${message.name}.timedOut`) ?? 0) > 0);
      return {
        name: link.name,
        state: count === 0 ? 'not heard yet' : silent ? 'silent' : 'alive',
        age: ages.length > 0 ? Math.max(...ages) : 0,
        rate,
        missed: sum('lost') + sum('late') + (this.value(`${link.name}.malformed`) ?? 0),
      } as const;
    });
  }
}
