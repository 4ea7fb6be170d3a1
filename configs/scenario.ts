import { dirname, normalize } from 'node:path';
import type { SignalInfo } from '../runtime/contract.js';
import type { ScriptSpec, ScriptTrace } from '../runtime/script.js';
import type { BenchSpec } from './bench-spec.js';
import { commandValue, expectedOf, valueAs } from './command-value.js';
import type { DriveCycle } from './cycles/cycle.js';
import * as european from './cycles/europe.js';
import { diskFiles, type Files, inside } from './files.js';
import { Problems } from './problems.js';
import type { Expected } from './quantity.js';
import { lookup, readRequirements } from './requirements.js';
import { isSwitch } from './running.js';
import { csvPoints } from './scenario-csv.js';
import { caseNames, chooseParameters, type ScenarioChoice } from './scenario-parameters.js';
import { readStartState } from './scenario-start.js';
import { StepReader } from './scenario-steps.js';
import { type Placed, Section, suggestion } from './section.js';
import { SignalList } from './signal-list.js';
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
export type ScenarioBench = Pick<BenchSpec, 'step' | 'signals'> &
  Partial<Pick<BenchSpec, 'circuit' | 'ambient' | 'instruments' | 'requirements'>>;

/** Cycles that a scenario can name. */
export const cycles: readonly DriveCycle[] = Object.values(european);

/** Longest scenario, s: a day. */
const longest = 86_400;

/**
 * Reads a scenario file: `scenario` (name), `about`, `lasts`, `preview`, `parameters` and `cases`, `start` (state at the
 * start), `drive` (points of time and speed, the name of a cycle, or a CSV file), `grade` and `traces` (any command over time or
 * distance, from points or a CSV file), `steps` (the timeline) and `requirements`. Throws a BuildError with all that is wrong.
 */
export function readScenario(
  path: string,
  bench: ScenarioBench,
  files: Files = diskFiles,
  choice: ScenarioChoice = {},
): ScenarioSpec {
  const problems = new Problems();
  const source = readSource(path, problems, files);
  if (!source.root) {
    problems.throwIfAny();
    throw new Error(`${path} gave neither a scenario nor a problem`);
  }
  const { root, values } = chooseParameters(source.root, choice, problems);
  const texts = [...source.texts];
  const file = normalize(path);
  const beside = (name: string) => {
    const found = inside(dirname(file), file, name);
    const text = found === undefined ? undefined : files.read(found);
    if (text !== undefined) texts.push({ name, text });
    return text;
  };
  const reader = new ScenarioReader(new Section(root, '', problems), bench, beside);
  const script = reader.read();
  problems.throwIfAny();
  const named = choice.case === undefined ? script.name : `${script.name}, ${choice.case}`;
  return {
    script: { ...script, name: named, ...(Object.keys(values).length === 0 ? {} : { parameters: values }) },
    sources: texts,
  };
}

/** Names of a scenario file's cases; empty without any. Throws a BuildError when it is no YAML file. */
export function scenarioCases(path: string, files: Files = diskFiles): string[] {
  const problems = new Problems();
  const source = readSource(path, problems, files);
  problems.throwIfAny();
  return source.root ? caseNames(source.root) : [];
}

class ScenarioReader {
  private readonly signals = new SignalList();

  constructor(
    private readonly top: Section,
    private readonly bench: ScenarioBench,
    /** Text of a file beside the scenario's. */
    private readonly beside: (name: string) => string | undefined,
  ) {
    const stages = new Set(
      (bench.instruments ?? [])
        .filter((one) => one.kind.stage === 'before')
        .flatMap((one) => Object.keys(one.kind.outputs).map((output) => `${one.name}.${output}`)),
    );
    for (const info of bench.signals)
      this.signals.add(isSwitch(info.path) || stages.has(info.path) ? { ...info, group: 'command' } : info);
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
    const start = this.start();
    const { steps, conditions } = new StepReader({
      step: bench.step,
      signals: bench.signals,
      command: (section, key, said) => this.command(section, key, said),
      value: (section, value, target, key) => commandValue(section, value, target, key),
      example: exampleOf,
    }).read(top);
    const asked = top.section('requirements');
    const requirements = asked ? readRequirements(asked, { signals: lookup(bench.signals), step: bench.step }) : [];
    const waived = this.waived();
    top.finish();
    const ends = [drive, ...traces.filter((trace) => trace.over === undefined).map((trace) => trace.points)].map(
      (points) => points.at(-1)?.[0] ?? 0,
    );
    const ticks = given ?? Math.max(0, ...ends, ...steps.map((step) => step.at));
    // Where something else is wrong, the end may be missing only because of that.
    if (ticks === 0 && top.problems.count === 0)
      top.fail('lasts', 'missing', 'add lasts: 60 s, or a drive', {}, top.where);
    return {
      name,
      about,
      ticks,
      drive,
      preview,
      traces,
      steps,
      requirements,
      ...(conditions.length === 0 ? {} : { conditions }),
      ...(start === undefined ? {} : { start }),
      ...(waived === undefined ? {} : { waived }),
    };
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
    if (entry.value.kind === 'mapping') {
      const section = this.top.sectionIn(entry.value, 'drive')!;
      const points = this.fromFile(section, { unit: 'm/s', least: 0 }, false);
      section.finish();
      return points ?? [];
    }
    return this.points(this.top, 'drive', entry.value, { unit: 'm/s', least: 0 });
  }

