import { createHash } from 'node:crypto';
import path from 'node:path';
import { readBench } from '../../configs/bench.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { eachSignal, type Requirement } from '../../runtime/judge/formula.js';
import { judgeTrace } from '../../runtime/judge/offline.js';
import type { RequirementResult } from '../../runtime/judge/result.js';
import { RecordingError, type RecordingHeader } from '../../runtime/recording/format.js';
import { type Ending, Recording } from '../../runtime/recording/reader.js';
import { requirementsOf, type ScriptSpec } from '../../runtime/script.js';
import { judgeRun, type RunJudgement } from '../../runtime/verdict.js';
import { type PressureSettings, pressureSettings } from '../../runtime/watch-settings.js';
import { eventText } from '../terminal/event-text.js';
import type { ReportedDuration, ReportedTiming, ReportedWarning, RunReportData } from './data.js';
import { driveFacts, driveSignals } from './drive-trace.js';
import { gatherPlots, reportedRequirement } from './gather.js';
import { RecordedRows } from './recorded-rows.js';
import { type RecordedSummary, recordedSummary } from './recorded-summary.js';

export interface RecordedReport {
  readonly data: RunReportData;
  /** What of the recording could not be believed or read. */
  readonly remarks: readonly string[];
}

/**
 * All that a report shows, from a recording alone. One without an end is reported as not valid, ended early; its
 * requirements are judged from what was recorded. Throws RecordingError when it cannot be read, BuildError when its bench
 * cannot be read by this version.
 */
export function reportOfRecording(file: string): RecordedReport {
  const recording = new Recording(file);
  try {
    return gather(recording, file);
  } finally {
    recording.close();
  }
}

/** The bench that a recording carries, and what it ran. */
export function recordedBench(header: RecordingHeader): { spec: BenchSpec; script: ScriptSpec } {
  const texts = Object.fromEntries(header.bench.files.map((one) => [one.path, one.text]));
  const spec = readBench(header.bench.files[0]!.path, catalogue, memoryFiles(texts));
  const said = header.options['script'];
  if (typeof said !== 'string') throw new RecordingError('the header says no script');
  const script = JSON.parse(said) as ScriptSpec;
  return { spec, script: { ...script, requirements: script.requirements ?? [] } };
}

/** The tick from which on a recording without a summary holds an after-run; Infinity without one. */
function afterRunFrom(recording: Recording): number {
  const code = recording.header.events.kinds.findIndex((kind) => kind.name === 'after-run');
  if (code < 0) return Number.POSITIVE_INFINITY;
  for (const block of recording.blocks()) {
    if (block.kind !== 'events') continue;
    for (let i = 0; i < block.count; i += 1) if (block.codes[i] === code) return block.ticks[i]!;
  }
  return Number.POSITIVE_INFINITY;
}

