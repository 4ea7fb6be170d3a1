import type { LatenessCounts } from './cyclictest.js';

export interface Quantiles {
  readonly count: number;
  /** µs */
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly max: number;
}

export function quantiles(counts: LatenessCounts): Quantiles {
  const sorted = [...counts].filter((entry) => entry[1] > 0).sort((a, b) => a[0] - b[0]);
  const count = sorted.reduce((sum, entry) => sum + entry[1], 0);
  const at = (share: number) => {
    let seen = 0;
    for (const [value, part] of sorted) {
      seen += part;
      if (seen >= share * count) return value;
    }
    return 0;
  };
  return { count, p50: at(0.5), p99: at(0.99), p999: at(0.999), max: sorted.at(-1)?.[0] ?? 0 };
}

/** Adds the second counts to the first. */
export function pool(into: LatenessCounts, more: LatenessCounts): void {
  for (const [value, count] of more) into.set(value, (into.get(value) ?? 0) + count);
}

export interface StepVerdict {
  /** Length of the step, s. */
  readonly step: number;
  /** Part of the step that lateness may take, s; the rest is the tick's. */
  readonly allowed: number;
  /** Wake-ups later than that, of how many. */
  readonly later: number;
  readonly of: number;
  /** With 95 % confidence not more than this share of steps starts later than allowed. */
  readonly atMost: number;
}

const CONFIDENCE = 0.95;
/** Part of a step that lateness may take. */
const PART = 0.5;

/**
 * Which steps this computer holds, from the wake-ups that were measured and nothing beyond them. The bound is the exact
 * one-sided Poisson bound of a count (Garwood 1936, Biometrika 28, 437); it takes the late wake-ups for independent, and
 * they come in bursts: measure for minutes, under the load of the day.
 */
export function stepsHeld(counts: LatenessCounts, steps: readonly number[]): StepVerdict[] {
  const { count } = quantiles(counts);
  return steps.map((step) => {
    const allowed = PART * step;
    let later = 0;
    for (const [value, part] of counts) if (value > allowed * 1e6) later += part;
    return {
      step,
      allowed,
      later,
      of: count,
      atMost: count === 0 ? 1 : Math.min(1, poissonBound(later, CONFIDENCE) / count),
    };
  });
}

/** The largest mean under which a count as small as `count` still has the probability 1 - confidence. */
export function poissonBound(count: number, confidence: number): number {
  let low = count;
  let high = count + 10 + 6 * Math.sqrt(count + 1);
  for (let i = 0; i < 80; i += 1) {
    const middle = 0.5 * (low + high);
    if (poissonAtMost(count, middle) > 1 - confidence) low = middle;
    else high = middle;
  }
  return 0.5 * (low + high);
}

/** Probability of at most `count` events where `mean` are expected. */
function poissonAtMost(count: number, mean: number): number {
  // in logarithms: exp(-mean) alone vanishes for large means
  let sum = 0;
  let term = -mean;
  for (let k = 0; k <= count; k += 1) {
    if (k > 0) term += Math.log(mean / k);
    sum += Math.exp(term);
  }
  return sum;
}
