/**
 * Requirements as plain data: signal temporal logic over sampled signals (Maler and Nickovic 2004), all values SI, all
 * times in ticks.
 *
 * Semantics, for a run of N ticks. rho(formula, t) is a margin (Fainekos and Pappas 2009; Donze and Maler 2010):
 *
 *   left < right, left <= right    right(t) - left(t)              left > right, left >= right    left(t) - right(t)
 *   and, or                        least, greatest of both         not                            -rho
 *   implies                        max(-rho(left), rho(right))
 *   given C then F                 rho(F, t) where C holds at t, +infinity where it does not: the trigger decides whether
 *                                  a tick counts and lends the margin no unit (margins of outputs given inputs, after
 *                                  Ferrere, Nickovic, Donze, Ito and Kapinski 2019)
 *   happens F                      +infinity where F holds, -infinity where not: a condition that lends no margin
 *   begins F                       min(rho(F, t), -rho(F, t - 1)); ends F: min(-rho(F, t), rho(F, t - 1)); -infinity at t = 0
 *   always [a, b] F                least rho(F, s) for s in [t + a, t + b];  eventually: greatest
 *   left until [a, b] right        greatest over s in [t + a, t + b] of min(rho(right, s), least rho(left, r), r in [t, s))
 *   start F, end F                 rho(F, 0), rho(F, N - 1)
 *
 * An upper bound `null` is the last tick of the run; it stands only outermost, as do `start` and `end`.
 *
 * Strict and non-strict comparisons differ only at a margin of zero: there the sign of the zero carries the truth (-0 is
 * false, +0 is true; negation, least and greatest keep that right). `holds` reads it. So a requirement is true exactly
 * when its two-valued reading is.
 *
 * A value that is not a number counts against the requirement, whichever way round the comparison stands.
 *
 * The end of the run. What bounded operators ask about ticks behind the last one is unknown. Two readings frame it
 * (weak and strong views on truncated paths, Eisner, Fisman, Havlicek, Lustig, McIsaac, Van Campenhout 2003): in the weak
 * one every missing comparison speaks for the requirement (+infinity), in the strong one against it (-infinity). False
 * even in the weak view: fail. True even in the strong view: pass. Otherwise the run ended before it was decided.
 */
export type Expression =
  | { readonly is: 'signal'; readonly path: string }
  /** `written` is how the author wrote it, `345 bar(g)`; for printing only. */
  | { readonly is: 'number'; readonly value: number; readonly written?: string }
  | { readonly is: Arithmetic; readonly left: Expression; readonly right: Expression }
  | { readonly is: 'negative' | 'size'; readonly of: Expression }
  /** `change`: x(t) - x(t - over), `rate`: that by its time, per s. Before tick `over` x(0) stands in; 0 at tick 0. */
  | { readonly is: 'change' | 'rate'; readonly of: Expression; readonly over: number }
  /** Trapezoids from tick 0, or over the last `over` ticks. An integral or a mean over a value that is not finite is no number. */
  | { readonly is: 'integral'; readonly of: Expression; readonly over: number | null }
  /** Over the ticks t - over .. t, or from tick 0. */
  | { readonly is: 'peak' | 'trough' | 'mean'; readonly of: Expression; readonly over: number | null }
  /** How often the formula has begun to hold up to now; from tick 0 counts as once. */
  | { readonly is: 'count'; readonly of: Formula }
  /** Seconds in which the formula has held, from tick 0 or among the last `over` ticks. */
  | { readonly is: 'duration'; readonly of: Formula; readonly over: number | null };

export type Arithmetic = 'sum' | 'difference' | 'product' | 'quotient' | 'lesser' | 'greater';
export type Relation = '<' | '<=' | '>' | '>=';

