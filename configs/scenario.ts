import type { SignalInfo } from '../runtime/contract.js';
import type { ScriptSpec, ScriptStep, ScriptTrace } from '../runtime/script.js';
import type { BenchSpec } from './bench-spec.js';
import type { DriveCycle } from './cycles/cycle.js';
import * as european from './cycles/europe.js';
import { diskFiles, type Files } from './files.js';
import { Problems } from './problems.js';
import { type Expected, parseQuantity, QuantityError, shown } from './quantity.js';
import { type Placed, Section, suggestion } from './section.js';
import { SignalList } from './signal-list.js';
import { lookup, readRequirements } from './requirements.js';
import { readSource, type SourceText, type Tree } from './source.js';
import { checkedTicks, toTicks } from './ticks.js';
import { formatNumber, formatQuantity, tradeUnit } from './units.js';

/** A scenario as its file says it, checked against a bench: plain data. */
export interface ScenarioSpec {
  readonly script: ScriptSpec;
  /** The files as read, for the record. */
  readonly sources: readonly SourceText[];
}

/** What a scenario needs to know of its bench. */
export type ScenarioBench = Pick<BenchSpec, 'step' | 'signals'>;

/** Cycles that a scenario can name. */
export const cycles: readonly DriveCycle[] = Object.values(european);

/** Longest scenario, s: a day. */
const longest = 86_400;
/** Signals of the runtime that a script may set beside commands. */
const settableOfRun = new Set(['life.supply', 'life.key']);
const actions = ['set', 'ramp', 'hold', 'release'] as const;

/**
 * Reads a scenario file: `scenario` (name), `about`, `lasts`, `preview`, `drive` (points of time and speed, or the
 * name of a cycle), `grade` (points), `traces` (any command over time) and `steps`. Throws a BuildError with all that is
 * wrong.
 */
export function readScenario(path: string, bench: ScenarioBench, files: Files = diskFiles): ScenarioSpec {
  const problems = new Problems();
  const source = readSource(path, problems, files);
  if (!source.root) {
    problems.throwIfAny();
    throw new Error(`${path} gave neither a scenario nor a problem`);
  }
  const reader = new ScenarioReader(new Section(source.root, '', problems), bench);
  const script = reader.read();
  problems.throwIfAny();
  return { script, sources: source.texts };
}

class ScenarioReader {
  private readonly signals = new SignalList();

  constructor(
    private readonly top: Section,
    private readonly bench: ScenarioBench,
  ) {
    for (const info of bench.signals)
      this.signals.add(settableOfRun.has(info.path) ? { ...info, group: 'command' } : info);
  }

  read(): ScriptSpec {
    const { top, bench } = this;
    const name = top.text('scenario', { required: true }, 'harbour round') ?? '';
    const about = top.text('about') ?? '';
    const given = top.has('lasts') ? this.lasts() : undefined;
    const preview = checkedTicks(top, 'preview', bench.step) ?? Math.round(0.5 / bench.step);
    const drive = this.drive();
    const grade = this.grade();
    const traces = [...(grade ? [grade] : []), ...this.traces(grade?.target)];
    const steps = this.steps();
    const asked = top.section('requirements');
    const requirements = asked ? readRequirements(asked, { signals: lookup(bench.signals), step: bench.step }) : [];
    top.finish();
    const ends = [drive, ...traces.map((trace) => trace.points)].map((points) => points.at(-1)?.[0] ?? 0);
    const ticks = given ?? Math.max(0, ...ends, ...steps.map((step) => step.at));
    // Where something else is wrong, the end may be missing only because of that.
    if (ticks === 0 && top.problems.count === 0)
      top.fail('lasts', 'missing', 'add lasts: 60 s, or a drive', {}, top.where);
    return { name, about, ticks, drive, preview, traces, steps, requirements };
  }

  private lasts(): number | undefined {
    const seconds = this.top.quantity('lasts', { unit: 's', most: longest });
    if (seconds === undefined) return undefined;
    return checkedTicks(this.top, 'lasts', this.bench.step, { least: 1 });
  }

