import { createHash } from 'node:crypto';
import { existsSync, readdirSync, readFileSync, statSync } from 'node:fs';
import path from 'node:path';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { diskFiles } from '../../configs/files.js';
import { readScenario, scenarioCases } from '../../configs/scenario.js';
import { CommandError } from '../commands/failure.js';
import { softwareVersion } from '../run/host-run.js';

/** One run of a suite: a scenario file, or one of its cases. */
export interface SuiteEntry {
  /** `over-pressure`, `payload.heavy`: names its files. */
  readonly name: string;
  readonly title: string;
  readonly file: string;
  readonly case: string | undefined;
  /** Simulated time, s. */
  readonly length: number;
  /** Digest of all that the run follows from: bench, scenario, case, seed, software. */
  readonly key: string;
}

/**
 * The scenario files of a folder and those below it, by name; each case of a file is a run of its own. `how`: whatever else the
 * outcome follows from, such as pace and controller. Throws BuildError.
 */
export function suiteEntries(folder: string, spec: BenchSpec, seed: number, how: string): SuiteEntry[] {
  if (!existsSync(folder) || !statSync(folder).isDirectory())
    throw new CommandError(`${folder} is no folder: name one with scenario files`);
  const files = scenarioFiles(folder);
  if (files.length === 0) throw new CommandError(`${folder} holds no scenario: put files *.yaml into it`);
  const bench = createHash('sha256').update(softwareVersion()).update(how).update(String(seed));
  for (const source of spec.sources) bench.update(source.name).update(source.text);
  const before = bench.digest('hex');
  return files.flatMap((file) => {
    const name = path
      .relative(folder, file)
      .replace(/\.ya?ml$/, '')
      .split(path.sep)
      .join('.');
    const cases = scenarioCases(file);
    return (cases.length === 0 ? [undefined] : cases).map((one): SuiteEntry => {
      const { script, sources } = readScenario(file, spec, diskFiles, { case: one });
      const key = createHash('sha256')
        .update(before)
        .update(one ?? '');
      for (const source of sources) key.update(source.text);
      return {
        name: one === undefined ? name : `${name}.${one.replace(/[^A-Za-z0-9-]+/g, '-')}`,
        title: script.name,
        file,
        case: one,
        length: script.ticks * spec.step,
        key: key.digest('hex'),
      };
    });
  });
}

function scenarioFiles(folder: string): string[] {
  return readdirSync(folder, { withFileTypes: true })
    .sort((a, b) => (a.name < b.name ? -1 : 1))
    .flatMap((entry) => {
      const file = path.join(folder, entry.name);
      if (entry.isDirectory()) return scenarioFiles(file);
      // A file that scenarios include has no name of its own.
      return /\.ya?ml$/.test(entry.name) && /^scenario:/m.test(readFileSync(file, 'utf8')) ? [file] : [];
    });
}

/** The bench file of a suite: the nearest bench.yaml in the folders above it. */
export function benchAbove(folder: string): string {
  for (let at = path.resolve(folder); ; at = path.dirname(at)) {
    const file = path.join(at, 'bench.yaml');
    if (existsSync(file)) return path.relative(process.cwd(), file) || file;
    if (path.dirname(at) === at)
      throw new CommandError(`no bench.yaml in the folders above ${folder}: name the bench with --bench FILE`);
  }
}
