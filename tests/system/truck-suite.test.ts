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

  it('touches every kind of fault of sensors, messages, hydraulics and driveline', () => {
    const all = faultCatalogue(spec);
    const kindOf = (path: string) => {
      const entry = all.find((one) => one.path === path)!;
      return `${entry.of}.${path.split('.')[1]}`;
    };
    const used = new Set(
      scripts.flatMap((script) =>
        script.steps.filter((step) => step.action === 'fault').map((step) => kindOf(step.target)),
      ),
    );
    for (const name of ['drift', 'stuck', 'shortToGround', 'shortToSupply', 'addedNoise', 'spikes'])
      expect(used).toContain(`pressure-sensor.${name}`);
    for (const name of ['faultSilent', 'faultFrozen', 'faultDelay', 'faultLost', 'faultCorrupted'])
      expect([...used].some((one) => one.startsWith('message') && one.endsWith(name))).toBe(true);
    for (const name of [
      'isolation-valve.stuckAt',
      'relief-valve.settingFactor',
      'relief-valve.stuckAt',
      'gas-accumulator.gasLeak',
      'pump-motor.wear',
      'pump-motor.stuck',
      'orifice.blocked',
      'clutch.capacityFactor',
      'combustion-engine.derate',
    ])
      expect(used).toContain(name);
  });

  it('documents each run that the demo controller fails', () => {
    const page = readFileSync(`${folder}/README.md`, 'utf8');
    for (const [, number] of page.matchAll(/^\| (\d\d)[ a-z]* \| [A-Z]{2}-/gm))
      expect(entries.some((entry) => entry.name.startsWith(`${number}-`))).toBe(true);
  });
});