  private drive(): [number, number][] {
    const entry = this.top.entry('drive');
    if (!entry) return [];
    if (entry.value.kind === 'scalar') {
      const said = this.top.choice(
        'drive',
        cycles.map((cycle) => cycle.name),
      );
      const cycle = cycles.find((candidate) => candidate.name === said);
      return cycle ? cycle.times.map((time, i) => [Math.round(time / this.bench.step), cycle.speeds[i]!]) : [];
    }
    return this.points(this.top, 'drive', entry.value, { unit: 'm/s', least: 0 });
  }

  /** `grade:` goes to the one command of that name, or to the one that `of:` names. */
  private grade(): ScriptTrace | undefined {
    const entry = this.top.entry('grade');
    if (!entry) return undefined;
    if (entry.value.kind === 'mapping') {
      const section = this.top.sectionIn(entry.value, 'grade')!;
      const target = this.command(section, 'of', section.placed('of', { required: true }, 'truck.grade'));
      return target && this.trace(section, target, ['of']);
    }
    const candidates = this.bench.signals.filter((info) => info.group === 'command' && info.path.endsWith('.grade'));
    if (candidates.length !== 1) {
      const remedy =
        candidates.length === 0 ? 'leave it away' : `write grade: { of: ${candidates[0]!.path}, points: [...] }`;
      return this.top.fail(
        'grade',
        `the bench has ${candidates.length === 0 ? 'no command' : `${candidates.length} commands`} of this name`,
        remedy,
        {},
        entry.where,
      );
    }
    const target = candidates[0]!;
    return this.pointsOrSection(this.top, 'grade', entry.value, target);
  }

  /** Below `traces`, by command: a list of points, or `points` and what lies between them. */
  private traces(taken: string | undefined): ScriptTrace[] {
    const traces: ScriptTrace[] = [];
    const all = this.top.section('traces');
    for (const path of all?.keys() ?? []) {
      const { value, where } = all!.entry(path)!;
      const target = this.command(all!, path, { text: path, where });
      if (target && target.path === taken) {
        all!.fail(path, 'the command follows grade already', 'keep one of the two', {}, where);
        continue;
      }
      const trace = target && this.pointsOrSection(all!, path, value, target);
      if (trace) traces.push(trace);
    }
    return traces;
  }

  private pointsOrSection(section: Section, key: string, value: Tree, target: SignalInfo): ScriptTrace | undefined {
    if (value.kind === 'mapping') return this.trace(section.sectionIn(value, key)!, target);
    return { target: target.path, points: this.points(section, key, value, expectedOf(target)), between: 'linear' };
  }

  private trace(section: Section, target: SignalInfo, known: readonly string[] = []): ScriptTrace | undefined {
    const between = section.choice('between', ['linear', 'hold'] as const) ?? 'linear';
    const points = section.entry('points');
    if (!points) section.fail('points', 'missing', `add points: [[0 s, ${exampleOf(target)}]]`, {}, section.where);
    const read = points && this.points(section, 'points', points.value, expectedOf(target));
    section.finish(known);
    return read && { target: target.path, points: read, between };
  }

  /** `[[0 s, 0 km/h], [10 s, 30 km/h]]`: times in ticks, rising. */
  private points(section: Section, key: string, value: Tree, expected: Expected): [number, number][] {
    if (value.kind !== 'list' || value.items.length === 0) {
      section.problems.add(
        value.where,
        section.inner(key),
        'not a list of points',
        `write [[0 s, value], [10 s, value]]`,
      );
      return [];
    }
    const points: [number, number][] = [];
    for (const [i, item] of value.items.entries()) {
      const where = `${key}[${i}]`;
      if (item.kind !== 'list' || item.items.length !== 2) {
        section.problems.add(item.where, section.inner(where), 'not a point', 'write [time, value]');
        continue;
      }
      const time = section.quantityIn(item.items[0]!, { unit: 's', least: 0, most: longest }, where)?.value;
      const number = this.value(section, item.items[1]!, expected, where);
      if (time === undefined || number === undefined) continue;
      const tick = toTicks(time, this.bench.step);
      if (tick === undefined) {
        section.problems.add(
          item.where,
          section.inner(where),
          'time is not a multiple of the step',
          `use multiples of ${formatNumber(this.bench.step * 1000)} ms`,
          {
            value: formatQuantity(time, 's'),
          },
        );
      } else if (points.length > 0 && tick <= points.at(-1)![0]) {
        section.problems.add(
          item.where,
          section.inner(where),
          'time does not rise',
          'put the points in order of time',
          { value: formatQuantity(time, 's') },
        );
      } else {
        points.push([tick, number]);
      }
    }
    return points;
  }

