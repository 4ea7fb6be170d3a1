#!/usr/bin/env node
// Mutation testing by StrykerJS, in a copy of the project so that neither the files nor the dependencies of this one
// change: node tools/mutation/mutate.mjs [PART...]   Version 9 is the last that runs on Node 20.
import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { parts } from './parts.mjs';

const root = path.resolve(import.meta.dirname, '..', '..');
const wanted = process.argv.slice(2);
const unknown = wanted.filter((name) => !Object.hasOwn(parts, name));
if (unknown.length > 0) {
  process.stderr.write(`no part ${unknown.join(', ')}: there are ${Object.keys(parts).join(', ')}\n`);
  process.exit(2);
}
const copy = path.join(os.tmpdir(), `oilspring-mutation-${os.userInfo().uid}`);
const run = (words, options = {}) => {
  const done = spawnSync(words[0], words.slice(1), { cwd: copy, stdio: 'inherit', ...options });
  if (done.error) throw done.error;
  return done.status;
};
fs.mkdirSync(copy, { recursive: true });
const skipped = new Set(['node_modules', 'recordings', 'coverage', '.git']);
for (const name of fs.readdirSync(root))
  if (!skipped.has(name)) fs.cpSync(path.join(root, name), path.join(copy, name), { recursive: true });
if (!fs.existsSync(path.join(copy, 'node_modules', '@stryker-mutator', 'vitest-runner'))) {
  fs.cpSync(path.join(root, 'node_modules'), path.join(copy, 'node_modules'), {
    recursive: true,
    verbatimSymlinks: true,
  });
  const version = '9.6.1';
  const tools = ['core', 'vitest-runner'].map((name) => `@stryker-mutator/${name}@${version}`);
  if (run(['npm', 'install', '--no-save', '--no-audit', '--no-fund', ...tools]) !== 0) process.exit(5);
}
const rows = [];
for (const name of wanted.length > 0 ? wanted : Object.keys(parts)) {
  const { mutate, tests } = parts[name];
  const test = { include: tests, testTimeout: 60_000, pool: 'forks', fileParallelism: false };
  fs.writeFileSync(
    path.join(copy, 'mutation.vitest.config.mjs'),
    `export default { test: ${JSON.stringify(test)} };\n`,
  );
  const report = path.join(copy, `mutation-${name}.json`);
  const wishes = {
    testRunner: 'vitest',
    vitest: { configFile: 'mutation.vitest.config.mjs' },
    plugins: ['@stryker-mutator/vitest-runner'],
    mutate,
    inPlace: true,
    coverageAnalysis: 'perTest',
    ignoreStatic: true,
    concurrency: 1,
    timeoutMS: 20_000,
    reporters: ['json', 'progress-append-only'],
    jsonReporter: { fileName: report },
  };
  fs.writeFileSync(path.join(copy, 'stryker.json'), JSON.stringify(wishes));
  run(['npx', '--no-install', 'stryker', 'run', 'stryker.json']);
  if (!fs.existsSync(report)) continue;
  const count = {};
  for (const [file, { mutants, source }] of Object.entries(JSON.parse(fs.readFileSync(report, 'utf8')).files)) {
    for (const { status, location, mutatorName, replacement } of mutants) {
      count[status] = (count[status] ?? 0) + 1;
      if (status !== 'Survived') continue;
      const line = source.split('\n')[location.start.line - 1].trim();
      process.stdout.write(
        `${file}:${location.start.line}:${location.start.column} ${mutatorName}: ${line}  ->  ${String(replacement).slice(0, 60)}\n`,
      );
    }
  }
  const caught = (count.Killed ?? 0) + (count.Timeout ?? 0);
  const all = caught + (count.Survived ?? 0) + (count.NoCoverage ?? 0);
  rows.push(
    `${name}: ${caught} of ${all} mutants caught (${((100 * caught) / all).toFixed(1)} %), ${count.NoCoverage ?? 0} in lines that these tests do not reach`,
  );
}
process.stdout.write(`${rows.join('\n')}\n`);
