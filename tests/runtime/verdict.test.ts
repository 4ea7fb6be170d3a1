import { describe, expect, it } from 'vitest';
import type { Severity } from '../../runtime/judge/formula.js';
import type { RequirementResult, RequirementVerdict } from '../../runtime/judge/result.js';
import { judgeRun, type RunFacts } from '../../runtime/verdict.js';

const sound: RunFacts = {
  ticks: 1000,
  step: 0.001,
  ending: 'complete',
  timing: [],
  frames: [],
  ledger: [],
  rowsLost: 0,
  hands: [],
};

function result(verdict: RequirementVerdict, severity: Severity = 'major'): RequirementResult {
  const one = { is: 'number' as const, value: 1 };
  const formula = {
    is: 'end' as const,
    of: { is: 'compare' as const, left: one, relation: '<' as const, right: one, unit: '1' },
  };
  return {
    requirement: { id: 'R', text: '', formula, severity },
    verdict,
    margin: 0,
    unit: '1',
    tick: 0,
    triggers: undefined,
    open: false,
    least: 0,
    most: 0,
  };
}

describe('verdict of a run', () => {
  it('follows the worst of what decides', () => {
    const verdicts = (...all: RequirementVerdict[]) => {
      const { verdict, exitCode } = judgeRun(
        sound,
        all.map((one) => result(one)),
      );
      return [verdict, exitCode];
    };
    expect(verdicts()).toEqual(['pass', 0]);
    expect(verdicts('pass', 'pass')).toEqual(['pass', 0]);
    expect(verdicts('pass', 'fail', 'not exercised')).toEqual(['fail', 1]);
    expect(verdicts('pass', 'not exercised')).toEqual(['not exercised', 0]);
    expect(verdicts('pass', 'undecided')).toEqual(['not exercised', 0]);
    expect(judgeRun(sound, [result('not exercised')], { strict: true }).exitCode).toBe(1);
  });

  it('lets observations decide nothing', () => {
    expect(judgeRun(sound, [result('pass'), result('fail', 'observation')]).verdict).toBe('pass');
  });

  it('is not valid for each reason, before any failure', () => {
    const spoilt: [Partial<RunFacts>, string][] = [
      [{ timing: [{ name: 'lateness', value: 300e-6, bound: 200e-6, unit: 's' }] }, 'timing budget'],
      [{ timing: [{ name: 'lateness', value: Number.NaN, bound: 200e-6, unit: 's' }] }, 'timing budget'],
      [{ frames: [{ name: 'lost', value: 3, bound: 0, unit: '1' }] }, 'lost frames'],
      [{ ledger: [{ name: 'energy', value: 2e-3, bound: 1e-4, unit: '1' }] }, 'ledger residual'],
      [{ rowsLost: 2 }, 'ring overflow'],
      [{ hands: ['brake pedal set to 1'] }, 'hand in the run'],
      [{ ending: 'stopped' }, 'ended early'],
      [{ otherwise: ['the file system was full'] }, 'evidence'],
      [{ ticks: 0 }, 'ended early'],
    ];
    for (const [change, reason] of spoilt) {
      const judged = judgeRun({ ...sound, ...change }, [result('fail')]);
      expect(judged, reason).toMatchObject({ verdict: 'not valid', valid: false, exitCode: 3 });
      expect(judged.reasons.map((one) => one.reason)).toEqual([reason]);
    }
    expect(judgeRun({ ...sound, ending: 'broken', endingReason: 'controller gone' }, []).exitCode).toBe(5);
  });

  it('says in one sentence what the run is worth', () => {
    const said = (facts: Partial<RunFacts>, ...all: RequirementVerdict[]) =>
      judgeRun(
        { ...sound, ...facts },
        all.map((one) => result(one)),
      ).summary;
    expect(said({})).toBe('The run is valid; nothing was required of it.');
    expect(said({}, 'pass')).toBe('The requirement holds.');
    expect(said({}, 'pass', 'pass')).toBe('All 2 requirements hold.');
    expect(said({}, 'pass', 'fail', 'not exercised')).toBe('1 of 3 requirements failed.');
    expect(said({}, 'pass', 'not exercised')).toBe('Of 2 requirements none failed, but 1 not exercised.');
    expect(said({}, 'undecided', 'undecided', 'not exercised')).toBe(
      'Of 3 requirements none failed, but 1 not exercised and 2 still open when the run ended.',
    );
    expect(said({}, 'pass', 'undecided')).toBe('Of 2 requirements none failed, but 1 still open when the run ended.');
    expect(said({ ending: 'broken', endingReason: 'controller gone' }, 'pass')).toBe(
      'This run does not count: the run could not be finished after 1.000 s: controller gone.',
    );
    expect(said({ ending: 'stopped', rowsLost: 2, hands: ['brake'] })).toBe(
      'This run does not count: the run was stopped before its end after 1.000 s and 2 more.',
    );
    expect(judgeRun({ ...sound, ticks: 0 }, []).reasons[0]!.what).toBe('the run has no tick');
    expect(judgeRun({ ...sound, rowsLost: 2 }, []).reasons[0]).toEqual({
      reason: 'ring overflow',
      what: 'ticks are missing in the record',
      value: 2,
      bound: 0,
      unit: '1',
    });
    const timing = [{ name: 'lateness', value: 3, bound: 2, unit: 's' }];
    expect(judgeRun({ ...sound, timing }, []).reasons[0]!.what).toBe('lateness is past its bound');
    // only one that is not exercised can be at rest
    const held = { ...result('pass'), requirement: { ...result('pass').requirement, exercise: 'optional' as const } };
    expect(judgeRun(sound, [held]).counts).toMatchObject({ pass: 1, atRest: 0 });
  });

  it('counts a value at its bound as within, and one without a bound as shown only', () => {
    const timing = [
      { name: 'lateness', value: 2, bound: 2, unit: 's' },
      { name: 'period', value: 9, bound: undefined, unit: 's' },
    ];
    expect(judgeRun({ ...sound, timing }, []).verdict).toBe('pass');
  });

  it('passes with a requirement at rest that need not be exercised in every run, and says so', () => {
    const rest = result('not exercised');
    const optional = { ...rest, requirement: { ...rest.requirement, exercise: 'optional' as const } };
    const judged = judgeRun(sound, [result('pass'), optional], { strict: true });
    expect(judged.verdict).toBe('pass');
    expect(judged.exitCode).toBe(0);
    expect(judged.counts).toMatchObject({ pass: 1, notExercised: 0, atRest: 1 });
    expect(judged.summary).toContain('1 was not exercised');
    expect(judgeRun(sound, [rest, optional]).verdict).toBe('not exercised');
  });
});
