import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { faultCatalogue } from '../../configs/faults.js';
import { diskFiles } from '../../configs/files.js';
import { readScenario } from '../../configs/scenario.js';
import { suiteEntries } from '../../tools/suite/entries.js';

const root = new URL('../../configs/harbour-truck/', import.meta.url).pathname;

/** The suite itself takes minutes; here it is read, not run. */
describe('the suite of the harbour truck', () => {
  const spec = readBench(`${root}bench.yaml`, catalogue);
  const folder = `${root}scenarios/suite`;
  const entries = suiteEntries(folder, spec, 1, '');
  const scripts = entries.map((entry) => readScenario(entry.file, spec, diskFiles, { case: entry.case }).script);

  it('has at least 30 runs, each with requirements of its own and names of its own', () => {
    expect(entries.length).toBeGreaterThanOrEqual(30);
    expect(new Set(entries.map((entry) => entry.name)).size).toBe(entries.length);
    for (const script of scripts) expect([script.name, script.requirements.length > 0]).toEqual([script.name, true]);
  });

  it('has a scenario for every fault of the catalogue, on one of its owners at least', () => {
    // the name of a fault with what it sits in: all sensors share theirs
    const kindOf = ({ path, group, of }: ReturnType<typeof faultCatalogue>[number]) =>
      `${group === 'component' ? of : group}.${path.slice(path.indexOf('.') + 1)}`;
    const all = faultCatalogue(spec);
    const byPath = new Map(all.map((one) => [one.path, kindOf(one)]));
    const used = new Set(
      scripts.flatMap((script) =>
        script.steps.flatMap((step) => (step.action === 'fault' ? byPath.get(step.target)! : [])),
      ),
    );
    const kinds = [...new Set(all.map(kindOf))];
    expect(kinds.length).toBeGreaterThan(30);
    expect(kinds.filter((kind) => !used.has(kind))).toEqual([]);
  });

  it('documents each run that the demo controller fails', () => {
    const page = readFileSync(`${folder}/README.md`, 'utf8');
    for (const [, number] of page.matchAll(/^\| (\d\d)[ a-z]* \| [A-Z]{2}-/gm))
      expect(entries.some((entry) => entry.name.startsWith(`${number}-`))).toBe(true);
  });
});
