import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { stringify } from 'yaml';
import { readBench } from '../../configs/bench.js';
import { memoryFiles } from '../../configs/files.js';
import { BuildError } from '../../runtime/contract.js';
import { catalogue } from './catalogue.js';
import { smallBench } from './small-bench.js';

/** Reads a text; anything thrown that is not a BuildError with places fails the test. */
function survives(text: string): void {
  try {
    readBench(
      'bench.yaml',
      catalogue,
      memoryFiles({ 'bench.yaml': text, 'other.yaml': 'stores: { spare: { is: volume, volume: 1 L } }\n' }),
    );
  } catch (error) {
    expect(error).toBeInstanceOf(BuildError);
    const { problems } = error as BuildError;
    expect(problems.length).toBeGreaterThan(0);
    for (const problem of problems) {
      expect(problem.where, `${problem.path}: ${problem.what}`).toBeDefined();
      expect(problem.where!.line).toBeGreaterThan(0);
      expect(problem.remedy).not.toBe('');
      expect(problem.what).not.toBe('');
    }
  }
}

const words = [...new Set(smallBench.match(/[A-Za-z]+/g))];
const leaf = fc.oneof(
  fc.constantFrom(...words),
  fc.constantFrom(
    '5 L',
    '150 bar(g)',
    '10 ms',
    '0 .. 5 bar(g)',
    'highLine',
    'highLine.pressure',
    '*',
    'constructor',
    '__proto__',
    '1e400',
    '-0',
  ),
  fc.string({ maxLength: 12 }),
  fc.double(),
  fc.boolean(),
  fc.constant(null),
);
const tree = fc.letrec((tie) => ({
  node: fc.oneof({ maxDepth: 6 }, leaf, tie('mapping'), fc.array(tie('node'), { maxLength: 3 })),
  mapping: fc.dictionary(fc.oneof(fc.constantFrom(...words), fc.string({ maxLength: 6 })), tie('node'), { maxKeys: 5 }),
})).mapping;

describe('whatever a file holds, reading it ends in a bench or in a BuildError', () => {
  it('text', () => {
    fc.assert(fc.property(fc.string({ maxLength: 200 }), survives), { numRuns: 300 });
  });

  it('YAML trees of known and unknown words', () => {
    fc.assert(
      fc.property(tree, (value) => survives(stringify(value))),
      { numRuns: 300 },
    );
  });

  it('the small bench with a subtree replaced', () => {
    const sections = [
      'fluids',
      'stores',
      'branches',
      'instruments',
      'links',
      'messages',
      'watch',
      'life',
      'controller',
      'record',
      'ambient',
      'budgets',
      'include',
    ];
    fc.assert(
      fc.property(fc.constantFrom(...sections), tree, (key, value) => {
        const lines = smallBench.split('\n');
        const from = lines.findIndex((line) => line.startsWith(`${key}:`));
        const next = lines.findIndex((line, i) => i > from && /^\w/.test(line));
        const rest = from < 0 ? lines : [...lines.slice(0, from), ...lines.slice(next)];
        survives(`${rest.join('\n')}\n${stringify({ [key]: value })}`);
      }),
      { numRuns: 300 },
    );
  });

  it('the small bench with a few characters changed, dropped or put in', () => {
    const edit = fc.tuple(
      fc.integer({ min: 0, max: smallBench.length }),
      fc.integer({ min: 0, max: 5 }),
      fc.oneof(fc.string({ maxLength: 4 }), fc.constantFrom(...words)),
    );
    fc.assert(
      fc.property(fc.array(edit, { minLength: 1, maxLength: 3 }), (edits) => {
        let text = smallBench;
        for (const [at, drop, put] of edits) text = text.slice(0, at) + put + text.slice(at + drop);
        survives(text);
      }),
      { numRuns: 300 },
    );
  });
});
