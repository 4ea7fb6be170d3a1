import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { Recording } from '../../runtime/recording/reader.js';
import type { RunSummary } from '../../runtime/run-summary.js';
import { finished } from '../support/child.js';
import { runCommand, scratch, startCommand } from '../system/command.js';
import { complaints, launch, noBrowser } from './browser.js';

/** A person at the hand bench: the command as a user starts it, its page in the browser, and what the record says of both. */
const reason = noBrowser() ?? (whyNotLive() || undefined);
if (reason !== undefined) console.log(`not run: the hand bench in a browser: ${reason}`);

describe.skipIf(reason !== undefined)('the hand bench in a browser', () => {
  const folder = scratch();
  const file = folder.file('hand.osrec');
  let browser: Browser;
  let run: ReturnType<typeof startCommand> | undefined;
  beforeAll(async () => {
    browser = await launch();
  });
  afterAll(async () => {
    run?.kill('SIGKILL');
    await browser?.close();
    folder.remove();
  });

  test('a valve opened on the page opens on the bench; what the page showed stands in the record at the same ticks', async () => {
    run = startCommand([
      ...['run', 'configs/hand-bench/bench.yaml', '--pace', 'live', '--for', '10min', '--json', '--record', file],
      ...['--page', '127.0.0.1:0', '--control'],
    ]);
    const end = finished(run);
    const address = await new Promise<string>((resolve, reject) => {
      let said = '';
      run!.stderr!.on('data', (text: string) => {
        said += text;
        const found = /live page (http:\S+)/.exec(said);
        if (found !== null) resolve(found[1]!);
      });
      run!.once('close', () => reject(new Error(`no live page: ${said}`)));
    });
    const page = await browser.newPage({ viewport: { width: 1280, height: 900 } });
    page.setDefaultTimeout(90_000);
    const origin = new URL(address).origin;
    // until the bench is built its place is held by a page that says so and comes back by itself
    await page.goto(address);
    await page.locator('.banner .words').waitFor();
    const wrong = complaints(page);

    await page.goto(`${origin}/#/hands`);
    await page.getByLabel('Your name').fill('A. Tester');
    const valve = page.getByRole('group', { name: 'Isolation valve open' });
    await valve.getByRole('slider').focus();
    await page.keyboard.press('End');
    await valve.getByRole('button').first().focus();
    await page.keyboard.down(' ');
    await valve.getByRole('button', { name: 'Holding' }).waitFor();
    await valve.getByText('now 1.00').waitFor();
    await page.waitForTimeout(700);
    await page.keyboard.up(' ');
    await page.getByText(/Isolation valve.* let go: in the record/).waitFor();

    // the cursor of a chart tells what is drawn, interval by interval
    await page.goto(`${origin}/#/charts`);
    const plot = page.getByRole('slider', { name: /^Cursor of the chart/ }).first();
    await plot.waitFor();
    await page.waitForTimeout(1500);
    await plot.focus();
    await page.keyboard.press('End');
    const shown: { tick: number; text: string }[] = [];
    for (let i = 0; i < 25; i += 1) {
      await page.keyboard.press('ArrowLeft');
      await page.waitForTimeout(20);
      const [tick, text] = await page.evaluate<[string, string]>(
        "['aria-valuenow', 'aria-valuetext'].map((name) => document.activeElement.getAttribute(name))",
      );
      shown.push({ tick: Number(tick), text });
    }
    await page.close();
    run.kill('SIGINT');
    const result = await end;
    const summary = JSON.parse(result.output) as RunSummary;
    expect(wrong).toEqual([]);

    const recording = new Recording(file);
    const paths = recording.header.signals.map((info) => info.path);
    const rows: Float32Array[] = [];
    for (const block of recording.blocks())
      if (block.kind === 'rows')
        for (let r = 0; r < block.count; r += 1)
          if (block.ticks[r]! >= 0)
            rows[block.ticks[r]!] = Float32Array.from(paths, (_, c) => block.data[c * block.count + r]!);
    recording.close();
    const valueAt = (path: string, tick: number) => rows[tick]![paths.indexOf(path)]!;

    // the hand arrived, and the valve moved and shut again
    const opening = rows.map((_, tick) => valueAt('isolationValve.opening', tick));
    expect(Math.max(...opening)).toBeGreaterThan(0.99);
    expect(opening.at(-1)).toBeLessThan(0.01);
    expect(rows.length).toBe(Math.round(summary.simulated * 1000));

    // in the units of the page: bar(g), rpm and so on are the page's business; pressures are enough here
    const interval = shown[0]!.tick - shown[1]!.tick;
    expect(interval).toBeGreaterThan(0);
    let compared = 0;
    for (const { tick, text } of shown)
      for (const [, path, value] of text.matchAll(/([\w.]+\.pressure) (-?[\d,.]+) bar\(g\)/g)) {
        let most = Number.NEGATIVE_INFINITY;
        for (let at = tick; at < tick + interval; at += 1) most = Math.max(most, valueAt(path!, at));
        expect(value).toBe(((most - 101_325) / 1e5).toFixed(value!.split('.')[1]?.length ?? 0));
        compared += 1;
      }
    expect(compared).toBeGreaterThan(20);

    const again = await runCommand('rederive', file);
    expect([again.code, again.output]).toEqual([0, expect.stringContaining('identical')]);
  });
});
