import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import type { Browser, Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { type LiveServer, startLiveServer } from '../../bridge/live/server.js';
import { type SyntheticBench, syntheticBench } from '../bridge/live/synthetic.js';
import { builtPage, complaints, launch, noBrowser, screens } from './browser.js';

const reason = noBrowser();
if (reason !== undefined) console.log(`not run: ${reason}`);
const token = 'a-token-that-is-long-enough';

/** An alarm, a fault, a chosen element, open sheets and tables: what a plain picture does not show. */
describe.skipIf(reason !== undefined)('pictures of particular states', () => {
  let browser: Browser;
  let server: LiveServer;
  let bench: SyntheticBench;
  let stop = () => {};
  let folder: string;

  beforeAll(async () => {
    mkdirSync(screens, { recursive: true });
    folder = await builtPage();
    browser = await launch();
  });
  afterAll(async () => {
    stop();
    await browser?.close();
    await server?.close();
  });
  async function open(
    width: number,
    height: number,
    colorScheme: 'light' | 'dark',
    view: string,
  ): Promise<[Page, string[]]> {
    stop();
    await server?.close();
    bench = syntheticBench({ control: true });
    server = await startLiveServer({ source: bench.source, page: folder, token });
    bench.advance(36_200);
    stop = bench.run();
    const page = await browser.newPage({ viewport: { width, height }, colorScheme });
    const wrong = complaints(page);
    await page.goto(`${server.url}#token=${token}`);
    await page.locator('.banner .words').waitFor();
    await page.goto(`${server.url}#/${view}`);
    await page.locator(`main.${view}`).waitFor();
    return [page, wrong];
  }

  for (const [width, height, scheme] of [
    [390, 844, 'light'],
    [1280, 800, 'light'],
    [2560, 1440, 'dark'],
  ] as const) {
    test(`relief passing at ${width}`, async () => {
      const [page, wrong] = await open(width, height, scheme, 'overview');
      await page.locator('.banner.tone-passing').waitFor();
      expect(await page.locator('.banner .words').textContent()).toContain('Relief passing');
      await page.waitForTimeout(500);
      await page.screenshot({ path: join(screens, `alarm-${width}-${scheme}.png`) });
      expect(wrong).toEqual([]);
      await page.close();
    });
  }

  test('an element in fault, chosen in the circuit', async () => {
    const [page, wrong] = await open(1280, 800, 'dark', 'circuit');
    await page.locator('.drawing').waitFor();
    await bench.source.command?.(
      { kind: 'set', path: 'pumpMotor.leak', value: 6 },
      { who: 'test', address: '', at: 0 },
    );
    await page.locator('.node.fault').waitFor();
    await page.locator('.node', { hasText: 'pumpMotor' }).click();
    await page.locator('.particulars').waitFor();
    await page.waitForTimeout(400);
    await page.screenshot({ path: join(screens, 'chosen-1280-dark.png'), fullPage: true });
    expect(await page.locator('.particulars').textContent()).toContain('in fault: leak factor');
    expect(wrong).toEqual([]);
    await page.close();
  });

  test('hands, the sheet of units, and a table in place of a chart', async () => {
    const [page, wrong] = await open(1280, 800, 'light', 'hands');
    await page.getByLabel('Your name').fill('M. Tester');
    await page.getByRole('button', { name: 'Hold' }).nth(1).waitFor();
    await page.screenshot({ path: join(screens, 'hands-allowed-1280-light.png'), fullPage: true });
    await page.goto(`${server.url}#/charts`);
    await page.getByRole('button', { name: 'Table' }).first().click();
    await page.getByText('Choose signals').click();
    await page.getByText('Units and colours').click();
    await page.waitForTimeout(600);
    await page.screenshot({ path: join(screens, 'charts-open-1280-light.png'), fullPage: true });
    expect(wrong).toEqual([]);
    await page.close();
  });

  test('stale', async () => {
    const [page] = await open(1280, 800, 'light', 'overview');
    await page.waitForTimeout(500);
    stop();
    await server.close();
    await page.locator('.stale-bar').waitFor();
    await page.waitForTimeout(300);
    expect(await page.locator('.banner .words').textContent()).toContain('Not up to date');
    await page.screenshot({ path: join(screens, 'stale-1280-light.png') });
    await page.close();
  });
});