function gather(recording: Recording, file: string): RecordedReport {
  const { header } = recording;
  const { spec, script } = recordedBench(header);
  const { ending, lastTick } = recording.examine();
  const remarks: string[] = [];
  const summary = believed(ending, remarks);
  const requirements = requirementsOf(spec.requirements, script);
  for (const [id, why] of Object.entries(script.waived ?? {})) remarks.push(`requirement ${id} was not asked: ${why}`);
  const watched = spec.watched.map((one) => one.path);
  const wanted = new Set<string>(watched);
  for (const { formula } of requirements) eachSignal(formula, (one) => wanted.add(one));
  const followed = driveSignals(spec);
  for (const one of ['timing.lateness', 'timing.step', ...Object.values(followed ?? {})]) wanted.add(one);
  const counted =
    summary?.simulated === undefined ? afterRunFrom(recording) : Math.round(summary.simulated / spec.step);
  const rows = new RecordedRows(recording, Math.min(lastTick, counted - 1), wanted);
  const results = summary
    ? resultsOf(summary, requirements, spec.step, remarks)
    : judgeAgain(requirements, rows, remarks);
  const judgement = summary
    ? judgementOf(summary, results)
    : judgeRun(
        {
          ticks: rows.ticks,
          step: spec.step,
          ending: 'broken',
          endingReason: ending.how === 'complete' ? 'its summary cannot be read' : ending.what,
          timing: [],
          frames: [],
          ledger: [],
          rowsLost: 0,
          hands: [],
        },
        results,
      );
  if (rows.missing > 0) remarks.push(`${rows.missing} ticks have no row in the recording`);
  const warnings = (summary?.warnings ?? []).map(
    (one): ReportedWarning => ({
      ...one,
      since: Math.round(one.since / spec.step),
      until: one.until === null ? null : Math.round(one.until / spec.step),
    }),
  );
  const settings = Object.fromEntries(
    spec.watched.filter((one) => one.unit === 'Pa').map((one) => [one.path, drawn(pressureSettings(one))]),
  );
  const target = followed && rows.column(followed.target);
  const driven = followed && rows.column(followed.driven);
  const data: RunReportData = {
    run: header.run,
    created: header.created,
    bench: { name: header.bench.name, files: header.bench.files.map(mark) },
    scenario:
      header.scenario === null && script.name === 'no scenario'
        ? null
        : { name: script.name, ...(header.scenario ? { file: mark(header.scenario) } : {}) },
    software: [
      { name: 'oilspring', value: header.software.version },
      { name: 'Node', value: `${header.software.node}, V8 ${header.software.v8}` },
      { name: 'Controller', value: String(header.options['controller'] ?? 'unknown') },
    ],
    machine: Object.entries(header.machine).map(([name, value]) => ({ name, value: String(value) })),
    seed: header.seed,
    step: spec.step,
    ticks: rows.ticks,
    pace: header.pace,
    judgement,
    requirements: results.map((result) => reportedRequirement(result, spec.step)),
    warnings,
    plots: gatherPlots(rows, results, warnings, { settings }),
    events: rows.events.map(({ tick, code, subject, values }) => {
      const kind = header.events.kinds[code];
      const name = header.events.subjects[subject] ?? '?';
      return {
        tick,
        severity: kind?.severity ?? 'note',
        text: kind ? eventText(kind, name, ...values) : `event ${code}`,
      };
    }),
    eventsLeftOut: rows.eventsLeftOut,
    timing: timingOf(summary, spec, rows),
    drive: target && driven ? driveFacts(spec, target, driven) : [],
    bus: (summary?.messages ?? []).map(({ direction, due, ...one }) => ({
      ...one,
      direction: direction === 'sent' ? ('to the controller' as const) : ('from the controller' as const),
      ...(due === null ? {} : { due }),
    })),
    energy: summary
      ? {
          parts: summary.energyParts,
          residual: summary.ledger.energyResidual,
          bound: summary.ledger.energyBound,
          oilResidual: summary.ledger.oilResidual,
          oilBound: summary.ledger.oilBound,
        }
      : null,
    derive: {
      command: `oilspring rederive ${path.basename(file)}`,
      recording: path.basename(file),
      stateHash: summary?.stateHash ?? 'not in the recording',
    },
  };
  return { data, remarks };
}

function believed(ending: Ending, remarks: string[]): RecordedSummary | undefined {
  if (ending.how !== 'complete') {
    remarks.push(`the recording ${ending.how === 'damaged' ? 'is damaged' : 'ended early'}: ${ending.what}`);
    return undefined;
  }
  const parsed = recordedSummary.safeParse(ending.end!.summary);
  if (parsed.success) return parsed.data;
  const issue = parsed.error.issues[0]!;
  remarks.push(`its summary cannot be read: ${issue.path.join('.')}: ${issue.message}`);
  return undefined;
}

function resultsOf(
  summary: RecordedSummary,
  requirements: readonly Requirement[],
  step: number,
  remarks: string[],
): RequirementResult[] {
  const byId = new Map(summary.requirements.map((one) => [one.id, one]));
  return requirements.flatMap((requirement) => {
    const said = byId.get(requirement.id);
    if (!said) {
      remarks.push(`requirement ${requirement.id} was not judged in the run`);
      return [];
    }
    const margin = said.margin ?? (said.verdict === 'fail' ? -Infinity : Infinity);
    return [
      {
        requirement,
        verdict: said.verdict,
        margin,
        unit: said.unit,
        tick: said.at === null ? -1 : Math.round(said.at / step),
        triggers: said.triggers ?? undefined,
        open: said.open,
        least: margin,
        most: margin,
      },
    ];
  });
}

