import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { pathToFileURL } from 'node:url';
import ts from 'typescript';
import { afterAll, describe, expect, it } from 'vitest';
import type { ControllerFactory } from '../../../tools/loop/controller-module.js';
import { type Mutant, planted } from '../../../tools/mutants/mutant.js';
import { compiled, mutations } from '../../../tools/mutants/mutate.js';
import { plantedBugs } from '../../../tools/mutants/planted-bugs.js';
import { sample } from '../../../tools/mutants/sample.js';
import { moduleFile, type Trial, TrialBench, worse } from '../../../tools/mutants/trial.js';
import { readBenchFile } from '../../../tools/run/plan.js';
import { suiteEntries } from '../../../tools/suite/entries.js';

const home = new URL('../../../configs/harbour-truck/', import.meta.url).pathname;
const source = readFileSync(`${home}controller.ts`, 'utf8');
const folder = mkdtempSync(path.join(tmpdir(), 'oilspring-mutants-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const syntaxErrors = (text: string) =>
  (ts.createSourceFile('c.ts', text, ts.ScriptTarget.ES2022) as unknown as { parseDiagnostics: unknown[] })
    .parseDiagnostics.length;

describe('planted mistakes', () => {
  const all = plantedBugs.map((bug) => planted(source, bug));

  it('are at least 25, each a sound text of its own', () => {
    expect(all.length).toBeGreaterThanOrEqual(25);
    expect(new Set(all.map((one) => one.name)).size).toBe(all.length);
    expect(new Set(all.map((one) => one.source)).size).toBe(all.length);
    for (const one of all) expect([one.name, syntaxErrors(one.source)]).toEqual([one.name, 0]);
  });

  it('are refused when the source has moved on', () => {
    const bug = { name: 'b', mistake: 'm', edits: [{ from: 'x = 1', to: 'x = 2' }] };
    expect(planted('let x = 1;', bug).source).toBe('let x = 2;');
    for (const text of ['let x = 3;', 'let x = 1; x = 1;']) expect(() => planted(text, bug)).toThrow(/expected once/);
  });
});

describe('mechanical mutations', () => {
  it('are these of a small source, and no other', () => {
    const text = 'if (a < 2 && !b) c = Math.min(-d, e ? 0 : f);\n';
    expect(mutations(text).map((one) => [one.name, one.source.trim()])).toEqual([
      ['1.5 always true', 'if (true) c = Math.min(-d, e ? 0 : f);'],
      ['1.5 never true', 'if (false) c = Math.min(-d, e ? 0 : f);'],
      ['1.11 && to ||', 'if (a < 2 || !b) c = Math.min(-d, e ? 0 : f);'],
      ['1.7 < to >=', 'if (a >= 2 && !b) c = Math.min(-d, e ? 0 : f);'],
      ['1.9 2 to 4', 'if (a < 4 && !b) c = Math.min(-d, e ? 0 : f);'],
      ['1.14 without !', 'if (a < 2 && b) c = Math.min(-d, e ? 0 : f);'],
      ['1.18 statement left out', 'if (a < 2 && !b) ;'],
      ['1.22 Math.min to Math.max', 'if (a < 2 && !b) c = Math.max(-d, e ? 0 : f);'],
      ['1.31 without -', 'if (a < 2 && !b) c = Math.min(d, e ? 0 : f);'],
      ['1.35 always the first arm', 'if (a < 2 && !b) c = Math.min(-d, (0));'],
      ['1.35 always the second arm', 'if (a < 2 && !b) c = Math.min(-d, (f));'],
      ['1.39 0 to 1', 'if (a < 2 && !b) c = Math.min(-d, e ? 1 : f);'],
    ]);
  });

  it('of the demo controller are all sound texts that differ', () => {
    const all = mutations(source);
    expect(all.length).toBeGreaterThan(300);
    expect(new Set(all.map((one) => one.name)).size).toBe(all.length);
    expect(new Set(all.map((one) => one.source)).size).toBe(all.length);
    for (const one of sample(all, 60, 3)) expect([one.name, syntaxErrors(one.source)]).toEqual([one.name, 0]);
  });
});

describe('a sample', () => {
  it('is drawn by its seed, in order, without repetition', () => {
    const all = Array.from({ length: 50 }, (_, i) => i);
    const drawn = sample(all, 10, 7);
    expect(drawn).toEqual(sample(all, 10, 7));
    expect(drawn).not.toEqual(sample(all, 10, 8));
    expect(new Set(drawn).size).toBe(10);
    expect([...drawn].sort((a, b) => a - b)).toEqual(drawn);
  });
});

describe('what counts as caught', () => {
  const trial = (verdicts: Trial['verdicts'], more: Partial<Trial> = {}): Trial => ({
    verdicts,
    optional: ['O'],
    trouble: [],
    hash: '0',
    ticks: 100,
    took: 1,
    ...more,
  });
  const before = trial({ A: 'pass', B: 'fail', O: 'pass' });

  it('is a requirement that fails now, a run that is not valid now, one no longer exercised', () => {
    expect(worse(before, trial({ A: 'fail', B: 'fail', O: 'pass' }))).toBe('A failed');
    expect(worse(before, trial({ A: 'pass', B: 'fail', O: 'pass' }, { trouble: ['thrown: x'] }))).toBe('thrown: x');
    expect(worse(before, trial({ A: 'not exercised', B: 'fail', O: 'pass' }))).toMatch(/^A no longer/);
  });

  it('is not what failed before, what gets better, or what need not be exercised', () => {
    expect(worse(before, before)).toBeUndefined();
    expect(worse(before, trial({ A: 'pass', B: 'pass', O: 'not exercised' }))).toBeUndefined();
  });
});

describe('a seeded sample of mutants against two runs of the suite', () => {
  const { spec } = readBenchFile(`${home}bench.yaml`);
  const wanted = ['06-hard-braking.usual', '11-both-pedals.charged'];
  const entries = suiteEntries(`${home}scenarios/suite`, spec, spec.seed, '').filter((one) =>
    wanted.includes(one.name),
  );
  const rig = new TrialBench(spec, spec.seed);
  const load = async (name: string, text: string) => {
    const file = moduleFile(folder, name);
    writeFileSync(file, compiled(text));
    return (await import(pathToFileURL(file).href)) as ControllerFactory;
  };
  const caught = async (mutant: Mutant, before: readonly Trial[]) => {
    const factory = await load(mutant.name, mutant.source);
    return entries.some((entry, i) => worse(before[i]!, rig.run(entry, factory, new Set())) !== undefined);
  };

  it('let the sound controller pass, which comes to the same state again', async () => {
    expect(entries).toHaveLength(2);
    const sound = await load('sound', source);
    const first = entries.map((entry) => rig.run(entry, sound));
    const again = rig.run(entries[0]!, sound);
    expect(again.hash).toBe(first[0]!.hash);
    for (const one of first) expect([one.trouble, Object.values(one.verdicts).includes('fail')]).toEqual([[], false]);
  });

  it('catch most of the planted ones', async () => {
    const sound = await load('sound', source);
    const before = entries.map((entry) => rig.run(entry, sound));
    const drawn = sample(plantedBugs, 4, 11).map((bug) => planted(source, bug));
    const results = await Promise.all(drawn.map((one) => caught(one, before)));
    expect(results.filter(Boolean).length).toBeGreaterThanOrEqual(2);
  });
});
