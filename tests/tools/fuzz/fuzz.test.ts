import { describe, expect, it } from 'vitest';
import { Coverage } from '../../../tools/fuzz/coverage.js';
import { fuzz, type Target } from '../../../tools/fuzz/fuzzer.js';
import { allTargets } from '../../../tools/fuzz/targets.js';

/** Seeded and short; `npm run fuzz-inputs` is the long one. */
const targets = await allTargets();
/** Inputs to those that read hundreds a second, and to those that read thousands. */
const slow = new Set(['bench', 'scenario', 'csv', 'requirement']);

describe.each(targets)('$name: $about', (target) => {
  it('is read or refused, whatever it is', () => {
    const found = fuzz(target, { seed: 1, inputs: slow.has(target.name) ? 60 : 1500 });
    expect(found.failures.map(({ error }) => error)).toEqual([]);
    expect(found.read).toBeGreaterThan(0);
    expect(found.read).toBeLessThanOrEqual(found.inputs + target.seeds.length);
  });

  it('has its planted bug found', () => {
    for (const seed of target.seeds) {
      const read = target.decode(seed);
      if (read !== undefined) expect(target.planted(read)).toBe(false);
    }
    const found = fuzz(target, { seed: 1, inputs: slow.has(target.name) ? 20_000 : 300_000, planted: true });
    expect(found.failures.length).toBeGreaterThan(0);
    expect(found.failures[0]!.error.message).toBe('the planted bug');
  });
});

it('keeps what reaches new code and gets to a bug behind four steps, which chance alone does not', () => {
  const staircase: Target = {
    name: 'staircase',
    about: '',
    seeds: [new Uint8Array(8)],
    words: [],
    longest: 8,
    decode: (input) => {
      if (input[0] !== 0x7f) return undefined;
      if (input[2] !== 0x80) return 1;
      if (input[4] !== 0xcb) return 2;
      if (input[6] !== 0xd9) return 3;
      return 4;
    },
    planted: (read) => read === 4,
  };
  const wishes = { seed: 3, inputs: 20_000, planted: true };
  // first: V8 counts blocks only in what it compiles from then on
  const coverage = new Coverage(/fuzz\.test\.ts/);
  try {
    const found = fuzz(staircase, { ...wishes, coverage });
    expect(found.failures.length).toBeGreaterThan(0);
    expect(found.kept).toBeGreaterThanOrEqual(4);
  } finally {
    coverage.close();
  }
  expect(fuzz(staircase, wishes).failures).toEqual([]);
});

it('reads a product of units that no unit can be written for as an error with its place', () => {
  const requirement = targets.find((target) => target.name === 'requirement')!;
  const text = `always ${Array.from({ length: 6 }, () => '1 s2').join(' * ')} > 1`;
  expect(requirement.decode(Uint8Array.from(Buffer.from(text)))).toBeUndefined();
});