  /** `file:` of a section, with `time:` and `column:`; the first column is called `time` (or `distance`) unless said otherwise. */
  private fromFile(section: Section, expected: Expected, distance: boolean): [number, number][] | undefined {
    const file = section.text('file', { required: true }, 'drive.csv');
    const time = section.text('time') ?? (distance ? 'distance' : 'time');
    const column = section.text('column');
    if (file === undefined) return undefined;
    const text = this.beside(file);
    if (text === undefined)
      return section.fail('file', 'no such file beside the scenario', 'name a CSV file in its folder or below');
    return csvPoints(section, 'file', file, text, {
      time,
      column,
      expected,
      step: distance ? undefined : this.bench.step,
    });
  }

  /** `grade:` goes to the one command of that name, or to the one that `of:` names: points, or a section with a file. */
  private grade(): ScriptTrace | undefined {
    const entry = this.top.entry('grade');
    if (!entry) return undefined;
    const section = entry.value.kind === 'mapping' ? this.top.sectionIn(entry.value, 'grade')! : undefined;
    if (section?.has('of')) {
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
    if (section) return this.trace(section, target);
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
    const over = section.choice('over', ['time', 'distance'] as const) === 'distance' ? this.way(section) : undefined;
    const expected = expectedOf(target);
    let read: [number, number][] | undefined;
    if (section.has('file')) read = this.fromFile(section, expected, over !== undefined);
    else {
      const points = section.entry('points');
      if (!points) section.fail('points', 'missing', `add points: [[0 s, ${exampleOf(target)}]]`, {}, section.where);
      read = points && this.points(section, 'points', points.value, expected, over !== undefined);
    }
    section.finish(known);
    return read && { target: target.path, points: read, between, ...(over === undefined ? {} : { over }) };
  }

  /** The distance that the one vehicle of the bench has come. */
  private way(section: Section): string | undefined {
    const ways = this.bench.signals.filter(
      (info) => info.group === 'state' && info.path.endsWith('.distance') && info.unit === 'm',
    );
    if (ways.length === 1) return ways[0]!.path;
    return section.fail(
      'over',
      `the bench has ${ways.length === 0 ? 'no vehicle' : `${ways.length} vehicles`}`,
      'write it over time',
    );
  }

  /** `[[0 s, 0 km/h], [10 s, 30 km/h]]`: times in ticks, rising. */
  private points(
    section: Section,
    key: string,
    value: Tree,
    expected: Expected,
    overDistance = false,
  ): [number, number][] {
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
      const time = section.quantityIn(
        item.items[0]!,
        overDistance ? { unit: 'm' } : { unit: 's', least: 0, most: longest },
        where,
      )?.value;
      const number = valueAs(section, item.items[1]!, expected, where);
      if (time === undefined || number === undefined) continue;
      const tick = overDistance ? time : toTicks(time, this.bench.step);
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
          overDistance ? 'distance does not rise' : 'time does not rise',
          overDistance ? 'put the points in order of distance' : 'put the points in order of time',
          { value: formatQuantity(time, overDistance ? 'm' : 's') },
        );
      } else {
        points.push([tick, number]);
      }
    }
    return points;
  }

  /** `waive: { HP-2: the valve is stuck on purpose }`: requirements of the bench that make no sense in this run, and why. */
  private waived(): Record<string, string> | undefined {
    const section = this.top.section('waive');
    if (!section) return undefined;
    const known = (this.bench.requirements ?? []).map((one) => one.id);
    const found: Record<string, string> = {};
    for (const id of section.keys()) {
      const why = section.text(id, { required: true }, 'the reason');
      if (!known.includes(id))
        section.fail(id, 'the bench has no such requirement', suggestion(id, known), {}, section.whereIs(id));
      else if (why !== undefined) found[id] = why;
    }
    return found;
  }

  private start(): ScriptSpec['start'] {
    const section = this.top.section('start');
    if (!section) return undefined;
    const { circuit, ambient } = this.bench;
    if (!circuit || !ambient) return this.top.fail('start', 'this bench has no circuit to start', 'leave it away');
    return readStartState(section, circuit, ambient);
  }

  private command(section: Section, key: string, said: Placed | undefined): SignalInfo | undefined {
    return said && this.signals.resolve(section, key, said, { groups: ['command'] });
  }
}

function exampleOf(info: SignalInfo): string {
  return formatQuantity(info.most ?? 0, tradeUnit(info.unit, info.difference), 4);
}
