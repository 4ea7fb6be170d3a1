import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { afterAll, describe, expect, it } from 'vitest';
import { Recording } from '../../../runtime/recording/reader.js';
import type { RunRequirement, RunSummary } from '../../../runtime/run-summary.js';
import { movedBetween } from '../../../tools/compare/compare-runs.js';
import { judgeSuite, kept, type SuiteResult } from '../../../tools/suite/result.js';
import { suiteJunit } from '../../../tools/suite/suite-junit.js';
import { runCommand, scratch, truck } from '../../system/command.js';

const folder = scratch();
afterAll(() => folder.remove());

const requirement = (id: string, verdict: RunRequirement['verdict'], margin: number | null): RunRequirement => ({
  id,
  text: `${id} <holds>`,
  severity: 'major',
  verdict,
  margin,
  unit: 'Pa',
  at: 1,
  triggers: null,
  open: false,
  optional: true,
});
const result = (name: string, verdict: SuiteResult['verdict'], requirements: RunRequirement[] = []): SuiteResult => ({
  name,
  title: name,
  scenario: `${name}.yaml`,
  key: 'k',
  verdict,
  exitCode: 0,
  why: verdict === 'broken' ? ['signal SIGSEGV'] : [],
  summary: verdict === 'broken' ? null : ({ requirements, simulated: 1, faults: [] } as unknown as RunSummary),
  took: 1,
  recording: `${name}.osrec`,
});

describe('the verdict over a suite', () => {
  const pass = result('a', 'pass', [requirement('R-1', 'pass', 5), requirement('R-2', 'not exercised', null)]);
  const closer = result('b', 'pass', [requirement('R-1', 'pass', 2), requirement('R-2', 'pass', 7)]);

  it('passes when every requirement was exercised somewhere', () => {
    expect(judgeSuite([pass, closer], 2)).toMatchObject({ verdict: 'pass', exitCode: 0 });
    expect(judgeSuite([pass], 1)).toMatchObject({
      verdict: 'not exercised',
      summary: '1 of 1 runs pass, no run exercised R-2.',
    });
  });

  it('fails with one run that failed; is not valid with one that broke or is missing', () => {
    const failed = result('c', 'fail', [requirement('R-1', 'fail', -1)]);
    expect(judgeSuite([pass, closer, failed, result('d', 'broken')], 4)).toMatchObject({
      verdict: 'fail',
      exitCode: 1,
    });
    expect(judgeSuite([pass, closer, result('d', 'broken')], 3)).toMatchObject({ verdict: 'not valid', exitCode: 3 });
    expect(judgeSuite([pass, closer], 3)).toMatchObject({ verdict: 'not valid', exitCode: 5 });
    expect(judgeSuite([pass, closer, failed], 3).requirements[0]).toMatchObject({
      id: 'R-1',
      passed: 2,
      failed: ['c'],
      least: { margin: -1, run: 'c' },
    });
  });

  it('keeps what did not pass and the least margin of each requirement', () => {
    expect([...kept([pass, closer, result('d', 'broken')])].sort()).toEqual(['b', 'd']);
    expect([...kept([pass, result('e', 'pass', [requirement('R-3', 'pass', 1)])])].sort()).toEqual(['a', 'e']);
  });

  it('goes into JUnit XML, a broken run as an error', () => {
    const xml = suiteJunit([pass, result('d', 'broken')]);
    expect(xml).toContain('R-1 &lt;holds&gt;');
    expect(xml).toContain('<error type="broken" message="signal SIGSEGV">');
    expect(xml.match(/<testsuite /g)).toHaveLength(2);
  });
});

describe('what moved between two outcomes', () => {
  const of = (verdict: string, ...requirements: RunRequirement[]) => ({ run: 'r', verdict, requirements });
  it('tells worse from better, and margins beyond the tolerance', () => {
    const before = of(
      'pass',
      requirement('A', 'pass', 100),
      requirement('B', 'pass', 100),
      requirement('C', 'fail', -3),
    );
    const after = of('fail', requirement('A', 'fail', -1), requirement('B', 'pass', 99.5), requirement('C', 'pass', 1));
    expect(movedBetween(before, after, 0.01).map(({ id, worse, change }) => [id, worse, change])).toEqual([
      ['', true, null],
      ['A', true, -101],
      ['C', false, 4],
    ]);
    expect(movedBetween(before, after, 0.001).map(({ id, worse }) => [id, worse])).toContainEqual(['B', true]);
    expect(movedBetween(before, before, 0)).toEqual([]);
    expect(movedBetween(of('pass', requirement('A', 'pass', 1)), of('pass'), 0)).toMatchObject([
      { id: 'A', after: 'not asked', worse: true },
    ]);
  });
});