export type Formula =
  /** `unit` is the unit of the margin. `per` divides the margin, to make margins of different units comparable. */
  | {
      readonly is: 'compare';
      readonly left: Expression;
      readonly relation: Relation;
      readonly right: Expression;
      readonly unit: string;
      readonly per?: number;
      /** How the author wrote `per`; for printing only. */
      readonly perWritten?: string;
    }
  | { readonly is: 'and' | 'or' | 'implies'; readonly left: Formula; readonly right: Formula }
  | { readonly is: 'not' | 'happens' | 'begins' | 'ends' | 'start' | 'end'; readonly of: Formula }
  | { readonly is: 'given'; readonly condition: Formula; readonly consequence: Formula }
  | { readonly is: 'always' | 'eventually'; readonly from: number; readonly to: number | null; readonly of: Formula }
  | {
      readonly is: 'until';
      readonly left: Formula;
      readonly from: number;
      readonly to: number | null;
      readonly right: Formula;
    };

/** What a failure means. An `observation` is reported and never decides the verdict of a run. */
export type Severity = 'critical' | 'major' | 'minor' | 'observation';
export const severities: readonly Severity[] = ['critical', 'major', 'minor', 'observation'];

export interface Requirement {
  readonly id: string;
  /** For people. */
  readonly text: string;
  readonly formula: Formula;
  readonly severity: Severity;
  readonly source?: string;
  readonly link?: string;
  /** What it counts as when the run ended before it was decided. Default: undecided. */
  readonly openAtEnd?: 'undecided' | 'pass' | 'fail';
  /**
   * `optional`: a run in which its trigger never came may pass all the same. It is shown as not exercised, and a suite
   * in which no run exercised it does not pass. Default: required.
   */
  readonly exercise?: 'required' | 'optional';
}

/** Whether a margin means true: above zero, or a zero with a plus. */
export function holds(margin: number): boolean {
  return margin > 0 || 1 / margin === Infinity;
}

/** Ticks that must pass behind t before rho(formula, t) is known. Outermost unbounded operators count as 0 wide. */
export function horizon(formula: Formula): number {
  switch (formula.is) {
    case 'compare':
      return 0;
    case 'and':
    case 'or':
    case 'implies':
      return Math.max(horizon(formula.left), horizon(formula.right));
    case 'not':
    case 'happens':
    case 'begins':
    case 'ends':
    case 'start':
    case 'end':
      return horizon(formula.of);
    case 'given':
      return Math.max(horizon(formula.condition), horizon(formula.consequence));
    case 'always':
    case 'eventually':
      return (formula.to ?? 0) + horizon(formula.of);
    case 'until':
      return (formula.to ?? 0) + Math.max(horizon(formula.left), horizon(formula.right));
  }
}

/** The formulas directly inside. */
export function parts(formula: Formula): readonly Formula[] {
  switch (formula.is) {
    case 'compare':
      return [];
    case 'and':
    case 'or':
    case 'implies':
    case 'until':
      return [formula.left, formula.right];
    case 'given':
      return [formula.condition, formula.consequence];
    default:
      return [formula.of];
  }
}

/** Units of the margins that can become the margin of the formula; triggers lend none. */
export function marginUnits(formula: Formula, found: Set<string> = new Set()): Set<string> {
  if (formula.is === 'compare') found.add(formula.unit);
  else if (formula.is === 'given') marginUnits(formula.consequence, found);
  else if (formula.is === 'happens') return found;
  else for (const part of parts(formula)) marginUnits(part, found);
  return found;
}

/** Calls `visit` for every signal path in a formula, triggers and counts included. */
export function eachSignal(formula: Formula, visit: (path: string) => void): void {
  const inside = (expression: Expression): void => {
    if (expression.is === 'signal') visit(expression.path);
    else if (expression.is === 'count' || expression.is === 'duration') eachSignal(expression.of, visit);
    else if ('left' in expression) {
      inside(expression.left);
      inside(expression.right);
    } else if ('of' in expression) inside(expression.of);
  };
  if (formula.is === 'compare') {
    inside(formula.left);
    inside(formula.right);
  } else for (const part of parts(formula)) eachSignal(part, visit);
}
