import fc from 'fast-check';
import type { Expression, Formula, Relation } from '../../../runtime/judge/formula.js';

/** Random formulas that may be judged, over signals a.x, b.y, c.z; windows up to `most` ticks. */
export function formulas(most: number): fc.Arbitrary<Formula> {
  const span = fc.integer({ min: 1, max: most });
  const interval = fc
    .tuple(fc.integer({ min: 0, max: most }), fc.integer({ min: 0, max: most }))
    .map(([from, width]) => ({ from, to: from + width }));
  const signal: fc.Arbitrary<Expression> = fc
    .constantFrom('a.x', 'b.y', 'c.z')
    .map((path) => ({ is: 'signal' as const, path }));
  const number: fc.Arbitrary<Expression> = fc
    .integer({ min: -4, max: 4 })
    .map((value) => ({ is: 'number' as const, value }));

  const present: fc.Arbitrary<Formula> = fc
    .tuple(signal, fc.constantFrom<Relation>('<', '<=', '>', '>='), number)
    .map(([left, relation, right]) => ({ is: 'compare' as const, left, relation, right, unit: '1' }));
  const past: fc.Arbitrary<Formula> = fc.oneof(
    present,
    present.map((of) => ({ is: 'begins' as const, of })),
    present.map((of) => ({ is: 'not' as const, of })),
  );

  const { expression } = fc.letrec<{ expression: Expression }>((tie) => ({
    expression: fc.oneof(
      { depthSize: 'small', withCrossShrink: true },
      { arbitrary: signal, weight: 4 },
      { arbitrary: number, weight: 1 },
      {
        arbitrary: fc
          .tuple(
            fc.constantFrom('sum', 'difference', 'product', 'quotient', 'lesser', 'greater'),
            tie('expression'),
            tie('expression'),
          )
          .map(([is, left, right]) => ({ is, left, right }) as Expression),
        weight: 2,
      },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('negative', 'size'), tie('expression'))
          .map(([is, of]) => ({ is, of }) as Expression),
        weight: 1,
      },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('change', 'rate'), tie('expression'), span)
          .map(([is, of, over]) => ({ is, of, over }) as Expression),
        weight: 1,
      },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('integral', 'mean', 'peak', 'trough'), tie('expression'), fc.option(span))
          .map(([is, of, over]) => ({ is, of, over }) as Expression),
        weight: 2,
      },
      { arbitrary: past.map((of) => ({ is: 'count' as const, of })), weight: 1 },
      {
        arbitrary: fc.tuple(past, fc.option(span)).map(([of, over]) => ({ is: 'duration' as const, of, over })),
        weight: 1,
      },
    ),
  }));

  const compare: fc.Arbitrary<Formula> = fc
    .tuple(
      expression,
      fc.constantFrom<Relation>('<', '<=', '>', '>='),
      expression,
      fc.option(fc.constantFrom(2, 0.25), { nil: undefined }),
    )
    .map(([left, relation, right, per]) => ({
      is: 'compare' as const,
      left,
      relation,
      right,
      unit: '1',
      ...(per === undefined ? {} : { per }),
    }));

  const { inner } = fc.letrec<{ inner: Formula }>((tie) => ({
    inner: fc.oneof(
      { depthSize: 'small', withCrossShrink: true },
      { arbitrary: compare, weight: 3 },
      { arbitrary: present, weight: 2 },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('and', 'or', 'implies'), tie('inner'), tie('inner'))
          .map(([is, left, right]) => ({ is, left, right }) as Formula),
        weight: 2,
      },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('not', 'happens', 'begins', 'ends'), tie('inner'))
          .map(([is, of]) => ({ is, of }) as Formula),
        weight: 2,
      },
      {
        arbitrary: fc
          .tuple(tie('inner'), tie('inner'))
          .map(([condition, consequence]) => ({ is: 'given' as const, condition, consequence })),
        weight: 1,
      },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('always', 'eventually'), interval, tie('inner'))
          .map(([is, i, of]) => ({ is, ...i, of }) as Formula),
        weight: 2,
      },
      {
        arbitrary: fc
          .tuple(tie('inner'), interval, tie('inner'))
          .map(([left, i, right]) => ({ is: 'until' as const, left, ...i, right })),
        weight: 1,
      },
    ),
  }));

  const outerInterval = fc.oneof(
    interval,
    fc.integer({ min: 0, max: most }).map((from) => ({ from, to: null })),
    fc.constant({ from: 0, to: null }),
  );
  const { outer } = fc.letrec<{ outer: Formula }>((tie) => ({
    outer: fc.oneof(
      { depthSize: 'xsmall', withCrossShrink: true },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('always', 'eventually'), outerInterval, inner)
          .map(([is, i, of]) => ({ is, ...i, of }) as Formula),
        weight: 5,
      },
      {
        arbitrary: fc
          .tuple(inner, outerInterval, inner)
          .map(([left, i, right]) => ({ is: 'until' as const, left, ...i, right })),
        weight: 2,
      },
      { arbitrary: inner.map((of) => ({ is: 'start' as const, of })), weight: 1 },
      { arbitrary: past.map((of) => ({ is: 'end' as const, of })), weight: 1 },
      {
        arbitrary: fc
          .tuple(fc.constantFrom('and', 'or', 'implies'), tie('outer'), tie('outer'))
          .map(([is, left, right]) => ({ is, left, right }) as Formula),
        weight: 1,
      },
      { arbitrary: tie('outer').map((of) => ({ is: 'not' as const, of })), weight: 1 },
    ),
  }));
  return outer;
}

/** A run of small multiples of a quarter (ties, exact zeros, exact sums) or of reals; now and then a value that is no number. */
export function runs(
  longest: number,
  kind: 'dyadic' | 'real',
): fc.Arbitrary<{ ticks: number; step: number; signals: Record<string, number[]> }> {
  const whole = fc.integer({ min: -4, max: 4 });
  const value = fc.oneof(
    { arbitrary: whole, weight: 12 },
    { arbitrary: kind === 'real' ? fc.double({ min: -5, max: 5, noNaN: true }) : whole.map((x) => x / 4), weight: 12 },
    { arbitrary: fc.constant(Number.NaN), weight: 1 },
  );
  return fc.integer({ min: 0, max: longest }).chain((ticks) => {
    const signal = fc.array(value, { minLength: ticks, maxLength: ticks });
    const step = kind === 'real' ? fc.constantFrom(0.001, 0.5) : fc.constant(0.5);
    return fc.record({
      ticks: fc.constant(ticks),
      step,
      signals: fc.record({ 'a.x': signal, 'b.y': signal, 'c.z': signal }),
    });
  });
}
