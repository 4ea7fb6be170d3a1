import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { BuildError } from '../../../runtime/contract.js';
import { planRun } from '../../../tools/run/plan.js';

describe('planRun', () => {
  const folder = mkdtempSync(path.join(tmpdir(), 'oilspring-plan-'));
  afterAll(() => rmSync(folder, { recursive: true }));
  const bench = new URL('../../../configs/flywheel-stand/bench.yaml', import.meta.url).pathname;

  it('refuses a recording that exists before anything is built', () => {
    const record = path.join(folder, 'taken.osrec');
    const wish = { bench, pace: 'fast', record } as const;
    expect(planRun(wish).recording).toBe(record);
    writeFileSync(record, 'somebody needs this');
    let said: BuildError | undefined;
    try {
      planRun(wish);
    } catch (error) {
      said = error as BuildError;
    }
    expect(said).toBeInstanceOf(BuildError);
    expect(said!.problems).toEqual([
      { path: '--record', what: 'it exists already', value: record, remedy: 'choose another name' },
    ]);
  });
});
