import { type Expression, type Formula, horizon, marginUnits, parts } from './formula.js';

/** What is wrong with a formula, and at which node. */
export interface FormulaProblem {
  readonly at: Formula | Expression;
  readonly what: string;
  readonly remedy: string;
}

/** Longest window, ticks: one hour at 1 kHz. Its memory is reserved before the run. */
export const longestWindow = 3_600_000;

/** All that keeps a formula from being judged: no time said, unbounded operators inside, bad intervals, mixed units. */
export function examineFormula(formula: Formula): FormulaProblem[] {
  const problems: FormulaProblem[] = [];
  const add = (at: Formula | Expression, what: string, remedy: string) => problems.push({ at, what, remedy });

  const window = (at: Formula, from: number, to: number | null, inner: boolean) => {
    if (!Number.isInteger(from) || from < 0 || (to !== null && (!Number.isInteger(to) || to < from))) {
      add(at, 'an interval that is no range of ticks', 'let it begin at 0 or later and end no earlier than it begins');
    } else if (to !== null && to > longestWindow) {
      add(at, `an interval longer than ${longestWindow} ticks`, 'shorten it');
    }
    if (to === null && inner) {
      add(at, `'${at.is}' without an end inside another time operator`, 'give it a bound, such as: within 5 s');
    }
  };

  /** Outermost: evaluated once, at tick 0. */
  const outer = (at: Formula): void => {
    switch (at.is) {
      case 'compare':
      case 'given':
      case 'happens':
      case 'begins':
      case 'ends':
        add(
          at,
          'a condition that does not say when',
          'put always, never, eventually, at the start or at the end before it',
        );
        inner(at);
        return;
      case 'always':
      case 'eventually':
      case 'until':
        window(at, at.from, at.to, false);
        for (const part of parts(at)) inner(part);
        return;
      case 'start':
        inner(at.of);
        return;
      case 'end':
        inner(at.of);
        if (horizon(at.of) > 0)
          add(at, "'at the end' over something that looks ahead", 'say eventually or always for it');
        return;
      default:
        for (const part of parts(at)) outer(part);
    }
  };

  /** Inside: evaluated at every tick. */
  const inner = (at: Formula): void => {
    if (at.is === 'start' || at.is === 'end')
      add(at, `'at the ${at.is}' inside another time operator`, 'move it outside');
    if (at.is === 'always' || at.is === 'eventually' || at.is === 'until') window(at, at.from, at.to, true);
    if (at.is === 'compare') {
      if (at.per !== undefined && !(at.per > 0 && Number.isFinite(at.per)))
        add(at, 'a scale of the margin that is not above zero', 'give a positive scale');
      value(at.left);
      value(at.right);
      return;
    }
    for (const part of parts(at)) inner(part);
  };

  const value = (at: Expression): void => {
    switch (at.is) {
      case 'signal':
      case 'number':
        return;
      case 'count':
      case 'duration':
        if (horizon(at.of) > 0)
          add(at, `'${at.is}' of something that looks ahead`, 'let it look at the present tick or back');
        inner(at.of);
        break;
      case 'negative':
      case 'size':
      case 'change':
      case 'rate':
      case 'integral':
      case 'peak':
      case 'trough':
      case 'mean':
        value(at.of);
        break;
      default:
        value(at.left);
        value(at.right);
        return;
    }
    if ('over' in at && at.over !== null && !(Number.isInteger(at.over) && at.over >= 1 && at.over <= longestWindow)) {
      add(at, 'a span that is no number of ticks', `give one between 1 and ${longestWindow} ticks`);
    }
  };

  outer(formula);
  const units = marginUnits(formula);
  if (units.size > 1) {
    add(
      formula,
      `margins in different units (${[...units].join(', ')})`,
      'split the requirement, or use whenever ... then or (...) happens, which lend no margin',
    );
  }
  return problems;
}
