import type { RunRequirement } from '../../runtime/run-summary.js';

/** A verdict or a margin that is not what it was. */
export interface Moved {
  readonly run: string;
  /** Id of the requirement; '' for the run itself. */
  readonly id: string;
  readonly before: string;
  readonly after: string;
  /** Of the margins, SI; null where one has none. */
  readonly change: number | null;
  readonly unit: string;
  /** Worse: a pass that is none any more, or a margin that became smaller by more than the tolerance. */
  readonly worse: boolean;
}

/** What of a run's outcome is compared. */
export interface Outcome {
  readonly run: string;
  readonly verdict: string;
  readonly requirements: readonly Pick<RunRequirement, 'id' | 'verdict' | 'margin' | 'unit'>[];
}

/** The better, the lower. */
const rank: Readonly<Record<string, number>> = {
  pass: 0,
  'not exercised': 1,
  undecided: 1,
  fail: 2,
  'not valid': 3,
  broken: 4,
};

/**
 * What moved from one outcome to another: verdicts, requirements that came or went, and margins by more than `share` of the
 * larger of the two.
 */
export function movedBetween(before: Outcome, after: Outcome, share: number): Moved[] {
  const moved: Moved[] = [];
  const run = before.run;
  if (before.verdict !== after.verdict)
    moved.push({
      run,
      id: '',
      before: before.verdict,
      after: after.verdict,
      change: null,
      unit: '1',
      worse: (rank[after.verdict] ?? 9) > (rank[before.verdict] ?? 9),
    });
  const old = new Map(before.requirements.map((one) => [one.id, one]));
  for (const one of after.requirements) {
    const was = old.get(one.id);
    old.delete(one.id);
    if (!was) {
      moved.push({
        run,
        id: one.id,
        before: 'not asked',
        after: one.verdict,
        change: null,
        unit: one.unit,
        worse: one.verdict === 'fail',
      });
      continue;
    }
    const change = was.margin === null || one.margin === null ? null : one.margin - was.margin;
    const bound = share * Math.max(Math.abs(was.margin ?? 0), Math.abs(one.margin ?? 0));
    const far = change !== null && Math.abs(change) > bound;
    if (was.verdict === one.verdict && !far) continue;
    const worse = was.verdict === one.verdict ? change! < 0 : (rank[one.verdict] ?? 9) > (rank[was.verdict] ?? 9);
    moved.push({ run, id: one.id, before: was.verdict, after: one.verdict, change, unit: one.unit, worse });
  }
  for (const one of old.values())
    moved.push({
      run,
      id: one.id,
      before: one.verdict,
      after: 'not asked',
      change: null,
      unit: one.unit,
      worse: one.verdict === 'pass',
    });
  return moved;
}
