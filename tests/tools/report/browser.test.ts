import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { AxeBuilder } from '@axe-core/playwright';
import type { Browser, BrowserContextOptions } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { reportHtml } from '../../../tools/report/html.js';
import { junitXml } from '../../../tools/report/junit.js';
import { complaints, launch, noBrowser } from '../../page/browser.js';
import { invented } from './sample-run.js';

const reason = noBrowser();
if (reason !== undefined) console.log(`not run: ${reason}`);

describe.skipIf(reason !== undefined)('a report in a browser', () => {
  let browser: Browser;
  const folder = mkdtempSync(join(tmpdir(), 'report-'));
  const file = (name: string) => `file://${join(folder, name)}`;
  beforeAll(async () => {
    writeFileSync(join(folder, 'plain.html'), reportHtml(invented().data));
    writeFileSync(join(folder, 'hostile.html'), reportHtml(invented({ hostile: true, facts: { rowsLost: 3 } }).data));
    browser = await launch();
  });
  afterAll(async () => {
    await browser?.close();
    rmSync(folder, { recursive: true, force: true });
  });

  async function open(name: string, options: BrowserContextOptions = {}) {
    const context = await browser.newContext(options);
    const page = await context.newPage();
    const wrong = complaints(page);
    page.on('dialog', (dialog) => {
      wrong.push('a dialog came up');
      void dialog.dismiss();
    });
    page.on('request', (request) => {
      if (request.url() !== file(name)) wrong.push(`loads ${request.url()}`);
    });
    await page.goto(file(name));
    return { page, wrong };
  }

  it('shows hostile names as text, in light and dark, wide and narrow, without overflow', async () => {
    for (const colorScheme of ['light', 'dark'] as const) {
      for (const width of [1280, 390]) {
        const { page, wrong } = await open('hostile.html', { colorScheme, viewport: { width, height: 800 } });
        expect(await page.evaluate('document.documentElement.scrollWidth')).toBeLessThanOrEqual(width);
        expect(await page.locator('img').count()).toBe(0);
        expect(await page.locator('h1').textContent()).toContain('<img src=x onerror=alert(1)>');
        expect(wrong).toEqual([]);
        await page.context().close();
      }
    }
  });

  it('is complete without script', async () => {
    const { page } = await open('plain.html', { javaScriptEnabled: false });
    expect(await page.locator('svg.plot path.trace').count()).toBeGreaterThan(5);
    expect(await page.locator('.script-only').isVisible()).toBe(false);
    expect(await page.getByText('+4.177 bar').first().isVisible()).toBe(true);
    await page.context().close();
  });

  it('reads values under the cursor and zooms', async () => {
    const { page, wrong } = await open('plain.html', { viewport: { width: 1000, height: 900 } });
    const plot = page.locator('svg.plot').first();
    await plot.scrollIntoViewIfNeeded();
    const box = (await plot.boundingBox())!;
    const caption = page.locator('figcaption').first();
    const before = await plot.locator('path.trace').first().getAttribute('d');
    await page.mouse.move(box.x + box.width * 0.4, box.y + box.height / 2);
    expect(await caption.textContent()).toMatch(/2\d\.\d{4} s: {2}highLine\.pressure \d+\.?\d* bar\(a\)/);
    await page.mouse.down();
    await page.mouse.move(box.x + box.width * 0.6, box.y + box.height / 2);
    await page.mouse.up();
    expect(await plot.locator('path.trace').first().getAttribute('d')).not.toBe(before);
    expect(await caption.textContent()).toMatch(/ s to /);
    await plot.press('Escape');
    expect(await caption.textContent()).toBe('highLine.pressure');
    expect(wrong).toEqual([]);
    await page.context().close();
  });

  it('prints on A4 in light, whatever the screen, and keeps plots whole', async () => {
    const { page } = await open('plain.html', { colorScheme: 'dark' });
    await page.emulateMedia({ media: 'print' });
    expect(await page.evaluate('getComputedStyle(document.body).backgroundColor')).toBe('rgb(255, 255, 255)');
    expect(await page.locator('nav').isVisible()).toBe(false);
    expect(await page.evaluate("getComputedStyle(document.querySelector('figure')).breakInside")).toBe('avoid');
    const pdf = await page.pdf({ preferCSSPageSize: true, printBackground: true });
    const text = Buffer.from(pdf).toString('latin1');
    const [, width, height] = /\/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]/.exec(text)!;
    expect([Math.round(Number(width)), Math.round(Number(height))]).toEqual([595, 842]);
    await page.context().close();
  });

  it('has no fault that an accessibility checker finds', async () => {
    for (const colorScheme of ['light', 'dark'] as const) {
      const { page } = await open('plain.html', { colorScheme });
      const { violations } = await new AxeBuilder({ page }).analyze();
      expect(violations.map((one) => `${one.id}: ${one.nodes[0]?.html}`)).toEqual([]);
      await page.context().close();
    }
  });

  it('writes JUnit XML that an XML parser takes', async () => {
    const { page } = await open('plain.html');
    const xml = junitXml([invented({ hostile: true }).data, invented().data]);
    const count = await page.evaluate((text: string) => {
      // biome-ignore lint/suspicious/noExplicitAny: the browser's own parser, unknown to this side's types
      const document = new (globalThis as any).DOMParser().parseFromString(text, 'application/xml');
      return document.querySelector('parsererror') ? -1 : document.querySelectorAll('testcase').length;
    }, xml);
    expect(count).toBe(16);
    await page.context().close();
  });
});
