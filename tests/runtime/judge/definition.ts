import type { Expression, Formula } from '../../../runtime/judge/formula.js';

/**
 * Margins straight from the definition: one recursive function of a formula and a tick, every least and greatest a loop.
 * Knows neither monitor nor offline evaluator.
 */
export interface SampledRun {
  readonly ticks: number;
  readonly step: number;
  readonly signals: Readonly<Record<string, readonly number[]>>;
}

export function isTrue(margin: number): boolean {
  return margin === 0 ? Object.is(margin, 0) : margin > 0;
}

/** `view` 1: what is missing behind the end speaks for the requirement (weak), -1: against it (strong). */
export function definition(formula: Formula, run: SampledRun, view: 1 | -1): number {
  const N = run.ticks;

  const value = (x: Expression, t: number): number => {
    const span = (over: number | null) => (over === null ? 0 : Math.max(0, t - over));
    switch (x.is) {
      case 'signal':
        return run.signals[x.path]![t]!;
      case 'number':
        return x.value;
      case 'sum':
        return value(x.left, t) + value(x.right, t);
      case 'difference':
        return value(x.left, t) - value(x.right, t);
      case 'product':
        return value(x.left, t) * value(x.right, t);
      case 'quotient':
        return value(x.left, t) / value(x.right, t);
      case 'lesser':
        return Math.min(value(x.left, t), value(x.right, t));
      case 'greater':
        return Math.max(value(x.left, t), value(x.right, t));
      case 'negative':
        return -value(x.of, t);
      case 'size':
        return Math.abs(value(x.of, t));
      case 'change':
        return value(x.of, t) - value(x.of, span(x.over));
      case 'rate':
        return t === 0 ? 0 : (value(x.of, t) - value(x.of, span(x.over))) / ((t - span(x.over)) * run.step);
      case 'peak':
      case 'trough': {
        let result = value(x.of, t);
        for (let s = span(x.over); s <= t; s += 1)
          result = x.is === 'peak' ? Math.max(result, value(x.of, s)) : Math.min(result, value(x.of, s));
        return result;
      }
      case 'integral': {
        let total = 0;
        for (let s = span(x.over) + 1; s <= t; s += 1) total += ((value(x.of, s - 1) + value(x.of, s)) / 2) * run.step;
        return Number.isFinite(total) ? total : Number.NaN;
      }
      case 'mean': {
        let total = 0;
        for (let s = span(x.over); s <= t; s += 1) total += value(x.of, s);
        return Number.isFinite(total) ? total / (t - span(x.over) + 1) : Number.NaN;
      }
      case 'count': {
        let total = 0;
        for (let s = 0; s <= t; s += 1)
          if (isTrue(rho(x.of, s, 1)) && (s === 0 || !isTrue(rho(x.of, s - 1, 1)))) total += 1;
        return total;
      }
      case 'duration': {
        let total = 0;
        for (let s = x.over === null ? 0 : Math.max(0, t - x.over + 1); s <= t; s += 1)
          if (isTrue(rho(x.of, s, 1))) total += run.step;
        return total;
      }
    }
  };

  const least = (from: number, to: number, of: (s: number) => number) => {
    let result = Infinity;
    for (let s = from; s <= to; s += 1) result = Math.min(result, of(s));
    return result;
  };
  const greatest = (from: number, to: number, of: (s: number) => number) => {
    let result = -Infinity;
    for (let s = from; s <= to; s += 1) result = Math.max(result, of(s));
    return result;
  };

  const memory = new Map<string, number>();
  const names = new Map<Formula, number>();
  const rho = (f: Formula, t: number, polarity: 1 | -1): number => {
    if (!names.has(f)) names.set(f, names.size);
    const key = `${names.get(f)} ${t} ${polarity}`;
    let known = memory.get(key);
    if (known === undefined) {
      known = compute(f, t, polarity);
      memory.set(key, known);
    }
    return known;
  };
  const compute = (f: Formula, t: number, polarity: 1 | -1): number => {
    const other = polarity === 1 ? -1 : 1;
    switch (f.is) {
      case 'compare': {
        if (t >= N) return view * polarity * Infinity;
        const left = value(f.left, t);
        const right = value(f.right, t);
        if (Number.isNaN(left) || Number.isNaN(right) || Number.isNaN(left - right)) return -polarity * Infinity;
        const up = f.relation === '>' || f.relation === '>=';
        const size = up ? left - right : right - left;
        const zero = f.relation === '<=' || f.relation === '>=' ? 0 : -0;
        return size === 0 ? zero : size / (f.per ?? 1);
      }
      case 'not':
        return -rho(f.of, t, other);
      case 'and':
        return Math.min(rho(f.left, t, polarity), rho(f.right, t, polarity));
      case 'or':
        return Math.max(rho(f.left, t, polarity), rho(f.right, t, polarity));
      case 'implies':
        return Math.max(-rho(f.left, t, other), rho(f.right, t, polarity));
      case 'given':
        return isTrue(rho(f.condition, t, other)) ? rho(f.consequence, t, polarity) : Infinity;
      case 'happens':
        return isTrue(rho(f.of, t, polarity)) ? Infinity : -Infinity;
      case 'begins':
        return t === 0 ? -Infinity : Math.min(rho(f.of, t, polarity), -rho(f.of, t - 1, other));
      case 'ends':
        return t === 0 ? -Infinity : Math.min(-rho(f.of, t, other), rho(f.of, t - 1, polarity));
      case 'always':
        return least(t + f.from, f.to === null ? N - 1 : t + f.to, (s) => rho(f.of, s, polarity));
      case 'eventually':
        return greatest(t + f.from, f.to === null ? N - 1 : t + f.to, (s) => rho(f.of, s, polarity));
      case 'until':
        return greatest(t + f.from, f.to === null ? N - 1 : t + f.to, (s) =>
          Math.min(
            rho(f.right, s, polarity),
            least(t, s - 1, (r) => rho(f.left, r, polarity)),
          ),
        );
      case 'start':
        return rho(f.of, 0, polarity);
      case 'end':
        return rho(f.of, N - 1, polarity);
    }
  };
  return rho(formula, 0, 1);
}
