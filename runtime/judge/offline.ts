import { type Expression, type Formula, holds, horizon, marginUnits, type Requirement } from './formula.js';
import { conclude, type RequirementResult } from './result.js';

/** A whole run: values of each signal at all ticks. */
export interface Trace {
  readonly ticks: number;
  /** Tick length, s. */
  readonly step: number;
  /** Values of a signal, `ticks` long. */
  values(path: string): ArrayLike<number>;
}

/**
 * Judges a requirement over a recorded run. Works on whole arrays and has nothing in common with the monitor but the formula
 * and the rule for the end of a run: windows by doubling instead of queues and trees.
 */
export function judgeTrace(requirement: Requirement, trace: Trace): RequirementResult {
  const { formula } = requirement;
  const weak = new Evaluation(trace, 1, trace.ticks + horizon(formula) + 1 + nesting(formula));
  const strong = new Evaluation(trace, -1, weak.length);
  const unit = [...marginUnits(formula)][0] ?? '1';
  const weakMargin = weak.outer(formula, 1);
  return conclude(requirement, unit, weakMargin, strong.outer(formula, 1), weak.triggerCount(), trace.ticks);
}

function nesting(formula: Formula): number {
  switch (formula.is) {
    case 'compare':
      return 0;
    case 'begins':
    case 'ends':
      return 1 + nesting(formula.of);
    case 'given':
      return Math.max(nesting(formula.condition), nesting(formula.consequence));
    default:
      return 'of' in formula ? nesting(formula.of) : Math.max(nesting(formula.left), nesting(formula.right));
  }
}

/** Values of an expression at the ticks of a run, for pictures. */
export function expressionValues(expression: Expression, trace: Trace): Float64Array {
  return new Evaluation(trace, 1, trace.ticks + 1).expression(expression);
}

interface Point {
  readonly margin: number;
  readonly tick: number;
}

/** Whether a is less than b, with -0 below +0. */
function less(a: number, b: number): boolean {
  return a < b || (a === b && Object.is(a, -0) && Object.is(b, 0));
}

class Evaluation {
  private readonly triggers: number[] = [];

  /** `view`: 1 weak, -1 strong. `length`: ticks of all arrays, with those behind the end of the run. */
  constructor(
    private readonly trace: Trace,
    private readonly view: number,
    readonly length: number,
  ) {}

  triggerCount(): number | undefined {
    return this.triggers.length === 0 ? undefined : Math.min(...this.triggers);
  }

  outer(formula: Formula, polarity: number): Point {
    const last = this.trace.ticks - 1;
    switch (formula.is) {
      case 'not':
        return negated(this.outer(formula.of, -polarity));
      case 'implies': {
        const left = negated(this.outer(formula.left, -polarity));
        const right = this.outer(formula.right, polarity);
        return right.margin > left.margin ? right : signed(left, Math.max(left.margin, right.margin));
      }
      case 'and': {
        const left = this.outer(formula.left, polarity);
        const right = this.outer(formula.right, polarity);
        return right.margin < left.margin ? right : signed(left, Math.min(left.margin, right.margin));
      }
      case 'or': {
        const left = this.outer(formula.left, polarity);
        const right = this.outer(formula.right, polarity);
        return right.margin > left.margin ? right : signed(left, Math.max(left.margin, right.margin));
      }
      case 'always':
      case 'eventually': {
        const to = formula.to ?? last;
        const body = this.inner(formula.of, polarity, formula.from, formula.to ?? Infinity);
        const greatest = formula.is === 'eventually';
        let margin = greatest ? -Infinity : Infinity;
        let tick = -1;
        for (let t = formula.from; t <= to; t += 1) {
          if (greatest ? less(margin, body[t]!) : less(body[t]!, margin)) {
            margin = body[t]!;
            tick = t;
          }
        }
        return { margin, tick };
      }
      case 'until': {
        const to = formula.to ?? last;
        const left = this.inner(formula.left, polarity, 0, formula.to ?? Infinity);
        const right = this.inner(formula.right, polarity, formula.from, formula.to ?? Infinity);
        let margin = -Infinity;
        let tick = -1;
        let before = Infinity;
        for (let t = 0; t <= to; t += 1) {
          const here = Math.min(right[t]!, before);
          if (t >= formula.from && less(margin, here)) {
            margin = here;
            tick = t;
          }
          before = Math.min(before, left[t]!);
        }
        return { margin, tick };
      }
      case 'start':
        return { margin: this.inner(formula.of, polarity, 0, 0)[0]!, tick: 0 };
      case 'end': {
        const body = this.inner(formula.of, polarity, 0, Infinity);
        return last >= 0 ? { margin: body[last]!, tick: last } : { margin: -Infinity, tick: -1 };
      }
      default:
        throw new Error(`${formula.is} stands outermost`);
    }
  }

