import { expressionText, formulaText } from '../../configs/requirement-text.js';
import type { SignalInfo } from '../../runtime/contract.js';
import { type Expression, eachSignal, type Formula, horizon, parts } from '../../runtime/judge/formula.js';
import { expressionValues } from '../../runtime/judge/offline.js';
import type { RequirementResult } from '../../runtime/judge/result.js';
import type { ReportedPlot, ReportedRequirement, ReportedWarning } from './data.js';
import { quantity } from './text.js';

/** Where plots take their curves from: a recording, or memory. */
export interface PlotSource {
  readonly ticks: number;
  /** Tick length, s. */
  readonly step: number;
  find(path: string): SignalInfo | undefined;
  /** Values of a signal at first .. last; undefined when it was not recorded. */
  values(path: string, first: number, last: number): ArrayLike<number> | undefined;
}

export interface GatherOptions {
  /** Seconds shown before and behind. Default 2. */
  readonly around?: number;
  /** Settings of the watch by path, drawn where the path is. */
  readonly settings?: Readonly<Record<string, readonly { readonly label: string; readonly value: number }[]>>;
  /** At most so many warnings are drawn, the first ones. Default 24. */
  readonly mostWarnings?: number;
}

/** For the report, from what the judge said. */
export function reportedRequirement(result: RequirementResult, step: number): ReportedRequirement {
  const { requirement, verdict, margin, unit, tick, triggers, open } = result;
  const { id, text, severity, source, link } = requirement;
  return {
    id,
    text,
    formula: formulaText(requirement.formula, step),
    severity,
    verdict,
    margin,
    unit,
    tick,
    open,
    ...(source === undefined ? {} : { source }),
    ...(link === undefined ? {} : { link }),
    ...(triggers === undefined ? {} : { triggers }),
  };
}

/**
 * Plots around each least margin and each warning: every signal that a requirement names and every computed value that it compares (a rate, an
 * integral, a difference), one plot for each unit, with the numbers that it compares with and the settings of the watch.
 */
export function gatherPlots(
  source: PlotSource,
  results: readonly RequirementResult[],
  warnings: readonly ReportedWarning[],
  options: GatherOptions = {},
): ReportedPlot[] {
  const around = Math.round((options.around ?? 2) / source.step);
  const plots: ReportedPlot[] = [];
  for (const { requirement, tick, verdict } of results) {
    if (tick < 0) continue;
    const paths = new Set<string>();
    eachSignal(requirement.formula, (path) => paths.add(path));
    const ahead = Math.min(horizon(requirement.formula), Math.round(60 / source.step));
    const failed = verdict === 'fail' ? 'failed here' : 'least margin';
    const shown = {
      title: `${requirement.id}: ${verdict === 'fail' ? 'where it failed most' : 'least margin'}`,
      subject: requirement.id,
      paths: [...paths],
      first: tick - around,
      last: tick + Math.max(around, Math.round(ahead * 1.1)),
      bounds: bounds(requirement.formula),
      marks: [{ label: failed, tick }],
      settings: options.settings ?? {},
    };
    plots.push(...computed(source, requirement.formula, shown), ...stretch(source, shown));
  }
  for (const warning of warnings.slice(0, options.mostWarnings ?? 24)) {
    const end = Math.min(warning.until ?? source.ticks - 1, warning.since + 15 * around);
    const own = {
      path: warning.path,
      label: `setting ${quantity(warning.setting, warning.unit)}`,
      value: warning.setting,
    };
    plots.push(
      ...stretch(source, {
        title: `${warning.path}: ${warning.level}`,
        subject: warning.path,
        paths: [warning.path],
        first: warning.since - around,
        last: end + around,
        bounds: [own],
        marks: [{ label: 'warning begins', tick: warning.since }],
        settings: options.settings ?? {},
      }),
    );
  }
  return plots;
}

interface Bound {
  readonly path: string;
  readonly label: string;
  readonly value: number;
}
interface Stretch {
  readonly title: string;
  readonly subject: string;
  readonly paths: readonly string[];
  readonly first: number;
  readonly last: number;
  readonly bounds: readonly Bound[];
  readonly marks: ReportedPlot['marks'];
  readonly settings: NonNullable<GatherOptions['settings']>;
}

