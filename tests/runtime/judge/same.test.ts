import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Formula, Requirement } from '../../../runtime/judge/formula.js';
import { compileRequirement } from '../../../runtime/judge/monitor.js';
import { judgeTrace } from '../../../runtime/judge/offline.js';
import type { RequirementResult } from '../../../runtime/judge/result.js';
import { SignalTable } from '../../../runtime/signals.js';
import { definition, isTrue, type SampledRun } from './definition.js';
import { formulas, runs } from './random.js';

const paths = ['a.x', 'b.y', 'c.z'];

function requirement(formula: Formula): Requirement {
  return { id: 'R', text: '', formula, severity: 'major' };
}

function online(formula: Formula, run: SampledRun): RequirementResult {
  const table = new SignalTable();
  for (const path of paths) table.add({ path, unit: '1', about: '', group: 'state' });
  const { judge, block, windows } = compileRequirement(requirement(formula), table, run.step);
  const signals = new Float64Array(paths.length);
  for (let t = 0; t < run.ticks; t += 1) {
    for (let i = 0; i < paths.length; i += 1) signals[i] = run.signals[paths[i]!]![t]!;
    judge.tick(t, signals, block, windows);
  }
  return judge.finish(run.ticks, block, windows)[0]!;
}

function offline(formula: Formula, run: SampledRun): RequirementResult {
  return judgeTrace(requirement(formula), { ticks: run.ticks, step: run.step, values: (path) => run.signals[path]! });
}

/** 1e-12 of the larger, or of 1. */
function agree(a: number, b: number): boolean {
  return Object.is(a, b) || Math.abs(a - b) <= 1e-12 * Math.max(1, Math.abs(a), Math.abs(b));
}

describe('monitor, offline evaluator and definition give the same margins', () => {
  it('to the bit, with verdicts, ticks and triggers, where all sums are exact', () => {
    const verdicts: Record<string, number> = {};
    let open = 0;
    let finite = 0;
    fc.assert(
      fc.property(formulas(6).filter(exact), runs(24, 'dyadic'), (formula, run) => {
        const monitored = online(formula, run);
        const evaluated = offline(formula, run);
        const weak = definition(formula, run, 1);
        const strong = definition(formula, run, -1);
        verdicts[monitored.verdict] = (verdicts[monitored.verdict] ?? 0) + 1;
        if (monitored.open) open += 1;
        if (Number.isFinite(monitored.margin)) finite += 1;
        if (run.ticks > 0) {
          expect([monitored.most, monitored.least]).toEqual([weak, strong]);
          expect(monitored.verdict === 'fail').toBe(!isTrue(weak));
          if (monitored.verdict === 'pass') expect(isTrue(strong)).toBe(true);
          if (monitored.verdict === 'undecided') expect([isTrue(strong), monitored.open]).toEqual([false, true]);
        }
        expect(evaluated).toEqual(monitored);
      }),
      { numRuns: 6000, seed: 20240117 },
    );
    // The sample reaches every outcome.
    for (const verdict of ['pass', 'fail', 'not exercised', 'undecided'])
      expect(verdicts[verdict], verdict).toBeGreaterThan(50);
    expect(open).toBeGreaterThan(100);
    expect(finite).toBeGreaterThan(1500);
  });

  it('to 1e-12 on real numbers', () => {
    fc.assert(
      fc.property(formulas(6).filter(continuous), runs(24, 'real'), (formula, run) => {
        const monitored = online(formula, run);
        const evaluated = offline(formula, run);
        const weak = definition(formula, run, 1);
        const strong = definition(formula, run, -1);
        expect(agree(monitored.most, weak), `weak ${monitored.most} ${weak}`).toBe(true);
        expect(agree(monitored.least, strong), `strong ${monitored.least} ${strong}`).toBe(true);
        expect(agree(evaluated.most, weak), `offline weak ${evaluated.most} ${weak}`).toBe(true);
        expect(agree(evaluated.least, strong), `offline strong ${evaluated.least} ${strong}`).toBe(true);
      }),
      { numRuns: 3000, seed: 4 },
    );
  });

  it('with windows longer than the run and shorter, monitor against offline evaluator', () => {
    fc.assert(
      fc.property(formulas(300).filter(exact), runs(700, 'dyadic'), (formula, run) => {
        expect(offline(formula, run)).toEqual(online(formula, run));
      }),
      { numRuns: 400, seed: 7 },
    );
  });

  it('a longer run than any window, with slopes and jumps', () => {
    const slope = Array.from({ length: 20000 }, (_, t) => (t % 5000 < 4000 ? (t % 5000) * 0.25 : -2));
    const run = {
      ticks: slope.length,
      step: 0.5,
      signals: { 'a.x': slope, 'b.y': slope.map((x) => -x), 'c.z': slope.map((x, t) => (x + t) % 7) },
    };
    const signal = (path: string) => ({ is: 'signal' as const, path });
    const formula: Formula = {
      is: 'always',
      from: 0,
      to: null,
      of: {
        is: 'until',
        left: { is: 'compare', left: signal('a.x'), relation: '>', right: signal('b.y'), unit: '1' },
        from: 3,
        to: 4500,
        right: {
          is: 'eventually',
          from: 10,
          to: 3000,
          of: {
            is: 'compare',
            left: { is: 'peak', of: signal('c.z'), over: 900 },
            relation: '>=',
            right: { is: 'number', value: 3 },
            unit: '1',
          },
        },
      },
    };
    expect(offline(formula, run)).toEqual(online(formula, run));
  });
});

/** No sum over something that is not a small multiple of a power of two. */
function exact(formula: Formula): boolean {
  const text = JSON.stringify(formula);
  return !/"(integral|mean)"/.test(text) || !/"(quotient|mean|rate)"/.test(text.replace('"is":"mean"', ''));
}

/** No truth of a sum decides what is counted: there rounding would show. */
function continuous(formula: Formula): boolean {
  const text = JSON.stringify(formula);
  return (
    !/"(given|happens|count|duration)"/.test(text) ||
    !/"(integral|mean|duration|product|quotient|rate|sum|difference)"/.test(text)
  );
}