  /** Margins at every tick; those within the formula's horizon of the array's end mean nothing. */
  private inner(formula: Formula, polarity: number, first: number, last: number): Float64Array {
    const n = this.length;
    switch (formula.is) {
      case 'compare': {
        const left = this.expression(formula.left);
        const right = this.expression(formula.right);
        const missing = polarity * this.view * Infinity;
        return array(n, (t) => {
          if (t >= this.trace.ticks) return missing;
          const margin = comparison(left[t]!, formula.relation, right[t]!);
          return (Number.isNaN(margin) ? -polarity * Infinity : margin) / (formula.per ?? 1);
        });
      }
      case 'not': {
        const of = this.inner(formula.of, -polarity, first, last);
        return array(n, (t) => -of[t]!);
      }
      case 'and':
      case 'or':
      case 'implies': {
        const left = this.inner(formula.left, formula.is === 'implies' ? -polarity : polarity, first, last);
        const right = this.inner(formula.right, polarity, first, last);
        if (formula.is === 'and') return array(n, (t) => Math.min(left[t]!, right[t]!));
        if (formula.is === 'or') return array(n, (t) => Math.max(left[t]!, right[t]!));
        return array(n, (t) => Math.max(-left[t]!, right[t]!));
      }
      case 'given': {
        const condition = this.inner(formula.condition, -polarity, first, last);
        const consequence = this.inner(formula.consequence, polarity, first, last);
        if (first <= last)
          this.countTriggers(condition, first, Math.min(last, this.trace.ticks - 1), formula.condition);
        return array(n, (t) => (holds(condition[t]!) ? consequence[t]! : Infinity));
      }
      case 'happens': {
        const of = this.inner(formula.of, polarity, first, last);
        return array(n, (t) => (holds(of[t]!) ? Infinity : -Infinity));
      }
      case 'begins':
      case 'ends': {
        const begins = formula.is === 'begins';
        const now = this.inner(formula.of, begins ? polarity : -polarity, first, last);
        const before = this.inner(formula.of, begins ? -polarity : polarity, Infinity, -Infinity);
        return array(n, (t) => {
          if (t === 0) return -Infinity;
          return begins ? Math.min(now[t]!, -before[t - 1]!) : Math.min(-now[t]!, before[t - 1]!);
        });
      }
      case 'always':
      case 'eventually': {
        const body = this.inner(formula.of, polarity, first + formula.from, last + formula.to!);
        const pick = formula.is === 'always' ? Math.min : Math.max;
        const window = stretches(body, formula.to! - formula.from + 1, pick);
        return array(n, (t) => window[Math.min(t + formula.from, n - 1)]!);
      }
      case 'until': {
        const left = this.inner(formula.left, polarity, first, last + formula.to!);
        const right = this.inner(formula.right, polarity, first + formula.from, last + formula.to!);
        const within = untilStretches(left, right, formula.to! - formula.from + 1);
        const before = formula.from > 0 ? stretches(left, formula.from, Math.min) : undefined;
        return array(n, (t) => {
          const value = within[Math.min(t + formula.from, n - 1)]!;
          return before ? Math.min(before[t]!, value) : value;
        });
      }
      default:
        throw new Error(`${formula.is} stands inside`);
    }
  }

  private countTriggers(condition: Float64Array, first: number, last: number, formula: Formula): void {
    let count = 0;
    let held = false;
    // Where the condition itself looks beyond the array nothing is known; the array is long enough for the run.
    const known = Math.min(last, this.length - 1 - horizon(formula));
    for (let t = first; t <= known; t += 1) {
      const now = holds(condition[t]!);
      if (now && !held) count += 1;
      held = now;
    }
    this.triggers.push(count);
  }

  /** Values at the ticks of the run. */
  expression(expression: Expression): Float64Array {
    const n = this.trace.ticks;
    switch (expression.is) {
      case 'signal': {
        const values = this.trace.values(expression.path);
        return array(n, (t) => values[t]!);
      }
      case 'number':
        return array(n, () => expression.value);
      case 'negative':
      case 'size': {
        const of = this.expression(expression.of);
        return array(n, expression.is === 'negative' ? (t) => -of[t]! : (t) => Math.abs(of[t]!));
      }
      case 'change':
      case 'rate': {
        const of = this.expression(expression.of);
        return array(n, (t) => {
          const before = Math.max(0, t - expression.over);
          const change = of[t]! - of[before]!;
          if (expression.is === 'change') return change;
          return t === 0 ? 0 : change / ((t - before) * this.trace.step);
        });
      }
      case 'integral': {
        const of = this.expression(expression.of);
        const pieces = array(n, (t) => (t === 0 ? 0 : 0.5 * (of[t - 1]! + of[t]!) * this.trace.step));
        return sums(pieces, expression.over);
      }
      case 'mean': {
        const of = this.expression(expression.of);
        const over = expression.over;
        const total = sums(of, over === null ? null : over + 1);
        return array(n, (t) => total[t]! / (over === null ? t + 1 : Math.min(t, over) + 1));
      }
      case 'peak':
      case 'trough': {
        const of = this.expression(expression.of);
        const pick = expression.is === 'peak' ? Math.max : Math.min;
        if (expression.over === null) {
          let extreme = of[0]!;
          return array(n, (t) => (extreme = pick(extreme, of[t]!)));
        }
        const backward = of.slice().reverse();
        const window = stretches(backward, expression.over + 1, pick);
        return array(n, (t) => window[n - 1 - t]!);
      }
      case 'count': {
        const of = this.inner(expression.of, 1, Infinity, -Infinity);
        let count = 0;
        return array(n, (t) => {
          if (holds(of[t]!) && (t === 0 || !holds(of[t - 1]!))) count += 1;
          return count;
        });
      }
      case 'duration': {
        const of = this.inner(expression.of, 1, Infinity, -Infinity);
        const ticks = new Float64Array(n + 1);
        for (let t = 0; t < n; t += 1) ticks[t + 1] = ticks[t]! + (holds(of[t]!) ? 1 : 0);
        return array(
          n,
          (t) =>
            (ticks[t + 1]! - ticks[expression.over === null ? 0 : Math.max(0, t + 1 - expression.over)]!) *
            this.trace.step,
        );
      }
      default: {
        const left = this.expression(expression.left);
        const right = this.expression(expression.right);
        const join = arithmetic[expression.is];
        return array(n, (t) => join(left[t]!, right[t]!));
      }
    }
  }
}

