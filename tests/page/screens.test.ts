import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { type LiveServer, startLiveServer } from '../../bridge/live/server.js';
import { syntheticBench } from '../bridge/live/synthetic.js';
import { builtPage, complaints, launch, noBrowser, screens } from './browser.js';

const reason = noBrowser();
if (reason !== undefined) console.log(`not run: ${reason}`);

const sizes = [
  { name: '390', width: 390, height: 844 },
  { name: '1280', width: 1280, height: 800 },
  { name: '2560', width: 2560, height: 1440 },
];
const views = ['overview', 'charts', 'circuit', 'energy', 'controller', 'record', 'hands', 'recordings'];

describe.skipIf(reason !== undefined)('pictures of the page', () => {
  let browser: Browser;
  let server: LiveServer;
  const bench = syntheticBench({ control: true });
  const token = 'a-token-that-is-long-enough';
  let stop = () => {};

  beforeAll(async () => {
    mkdirSync(screens, { recursive: true });
    server = await startLiveServer({ source: bench.source, page: await builtPage(), token });
    browser = await launch();
    bench.advance(33_200);
    stop = bench.run();
  });
  afterAll(async () => {
    stop();
    await browser?.close();
    await server?.close();
  });

  for (const size of sizes) {
    for (const scheme of ['light', 'dark'] as const) {
      test(`${size.name} ${scheme}`, async () => {
        const page = await browser.newPage({
          viewport: { width: size.width, height: size.height },
          colorScheme: scheme,
        });
        page.setDefaultTimeout(90_000);
        const wrong = complaints(page);
        await page.goto(`${server.url}#token=${token}`);
        await page.locator('.drawing').waitFor();
        for (const view of views) {
          await page.goto(`${server.url}#/${view}`);
          await page.locator(`main.${view}`).waitFor();
          // every view once, and the first one at every size
          if (view === 'overview' || view === 'circuit' || (size.width === 1280) === (scheme === 'light')) {
            await page.waitForTimeout(500);
            await page.screenshot({ path: join(screens, `${view}-${size.name}-${scheme}.png`), fullPage: true });
          }
          // nothing may make the page itself scroll sideways
          expect(await page.evaluate<number>('document.documentElement.scrollWidth'), view).toBeLessThanOrEqual(
            size.width,
          );
        }
        const em = await page.evaluate<number>(
          "Number.parseFloat(getComputedStyle(document.querySelector('.banner .words')).fontSize)",
        );
        // the height of a capital in the fonts of the page is 0.71 em and more
        expect(em * 0.71).toBeGreaterThanOrEqual(size.height / 20);
        expect(wrong).toEqual([]);
        await page.close();
      });
    }
  }
});
