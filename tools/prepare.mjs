// Installs and builds what is missing, then returns. Plain Node, no dependency: it runs before there are any.
import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';

const root = resolve(dirname(fileURLToPath(import.meta.url)), '..');
process.chdir(root);
const major = Number(process.versions.node.split('.')[0]);
if (major < 20) fail(`oilspring needs Node 20 or newer, this is ${process.version}: install it and try again`);

/** Digest of all files whose change asks for the step again. */
function digest(paths, pattern) {
  const hash = createHash('sha256');
  const visit = (path) => {
    const stat = statSync(path, { throwIfNoEntry: false });
    if (!stat) return;
    if (stat.isDirectory()) {
      for (const name of readdirSync(path).sort())
        if (name !== 'node_modules' && name !== 'dist') visit(join(path, name));
    } else if (pattern.test(path)) hash.update(path).update(readFileSync(path));
  };
  for (const path of paths) visit(path);
  return hash.digest('hex');
}

/** `made`: what the step makes; done again when it is gone. */
function step(name, stamp, key, command, args, made = 'package.json') {
  const file = join('node_modules', '.oilspring', stamp);
  if (existsSync(made) && existsSync(file) && readFileSync(file, 'utf8') === key) return;
  process.stderr.write(`oilspring: ${name} ...\n`);
  const began = Date.now();
  const result = spawnSync(command, args, {
    stdio: ['ignore', 'pipe', 'pipe'],
    encoding: 'utf8',
    shell: process.platform === 'win32',
  });
  if (result.status !== 0) {
    process.stderr.write(result.stdout ?? '');
    process.stderr.write(result.stderr ?? '');
    fail(`${name} failed (${command} ${args.join(' ')}): see the lines above`);
  }
  mkdirSync(dirname(file), { recursive: true });
  writeFileSync(file, key);
  process.stderr.write(`oilspring: ${name} done in ${((Date.now() - began) / 1000).toFixed(1)} s\n`);
}

function fail(message) {
  process.stderr.write(`oilspring: ${message}\n`);
  process.exit(2);
}

const packages = digest(['package.json', 'package-lock.json'], /./) + process.version;
if (
  !existsSync(join('node_modules', '.oilspring', 'installed')) ||
  readFileSync(join('node_modules', '.oilspring', 'installed'), 'utf8') !== packages ||
  !existsSync(join('node_modules', 'koffi'))
) {
  step('installing packages', 'installed', packages, 'npm', ['ci', '--no-fund', '--no-audit', '--loglevel=error']);
}
const sources = ['runtime', 'plants', 'bridge', 'configs', 'tools', 'tsconfig.json'];
step(
  'building',
  'built',
  digest(sources, /\.(ts|tsx|json|css|html|mjs)$/) + packages,
  process.execPath,
  [join('node_modules', 'typescript', 'bin', 'tsc'), '-p', 'tools/tsconfig.build.json'],
  join('dist', 'tools', 'start.js'),
);
const vite = join('node_modules', 'vite', 'bin', 'vite.js');
// without it (an installation without development packages) runs go on without the live page, and say so
if (existsSync(vite)) {
  step(
    'building the live page',
    'page',
    digest(['bridge/page', 'bridge/live'], /\.(ts|tsx|json|css|html|svg|mjs)$/) + packages,
    process.execPath,
    [vite, 'build', '--config', 'bridge/page/vite.config.mjs', '--logLevel', 'warn'],
    join('dist', 'bridge', 'page', 'index.html'),
  );
}