function judgementOf(summary: RecordedSummary, results: readonly RequirementResult[]): RunJudgement {
  const deciding = results.filter(({ requirement }) => requirement.severity !== 'observation');
  const count = (verdict: RequirementResult['verdict']) => deciding.filter((one) => one.verdict === verdict).length;
  const atRest = deciding.filter(
    ({ verdict, requirement }) => verdict === 'not exercised' && requirement.exercise === 'optional',
  ).length;
  return {
    verdict: summary.verdict,
    valid: summary.valid,
    reasons: summary.reasons.map(({ value, bound, unit, ...one }) => ({
      ...one,
      ...(value === undefined ? {} : { value }),
      ...(bound === undefined ? {} : { bound }),
      ...(unit === undefined ? {} : { unit }),
    })),
    exitCode: summary.exitCode,
    counts: {
      pass: count('pass'),
      fail: count('fail'),
      notExercised: count('not exercised') - atRest,
      atRest,
      undecided: count('undecided'),
    },
    summary: summary.verdictText,
  };
}

/** Without an end: from what was recorded, as far as it names every signal. */
function judgeAgain(requirements: readonly Requirement[], rows: RecordedRows, remarks: string[]): RequirementResult[] {
  return requirements.flatMap((requirement) => {
    const missing: string[] = [];
    eachSignal(requirement.formula, (one) => {
      if (!rows.column(one)) missing.push(one);
    });
    if (missing.length > 0 || rows.ticks === 0) {
      remarks.push(`requirement ${requirement.id} cannot be judged: ${missing[0] ?? 'no tick'} was not recorded`);
      return [];
    }
    return [judgeTrace(requirement, { ticks: rows.ticks, step: rows.step, values: (one) => rows.column(one)! })];
  });
}

function mark(file: { readonly path: string; readonly text: string }): { path: string; digest: string } {
  return { path: file.path, digest: createHash('sha256').update(file.text).digest('hex') };
}

function drawn(settings: PressureSettings): { label: string; value: number }[] {
  const words: Record<keyof PressureSettings, string> = {
    precharge: 'precharge',
    leastInlet: 'least inlet',
    relief: 'relief setting',
    maximumAllowable: 'PS',
    casePressure: 'greatest case pressure',
  };
  return Object.entries(settings).map(([key, value]) => ({
    label: words[key as keyof PressureSettings],
    value: value as number,
  }));
}

function timingOf(summary: RecordedSummary | undefined, spec: BenchSpec, rows: RecordedRows): ReportedTiming | null {
  if (!summary?.timing.measured) return null;
  const { timing } = summary;
  const measure = (
    name: string,
    of: RecordedSummary['timing']['step'],
    path: string,
    budget?: number,
  ): ReportedDuration => ({
    name,
    p50: of.p50,
    p99: of.p99,
    p999: of.p999,
    max: of.max,
    ...(budget === undefined ? {} : { budget: budget * 1e6 }),
    buckets: buckets(rows.column(path)),
  });
  return {
    measures: [
      measure('lateness of a tick', timing.lateness, 'timing.lateness', spec.budgets.lateness),
      measure('step, from a tick’s start to its end', timing.step, 'timing.step'),
    ],
    overruns: timing.overruns,
    drift: timing.drift,
    collections: timing.collections,
  };
}

/** Sixteen buckets an octave from a column of durations, s. */
function buckets(column: Float32Array | undefined): ReportedDuration['buckets'] {
  const counts = new Map<number, number>();
  for (const value of column ?? []) {
    if (!(value > 0)) continue;
    const at = Math.floor(16 * Math.log2(value * 1e6));
    counts.set(at, (counts.get(at) ?? 0) + 1);
  }
  return [...counts]
    .sort((a, b) => a[0] - b[0])
    .map(([at, count]) => ({ from: 2 ** (at / 16), to: 2 ** ((at + 1) / 16), count }));
}