describe('suite and compare as commands', () => {
  it('run, go on from before, and find where two releases part', async () => {
    const scenarios = folder.file('set');
    mkdirSync(scenarios);
    writeFileSync(
      `${scenarios}/hold.yaml`,
      'scenario: hold\nlasts: $length\nparameters: { length: 400 ms }\ncases: { short: { length: 300 ms }, long: { length: 500 ms } }\nrequirements: { S-1: always abs(body.velocity) < 1 km/h }\n',
    );
    writeFileSync(
      `${scenarios}/roll.yaml`,
      'scenario: roll\nlasts: 400 ms\nstart: { speed: 20 km/h, gear: 3 }\nrequirements: { S-2: at the end body.velocity < 1 km/h }\n',
    );
    const words = ['suite', scenarios, '--bench', truck, '--jobs', '1', '--keep', 'all', '--json'];
    const out = folder.file('out');
    const first = await runCommand(
      ...words,
      '--out',
      out,
      '--junit',
      folder.file('s.xml'),
      '--report',
      folder.file('s.html'),
    );
    expect(first.errors).not.toContain('error');
    expect(first.code).toBe(1);
    const said = JSON.parse(first.output) as { verdict: string; runs: { name: string; verdict: string }[] };
    expect(said.verdict).toBe('fail');
    expect(said.runs.map(({ name, verdict }) => [name, verdict])).toEqual([
      ['hold.short', 'pass'],
      ['hold.long', 'pass'],
      ['roll', 'fail'],
    ]);
    expect(readdirSync(out).filter((name) => name.endsWith('.osrec'))).toHaveLength(3);
    expect(readFileSync(folder.file('s.html'), 'utf8')).toContain('s-roll.html');
    const again = await runCommand(...words, '--out', out, '--resume');
    expect(again.code).toBe(1);
    expect(JSON.parse(again.output).took).toBeLessThan(JSON.parse(first.output).took);

    const other = folder.file('seed.osrec');
    await runCommand(
      'run',
      truck,
      '--scenario',
      `${scenarios}/hold.yaml`,
      '--case',
      'long',
      '--pace',
      'fast',
      '--seed',
      '2',
      '--json',
      '--record',
      other,
    );
    const same = await runCommand('compare', `${out}/hold.long.osrec`, `${out}/hold.long.osrec`, '--json');
    expect([same.code, JSON.parse(same.output).signals]).toEqual([0, []]);
    const differs = await runCommand('compare', `${out}/hold.long.osrec`, other, '--json', '--tolerance', '1 %');
    const found = JSON.parse(differs.output) as { firstState: number; signals: { path: string; first: number }[] };
    expect(differs.code).not.toBe(0);
    // another seed: the first noise that a sensor draws parts the states
    expect(found.firstState).toBe(-1000);
    expect(found.signals[0]!.path).toMatch(/Sensor/);
    expect((await runCommand('compare', out, out)).code).toBe(0);
  });

  it('run live, one after another, and go on from before', async () => {
    const scenarios = folder.file('live-set');
    mkdirSync(scenarios);
    writeFileSync(
      `${scenarios}/hold.yaml`,
      'scenario: hold\nlasts: $length\nparameters: { length: 200 ms }\ncases: { a: { length: 200 ms }, b: { length: 300 ms } }\nrequirements: { S-1: always abs(body.velocity) < 1 km/h }\n',
    );
    const out = folder.file('live-out');
    const words = ['suite', scenarios, '--bench', truck, '--out', out, '--keep', 'all', '--jobs', '2'];
    const live = await runCommand(...words, '--pace', 'live');
    expect(live.output).toContain('live, one after another');
    const results = ['a', 'b'].map(
      (name) => JSON.parse(readFileSync(`${out}/hold.${name}.json`, 'utf8')) as SuiteResult,
    );
    // a computer that is busy may spoil the timing, and nothing else
    for (const { verdict, summary } of results) {
      expect(['pass', 'not valid']).toContain(verdict);
      expect(summary).toMatchObject({ pace: 'live', ending: 'complete' });
    }
    const times = results
      .map((one) => new Recording(`${out}/${one.recording}`))
      .map((recording) => {
        const created = Date.parse(recording.header.created);
        recording.close();
        return created;
      });
    // the second begins when the first has had its pre-roll of a second, its run and its after-run
    expect(times[1]! - times[0]!).toBeGreaterThan(1500);
    const again = await runCommand(...words, '--pace', 'live', '--resume');
    expect(again.output.match(/from before/g)).toHaveLength(2);
  });
});
