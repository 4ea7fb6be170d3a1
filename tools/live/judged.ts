import type { RequirementFacts, RequirementStatus } from '../../bridge/live/source.js';
import type { Requirement } from '../../runtime/judge/formula.js';
import { requirementVerdicts } from '../../runtime/judge/result.js';
import { judgeSignal } from '../../runtime/judge/stage.js';

/** Requirements as the page lists them; `units` of the margins by path of a signal. */
export function requirementFacts(
  requirements: readonly Requirement[],
  signals: readonly { readonly path: string; readonly unit: string }[],
): RequirementFacts[] {
  const units = new Map(signals.map(({ path, unit }) => [path, unit]));
  return requirements.map(({ id, text }) => ({
    name: id,
    text,
    unit: units.get(`${judgeSignal(id)}.margin`) ?? '1',
  }));
}

/** Paths of the two signals that say how a requirement stands. */
export function judgedPaths({ id }: Requirement): readonly [verdict: string, margin: string] {
  return [`${judgeSignal(id)}.verdict`, `${judgeSignal(id)}.margin`];
}

/** How a requirement stands, from its two signals. `atTick`: the tick that the margin is of, as far as it is known. */
export function judgedStatus(
  verdict: number | undefined,
  margin: number | undefined,
  atTick: number,
): RequirementStatus {
  const word = requirementVerdicts[verdict ?? 0];
  const known = margin !== undefined && Number.isFinite(margin);
  let shown: RequirementStatus['verdict'] = 'not yet judged';
  if (word === 'fail') shown = 'violated';
  else if (word === 'pass' || (word === 'undecided' && known && margin >= 0)) shown = 'holds so far';
  return { verdict: shown, margin: known ? margin : Number.NaN, atTick };
}
