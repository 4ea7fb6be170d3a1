import { existsSync, readFileSync } from 'node:fs';
import type { RunRequirement, RunSummary } from '../../runtime/run-summary.js';
import type { RunVerdict } from '../../runtime/verdict.js';

/** What a suite keeps of one run, in a file of its own. */
export interface SuiteResult {
  readonly name: string;
  readonly title: string;
  readonly scenario: string;
  readonly key: string;
  /** `broken`: the process ended without saying what came of it. */
  readonly verdict: RunVerdict | 'broken';
  readonly exitCode: number;
  /** Why it is not valid or broken. */
  readonly why: readonly string[];
  readonly summary: RunSummary | null;
  /** Wall time of the process, s. */
  readonly took: number;
  /** File of the recording beside this one; null when it was thinned out. */
  readonly recording: string | null;
}

/** A requirement over all runs of a suite. */
export interface RequirementTally {
  readonly id: string;
  readonly text: string;
  readonly severity: RunRequirement['severity'];
  readonly unit: string;
  readonly passed: number;
  readonly failed: readonly string[];
  readonly notExercised: number;
  readonly undecided: number;
  /** Least margin over all valid runs that exercised it, and the run; null when none did. */
  readonly least: { readonly margin: number; readonly run: string } | null;
}

export interface SuiteJudgement {
  readonly verdict: RunVerdict;
  readonly exitCode: number;
  readonly summary: string;
  readonly counts: Readonly<Record<SuiteResult['verdict'], number>>;
  readonly requirements: readonly RequirementTally[];
}

/** A result as its file has it; undefined when there is none or it is torn. */
export function readResult(file: string): SuiteResult | undefined {
  if (!existsSync(file)) return undefined;
  try {
    const read = JSON.parse(readFileSync(file, 'utf8')) as SuiteResult;
    return typeof read.key === 'string' && typeof read.verdict === 'string' ? read : undefined;
  } catch {
    return undefined;
  }
}

/**
 * One verdict over many runs. Worst first: a run that broke or is not valid makes the suite `not valid`, unless a requirement
 * failed in a valid run, which makes it `fail`. A requirement that no run exercised makes it `not exercised`.
 */
export function judgeSuite(results: readonly SuiteResult[], planned: number): SuiteJudgement {
  const counts = { pass: 0, fail: 0, 'not exercised': 0, 'not valid': 0, broken: 0 };
  for (const one of results) counts[one.verdict] += 1;
  const requirements = tally(results);
  const idle = requirements.filter(
    (one) => one.severity !== 'observation' && one.passed + one.failed.length + one.undecided === 0,
  );
  const missing = planned - results.length;
  let verdict: RunVerdict = 'pass';
  if (counts.fail > 0) verdict = 'fail';
  else if (counts['not valid'] + counts.broken + missing > 0) verdict = 'not valid';
  else if (counts['not exercised'] > 0 || idle.length > 0) verdict = 'not exercised';
  const parts = [
    `${counts.pass} of ${planned} runs pass`,
    counts.fail > 0 ? `${counts.fail} fail` : '',
    counts['not valid'] > 0 ? `${counts['not valid']} are not valid` : '',
    counts.broken > 0 ? `${counts.broken} broke` : '',
    counts['not exercised'] > 0 ? `${counts['not exercised']} did not exercise all that was asked` : '',
    missing > 0 ? `${missing} were not run` : '',
    idle.length > 0 ? `no run exercised ${idle.map((one) => one.id).join(', ')}` : '',
  ];
  const codes = { pass: 0, fail: 1, 'not valid': 3, 'not exercised': 0 };
  return {
    verdict,
    exitCode: missing > 0 ? 5 : codes[verdict],
    summary: `${parts.filter(Boolean).join(', ')}.`,
    counts,
    requirements,
  };
}

function tally(results: readonly SuiteResult[]): RequirementTally[] {
  const found = new Map<string, { -readonly [K in keyof RequirementTally]: RequirementTally[K] }>();
  for (const { name, summary, verdict } of results) {
    if (!summary || verdict === 'not valid' || verdict === 'broken') continue;
    for (const one of summary.requirements) {
      let so = found.get(one.id);
      if (!so) {
        so = {
          id: one.id,
          text: one.text,
          severity: one.severity,
          unit: one.unit,
          passed: 0,
          failed: [],
          notExercised: 0,
          undecided: 0,
          least: null,
        };
        found.set(one.id, so);
      }
      if (one.verdict === 'pass') so.passed += 1;
      else if (one.verdict === 'fail') so.failed = [...so.failed, name];
      else if (one.verdict === 'not exercised') so.notExercised += 1;
      else so.undecided += 1;
      if (one.verdict !== 'not exercised' && one.margin !== null && (so.least === null || one.margin < so.least.margin))
        so.least = { margin: one.margin, run: name };
    }
  }
  return [...found.values()];
}

/** Runs whose recordings are kept: all that did not pass, and of those that passed the one with the least margin of each requirement. */
export function kept(results: readonly SuiteResult[]): Set<string> {
  const names = new Set(results.filter((one) => one.verdict !== 'pass').map((one) => one.name));
  const passed = results.filter((one) => one.verdict === 'pass');
  for (const { least } of tally(passed)) if (least) names.add(least.run);
  return names;
}