function stretch(source: PlotSource, asked: Stretch): ReportedPlot[] {
  const first = Math.max(0, asked.first);
  const last = Math.min(source.ticks - 1, asked.last);
  const byUnit = new Map<string, { info: SignalInfo; values: ArrayLike<number> }[]>();
  for (const path of asked.paths) {
    const info = source.find(path);
    const values = info && last > first ? source.values(path, first, last) : undefined;
    if (!info || !values) continue;
    const key = `${info.unit} ${info.difference === true}`;
    byUnit.set(key, [...(byUnit.get(key) ?? []), { info, values }]);
  }
  return [...byUnit.values()].map((traces) => {
    const drawn = new Set(traces.map((trace) => trace.info.path));
    const settings = new Map<number, string>();
    for (const bound of asked.bounds) if (drawn.has(bound.path)) settings.set(bound.value, bound.label);
    for (const path of drawn)
      for (const setting of asked.settings[path] ?? [])
        if (!settings.has(setting.value)) settings.set(setting.value, setting.label);
    return {
      title: asked.title,
      subject: asked.subject,
      unit: traces[0]!.info.unit,
      difference: traces[0]!.info.difference === true,
      firstTick: first,
      traces: traces.map(({ info, values }) => ({ path: info.path, values })),
      settings: [...settings].map(([value, label]) => ({ value, label })),
      marks: asked.marks,
    };
  });
}

/** Values that a formula computes before it compares them with a number. */
function computed(source: PlotSource, formula: Formula, asked: Stretch): ReportedPlot[] {
  if (formula.is !== 'compare') return parts(formula).flatMap((part) => computed(source, part, asked));
  const { left, right, relation, unit } = formula;
  if (left.is === 'signal' || left.is === 'number' || right.is !== 'number' || formula.per !== undefined) return [];
  const first = Math.max(0, asked.first);
  const last = Math.min(source.ticks - 1, asked.last);
  if (last <= first) return [];
  let missing = false;
  const none = new Float64Array(last + 1);
  const trace = {
    ticks: last + 1,
    step: source.step,
    values: (path: string) => {
      const values = source.values(path, 0, last);
      if (!values) missing = true;
      return values ?? none;
    },
  };
  const values = expressionValues(left, trace).subarray(first);
  if (missing) return [];
  const sign = relation.replace('<=', '≤').replace('>=', '≥');
  return [
    {
      title: asked.title,
      subject: asked.subject,
      unit,
      // A peak or a mean of a pressure is a pressure, what is computed from several is a difference.
      difference: !['peak', 'trough', 'mean', 'lesser', 'greater'].includes(left.is),
      firstTick: first,
      traces: [{ path: expressionText(left, source.step), values }],
      settings: [{ label: `${sign} ${right.written ?? right.value}`, value: right.value }],
      marks: asked.marks,
    },
  ];
}

/** The numbers that a formula compares a signal, or its peak, trough or mean, with. */
function bounds(formula: Formula): Bound[] {
  if (formula.is !== 'compare') return parts(formula).flatMap(bounds);
  const found: Bound[] = [];
  const pair = (signal: Expression, number: Expression, relation: string) => {
    let inside = signal;
    while (inside.is === 'peak' || inside.is === 'trough' || inside.is === 'mean') inside = inside.of;
    if (inside.is !== 'signal') return;
    if (number.is === 'number')
      found.push({ path: inside.path, label: `${relation} ${number.written ?? number.value}`, value: number.value });
  };
  const turned = { '<': '>', '<=': '≥', '>': '<', '>=': '≤' }[formula.relation];
  pair(formula.left, formula.right, formula.relation.replace('<=', '≤').replace('>=', '≥'));
  pair(formula.right, formula.left, turned);
  // |signal - target| <= band: the band's edges.
  if (formula.left.is === 'size' && formula.left.of.is === 'difference' && formula.right.is === 'number') {
    const { left, right } = formula.left.of;
    if (left.is === 'signal' && right.is === 'number') {
      for (const sign of [-1, 1]) {
        const written = `${right.written ?? right.value} ${sign < 0 ? '−' : '+'} ${formula.right.written ?? formula.right.value}`;
        found.push({ path: left.path, label: written, value: right.value + sign * formula.right.value });
      }
    }
  }
  return found;
}
