import { holds, type Requirement } from './formula.js';

/** Of a requirement. While the run lasts, `pass` means: nothing against it so far. */
export type RequirementVerdict = 'undecided' | 'pass' | 'fail' | 'not exercised';
/** By number, as it stands in the block. */
export const requirementVerdicts: readonly RequirementVerdict[] = ['undecided', 'pass', 'fail', 'not exercised'];

export interface RequirementResult {
  readonly requirement: Requirement;
  readonly verdict: RequirementVerdict;
  /** In `unit`; infinite where nothing was asked. In a pass what is sure, otherwise what the run showed. */
  readonly margin: number;
  readonly unit: string;
  /** Tick that decided the margin, -1 where none did. */
  readonly tick: number;
  /** How often its trigger came (the rarest trigger, when it has several); undefined without one. */
  readonly triggers: number | undefined;
  /** The run ended before it was decided. */
  readonly open: boolean;
  /** Margins of the strong and the weak view of the end of the run; equal when everything was known. */
  readonly least: number;
  readonly most: number;
}

/** The verdict from both views of the end of the run. */
export function conclude(
  requirement: Requirement,
  unit: string,
  weak: { readonly margin: number; readonly tick: number },
  strong: { readonly margin: number; readonly tick: number },
  triggers: number | undefined,
  ticks: number,
): RequirementResult {
  const decided = !holds(weak.margin) || holds(strong.margin);
  let verdict: RequirementVerdict;
  let open = false;
  if (ticks === 0) {
    verdict = 'not exercised';
  } else if (!holds(weak.margin)) {
    verdict = 'fail';
  } else if (triggers === 0) {
    verdict = 'not exercised';
  } else if (decided) {
    verdict = 'pass';
  } else {
    verdict = requirement.openAtEnd ?? 'undecided';
    open = true;
  }
  const shown = verdict === 'pass' && !open ? strong : weak;
  return {
    requirement,
    verdict,
    margin: shown.margin,
    unit,
    tick: shown.tick,
    triggers,
    open,
    least: strong.margin,
    most: weak.margin,
  };
}