  private steps(): ScriptStep[] {
    const steps: ScriptStep[] = [];
    for (const [i, item] of (this.top.list('steps')?.items ?? []).entries()) {
      const section = this.top.sectionIn(item, `steps[${i}]`);
      const step = section && this.step(section);
      if (step) steps.push(step);
    }
    // Steps of the same time stay in the order of the file.
    return steps.sort((a, b) => a.at - b.at);
  }

  /** One action, with or without a note; or a note alone. */
  private step(section: Section): ScriptStep | undefined {
    const at = checkedTicks(section, 'at', this.bench.step, { required: true });
    const note = section.text('note');
    const named = actions.filter((action) => section.has(action));
    if (named.length > 1 || (named.length === 0 && !section.has('note'))) {
      const known = ['at', 'to', 'over', 'note', ...actions];
      const odd = section.keys().find((key) => !known.includes(key));
      const remedy =
        odd === undefined ? `write one of ${actions.join(', ')} or note` : suggestion(odd, [...actions, 'note']);
      const what = named.length === 0 ? 'a step that does nothing' : `a step that does ${named.length} things`;
      return section.fail('', what, remedy, odd === undefined ? {} : { value: odd });
    }
    const action = named[0];
    if (action === undefined) {
      section.finish();
      return at === undefined || note === undefined
        ? undefined
        : { at, name: note, action: 'note', target: '', value: 0, over: 0 };
    }
    const target = this.command(section, action, section.placed(action, { required: true }, 'element.command'));
    const takesValue = action === 'set' || action === 'ramp';
    const entry = takesValue ? section.entry('to') : undefined;
    if (takesValue && !entry)
      section.fail('to', 'missing', `add to: ${target ? exampleOf(target) : 'and a value'}`, {}, section.where);
    const value = entry && target ? this.value(section, entry.value, expectedOf(target), 'to') : 0;
    const over = action === 'ramp' ? checkedTicks(section, 'over', this.bench.step, { required: true, least: 1 }) : 0;
    section.finish();
    if (at === undefined || !target || value === undefined || over === undefined) return undefined;
    const written = takesValue ? ` to ${section.peek('to')}` : '';
    return { at, name: note ?? `${action} ${target.path}${written}`, action, target: target.path, value, over };
  }

  private command(section: Section, key: string, said: Placed | undefined): SignalInfo | undefined {
    return said && this.signals.resolve(section, key, said, { groups: ['command'] });
  }

  /** A quantity, or on and off for a command without a unit. */
  private value(section: Section, value: Tree, expected: Expected, key: string): number | undefined {
    if (value.kind === 'scalar' && expected.unit === '1' && /^(on|off|true|false)$/.test(value.text)) {
      const number = value.text === 'on' || value.text === 'true' ? 1 : 0;
      return section.attempt(value, section.inner(key), () => {
        if (number >= (expected.least ?? 0) && number <= (expected.most ?? 1)) return number;
        throw new QuantityError(
          'a command that is not switched on and off',
          shown(value.text),
          undefined,
          'write a number',
        );
      });
    }
    if (value.kind !== 'scalar') return section.quantityIn(value, expected, key)?.value;
    return section.attempt(value, section.inner(key), () => parseQuantity(value.text, expected).value);
  }
}

function expectedOf(info: SignalInfo): Expected {
  return { unit: info.unit, difference: info.difference, least: info.least, most: info.most };
}

function exampleOf(info: SignalInfo): string {
  return formatQuantity(info.most ?? 0, tradeUnit(info.unit, info.difference), 4);
}
