import { existsSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type Browser, chromium, type Page } from 'playwright-core';
import { build } from 'vite';

/** Debian's browser, the one that the page is tested with. */
const executable = ['/usr/bin/chromium', '/usr/bin/chromium-browser'].find((path) => existsSync(path));
export const root = new URL('../..', import.meta.url).pathname;
/** Where screenshots go; git ignores it. */
export const screens = join(root, 'dist', 'screens');

/** Why there is no browser here, or undefined. In CI there must be one. */
export function noBrowser(): string | undefined {
  if (executable !== undefined) return undefined;
  if (process.env['CI'] === 'true') throw new Error('CI needs chromium for the page: apt-get install chromium');
  return 'chromium is not installed: apt-get install chromium';
}

export function launch(): Promise<Browser> {
  if (executable === undefined) throw new Error('there is no chromium here');
  return chromium.launch({
    executablePath: executable,
    args: [
      '--headless',
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}

/** Builds the page as it is shipped, into a folder of its own: test files run side by side. */
export async function builtPage(): Promise<string> {
  const outDir = mkdtempSync(join(tmpdir(), 'page-'));
  process.once('exit', () => rmSync(outDir, { recursive: true, force: true }));
  await build({
    configFile: join(root, 'bridge', 'page', 'vite.config.mjs'),
    logLevel: 'error',
    build: { outDir, emptyOutDir: true },
  });
  return outDir;
}

/** Everything that the browser complains about: errors of scripts and refusals of the content security policy. */
export function complaints(page: Page): string[] {
  const list: string[] = [];
  page.on('pageerror', (error) => list.push(String(error)));
  page.on('console', (message) => {
    if (message.type() === 'error' && !message.text().includes('WebSocket connection')) list.push(message.text());
  });
  return list;
}
