import type { RequirementResult } from './judge/result.js';

/** Of a whole run. */
export type RunVerdict = 'pass' | 'fail' | 'not exercised' | 'not valid';

/** Exit codes of every command. */
export const exitCode = { fine: 0, failed: 1, badInput: 2, notValid: 3, differs: 4, unfinished: 5 } as const;

/** Why a run does not count, whatever its requirements say. */
export interface Invalidity {
  readonly reason:
    | 'timing budget'
    | 'lost frames'
    | 'ledger residual'
    | 'ring overflow'
    | 'hand in the run'
    | 'ended early'
    | 'evidence';
  /** One sentence. */
  readonly what: string;
  readonly value?: number;
  readonly bound?: number;
  readonly unit?: string;
}

/** What a run says about itself. `undefined` in measured values: not measured, as timing at fast pace. */
export interface RunFacts {
  readonly ticks: number;
  /** Tick length, s. */
  readonly step: number;
  /** `complete`: it came to its planned end. `stopped`: by hand. `broken`: the controller was gone in lockstep, a crash. */
  readonly ending: 'complete' | 'stopped' | 'broken';
  /** What broke it, or who stopped it. */
  readonly endingReason?: string;
  /** Each measured value with its bound. */
  readonly timing: readonly Measured[];
  readonly frames: readonly Measured[];
  readonly ledger: readonly Measured[];
  /** Evidence that could not be stored: rows dropped by the ring, rings that overflowed. */
  readonly rowsLost: number;
  /** Hands that the scenario did not ask for, one sentence each. */
  readonly hands: readonly string[];
  /** Anything else that spoils the evidence, one sentence each. */
  readonly otherwise?: readonly string[];
}

export interface Measured {
  /** `99th percentile of lateness`, `relative energy residual`. */
  readonly name: string;
  readonly value: number;
  /** Undefined: no bound was given, the value is only shown. */
  readonly bound: number | undefined;
  readonly unit: string;
}

export interface RunJudgement {
  readonly verdict: RunVerdict;
  readonly valid: boolean;
  readonly reasons: readonly Invalidity[];
  readonly exitCode: number;
  readonly counts: {
    readonly pass: number;
    readonly fail: number;
    /** Those that had to be exercised. */
    readonly notExercised: number;
    /** Not exercised, and the run need not. */
    readonly atRest: number;
    readonly undecided: number;
  };
  /** One sentence. */
  readonly summary: string;
}

/**
 * The verdict of a run. What spoils the evidence goes before everything: such a run is `not valid`, and its failures are
 * reported as what they are, not as failures of the controller. Then one failed requirement makes it `fail`; one that was not
 * exercised or not decided makes it `not exercised`, never `pass`, unless it says that a run need not exercise it.
 * Observations decide nothing. Without requirements a valid run passes.
 *
 * Exit codes: 5 when the run broke, 3 not valid, 1 fail, 0 otherwise. `strict` counts not exercised as 1, for release gates.
 */
export function judgeRun(
  facts: RunFacts,
  results: readonly RequirementResult[],
  options: { readonly strict?: boolean } = {},
): RunJudgement {
  const reasons = invalidities(facts);
  const deciding = results.filter((result) => result.requirement.severity !== 'observation');
  const count = (verdict: RequirementResult['verdict']) =>
    deciding.filter((result) => result.verdict === verdict).length;
  const atRest = deciding.filter(
    ({ verdict, requirement }) => verdict === 'not exercised' && requirement.exercise === 'optional',
  ).length;
  const counts = {
    pass: count('pass'),
    fail: count('fail'),
    notExercised: count('not exercised') - atRest,
    atRest,
    undecided: count('undecided'),
  };
  const valid = reasons.length === 0;
  let verdict: RunVerdict = 'pass';
  if (!valid) verdict = 'not valid';
  else if (counts.fail > 0) verdict = 'fail';
  else if (counts.notExercised + counts.undecided > 0) verdict = 'not exercised';
  let code: number = exitCode.fine;
  if (facts.ending === 'broken') code = exitCode.unfinished;
  else if (verdict === 'not valid') code = exitCode.notValid;
  else if (verdict === 'fail' || (verdict === 'not exercised' && options.strict === true)) code = exitCode.failed;
  return {
    verdict,
    valid,
    reasons,
    exitCode: code,
    counts,
    summary: summary(verdict, reasons, counts, deciding.length),
  };
}

function invalidities(facts: RunFacts): Invalidity[] {
  const reasons: Invalidity[] = [];
  if (facts.ending !== 'complete') {
    const how = facts.ending === 'broken' ? 'could not be finished' : 'was stopped before its end';
    const at = `after ${(facts.ticks * facts.step).toFixed(3)} s`;
    reasons.push({
      reason: 'ended early',
      what: `the run ${how} ${at}${facts.endingReason === undefined ? '' : `: ${facts.endingReason}`}`,
    });
  } else if (facts.ticks === 0) {
    reasons.push({ reason: 'ended early', what: 'the run has no tick' });
  }
  const past = (reason: Invalidity['reason'], all: readonly Measured[]) => {
    for (const { name, value, bound, unit } of all) {
      // Not a number is past any bound.
      if (bound === undefined || value <= bound) continue;
      reasons.push({ reason, what: `${name} is past its bound`, value, bound, unit });
    }
  };
  past('timing budget', facts.timing);
  past('lost frames', facts.frames);
  past('ledger residual', facts.ledger);
  if (facts.rowsLost > 0) {
    reasons.push({
      reason: 'ring overflow',
      what: 'ticks are missing in the record',
      value: facts.rowsLost,
      bound: 0,
      unit: '1',
    });
  }
  for (const what of facts.hands) reasons.push({ reason: 'hand in the run', what });
  for (const what of facts.otherwise ?? []) reasons.push({ reason: 'evidence', what });
  return reasons;
}

function summary(
  verdict: RunVerdict,
  reasons: readonly Invalidity[],
  counts: RunJudgement['counts'],
  total: number,
): string {
  if (verdict === 'not valid') {
    const rest = reasons.length > 1 ? ` and ${reasons.length - 1} more` : '';
    return `This run does not count: ${reasons[0]!.what}${rest}.`;
  }
  if (total === 0) return 'The run is valid; nothing was required of it.';
  if (verdict === 'fail') return `${counts.fail} of ${total} requirements failed.`;
  if (verdict === 'not exercised') {
    const parts = [
      counts.notExercised > 0 ? `${counts.notExercised} not exercised` : '',
      counts.undecided > 0 ? `${counts.undecided} still open when the run ended` : '',
    ].filter((part) => part !== '');
    return `Of ${total} requirements none failed, but ${parts.join(' and ')}.`;
  }
  if (counts.atRest > 0) {
    return `${counts.pass} of ${total} requirements hold; ${counts.atRest} ${counts.atRest === 1 ? 'was' : 'were'} not exercised, which ${counts.atRest === 1 ? 'it' : 'they'} need not be in every run.`;
  }
  return total === 1 ? 'The requirement holds.' : `All ${total} requirements hold.`;
}