const arithmetic = {
  sum: (a: number, b: number) => a + b,
  difference: (a: number, b: number) => a - b,
  product: (a: number, b: number) => a * b,
  quotient: (a: number, b: number) => a / b,
  lesser: (a: number, b: number) => Math.min(a, b),
  greater: (a: number, b: number) => Math.max(a, b),
};

/** Equal sides give -0 (false) for strict relations and +0 (true) otherwise. */
function comparison(left: number, relation: string, right: number): number {
  if (left - right === 0) return relation === '<' || relation === '>' ? -0 : 0;
  return relation === '<' || relation === '<=' ? right - left : left - right;
}

function negated(point: Point): Point {
  return { margin: -point.margin, tick: point.tick };
}

function signed(point: Point, margin: number): Point {
  return { margin, tick: point.tick };
}

function array(length: number, value: (index: number) => number): Float64Array {
  const values = new Float64Array(length);
  for (let i = 0; i < length; i += 1) values[i] = value(i);
  return values;
}

/** result[i] = pick over values[i .. i + width - 1], cut at the end: two overlapping stretches of a power of two. */
function stretches(values: Float64Array, width: number, pick: (a: number, b: number) => number): Float64Array {
  const n = values.length;
  const at = (array: Float64Array, index: number) => array[Math.min(index, n - 1)]!;
  let doubled = values;
  let size = 1;
  while (size * 2 <= width) {
    const half = doubled;
    const reach = size;
    // Cut stretches overlap more; least and greatest do not mind.
    doubled = array(n, (i) => pick(half[i]!, at(half, i + reach)));
    size *= 2;
  }
  return array(n, (i) => pick(doubled[i]!, at(doubled, i + width - size)));
}

/** result[i] = until over the ticks i .. i + width - 1, from the binary digits of the width. */
function untilStretches(left: Float64Array, right: Float64Array, width: number): Float64Array {
  const n = left.length;
  let least = left;
  let until = right;
  const resultLeast = new Float64Array(n).fill(Infinity);
  const result = new Float64Array(n).fill(-Infinity);
  const filled = new Int32Array(n);
  for (let size = 1; size <= width; size *= 2) {
    if (width & size) {
      for (let i = 0; i < n; i += 1) {
        const next = i + filled[i]!;
        if (next < n) {
          result[i] = Math.max(result[i]!, Math.min(resultLeast[i]!, until[next]!));
          resultLeast[i] = Math.min(resultLeast[i]!, least[next]!);
        }
        filled[i] = filled[i]! + size;
      }
    }
    const [oldLeast, oldUntil, reach] = [least, until, size];
    until = array(n, (i) =>
      i + reach < n ? Math.max(oldUntil[i]!, Math.min(oldLeast[i]!, oldUntil[i + reach]!)) : oldUntil[i]!,
    );
    least = array(n, (i) => (i + reach < n ? Math.min(oldLeast[i]!, oldLeast[i + reach]!) : oldLeast[i]!));
  }
  return result;
}

/** Sums over the last `count` values (null: all), differences of prefix sums kept in double length; not finite: no number. */
function sums(values: Float64Array, count: number | null): Float64Array {
  const n = values.length;
  const high = new Float64Array(n + 1);
  const low = new Float64Array(n + 1);
  const spoilt = new Int32Array(n + 1);
  for (let i = 0; i < n; i += 1) {
    const value = Number.isFinite(values[i]!) ? values[i]! : 0;
    spoilt[i + 1] = spoilt[i]! + (Number.isFinite(values[i]!) ? 0 : 1);
    const sum = high[i]! + value;
    const part = sum - high[i]!;
    const error = high[i]! - (sum - part) + (value - part) + low[i]!;
    high[i + 1] = sum + error;
    low[i + 1] = error - (high[i + 1]! - sum);
  }
  return array(n, (t) => {
    const from = count === null ? 0 : Math.max(0, t + 1 - count);
    if (spoilt[t + 1]! - spoilt[from]! > 0) return Number.NaN;
    return high[t + 1]! - high[from]! + (low[t + 1]! - low[from]!);
  });
}
