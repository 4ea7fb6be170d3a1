import { AxeBuilder } from '@axe-core/playwright';
import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest';
import { type LiveServer, type LiveServerOptions, startLiveServer } from '../../bridge/live/server.js';
import { PageClient } from '../bridge/live/page-client.js';
import { type SyntheticBench, syntheticBench } from '../bridge/live/synthetic.js';
import { builtPage, complaints, launch, noBrowser } from './browser.js';

const reason = noBrowser();
if (reason !== undefined) console.log(`not run: ${reason}`);
const token = 'a-token-that-is-long-enough';
const atmosphere = 101325;

describe.skipIf(reason !== undefined)('the page in a browser', () => {
  let browser: Browser;
  let folder: string;
  let server: LiveServer | undefined;
  let stop = () => {};
  const pages: Page[] = [];
  let wrong: string[] = [];

  beforeAll(async () => {
    folder = await builtPage();
    browser = await launch();
  });
  afterAll(async () => {
    await browser?.close();
  });
  afterEach(async () => {
    stop();
    stop = () => {};
    for (const page of pages.splice(0)) await page.context().close();
    await server?.close();
    server = undefined;
    expect(wrong).toEqual([]);
  });

  async function serve(bench: SyntheticBench, options: Partial<LiveServerOptions> = {}): Promise<LiveServer> {
    server = await startLiveServer({ source: bench.source, page: folder, token, ...options });
    return server;
  }
  async function open(fragment = '', size = { width: 1280, height: 800 }): Promise<Page> {
    const context = await browser.newContext({ viewport: size, reducedMotion: 'no-preference' });
    const page = await context.newPage();
    pages.push(page);
    page.setDefaultTimeout(90_000);
    wrong = complaints(page);
    await page.goto(`${server?.url}${fragment}`);
    await page.locator('.banner .words').waitFor();
    return page;
  }
  const show = (page: Page, view: string) => page.goto(`${server?.url}#/${view}`);
  const bar = (pascal: number) => ((pascal - atmosphere) / 1e5).toFixed(1);

  test('the values on the page are those of the rows at the same tick, in the units that are chosen', async () => {
    const bench = syntheticBench();
    await serve(bench);
    const page = await open();
    await page.locator('.column').first().waitFor();
    await page.waitForTimeout(300);
    bench.advance(7999);
    await page.locator('.time', { hasText: '0:08.0' }).waitFor();
    const column = page.locator('.column', { hasText: 'High line' });
    const value = bench.valueAt('highLine.pressure', 7999);
    await column.locator('.value output', { hasText: bar(value) }).waitFor();
    await page.getByText('Units and colours').click();
    await page.locator('.sheet').getByLabel('Pressure').selectOption('psi(a)');
    await column.locator('.value output', { hasText: (value / 6894.757293168).toFixed(0) }).waitFor();
    await page.locator('.sheet').getByLabel('Pressure').selectOption('MPa(g)');
    await column.locator('.value output', { hasText: ((value - atmosphere) / 1e6).toFixed(2) }).waitFor();
    await page.locator('.sheet').getByLabel('Speed').selectOption('m/s');
    const speed = bench.valueAt('vehicle.velocity', 7999).toFixed(1);
    await page
      .locator('.legend li', { hasText: 'vehicle.velocity' })
      .locator('output', { hasText: `${speed} m/s` })
      .waitFor();
  });

  test('frames that were under way when the choice of signals changed are read in their own order', async () => {
    const bench = syntheticBench();
    await serve(bench);
    bench.advance(4999);
    stop = bench.run();
    const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
    const page = await context.newPage();
    pages.push(page);
    page.setDefaultTimeout(90_000);
    wrong = complaints(page);
    // what the page says arrives late: frames in the old order come long after the choice has changed
    await page.routeWebSocket(/\/live$/, (socket) => {
      const toServer = socket.connectToServer();
      socket.onMessage((message) => void setTimeout(() => toServer.send(message), 400));
    });
    await page.goto(`${server?.url}#/charts`);
    const plot = page.getByRole('slider', { name: 'Cursor of the chart Flow' });
    await plot.waitFor();
    await page.waitForTimeout(1500);
    await show(page, 'overview');
    await page.waitForTimeout(1500);
    await plot.focus();
    await page.keyboard.press('End');
    let read = 0;
    for (let i = 0; i < 70; i += 1) {
      await page.keyboard.press('ArrowLeft');
      const text = (await plot.getAttribute('aria-valuetext')) ?? '';
      for (const [, flow] of text.matchAll(/([\d,.]+) L\/min/g)) {
        // the bench's own flows; pressures taken for flows would be a million times as large
        expect(Number(flow!.replaceAll(',', ''))).toBeLessThan(400);
        read += 1;
      }
    }
    expect(read).toBeGreaterThan(100);
  });

  test('a spike of one tick is drawn: the line reaches its top, and the column keeps its peak', async () => {
    const bench = syntheticBench();
    await serve(bench);
    const page = await open('#/charts');
    await page.locator('.plot canvas').first().waitFor();
    await page.waitForTimeout(300);
    // far above everything else in the window, in tick 5321 only
    bench.spike(5321, 3e7);
    bench.advance(9999);
    await page.locator('.time', { hasText: '0:10.0' }).waitFor();
    await page.locator('.plot[data-tick="9999"]').first().waitFor();
    await page.evaluate('new Promise((resolve) => requestAnimationFrame(() => requestAnimationFrame(resolve)))');
    // columns of pixels of the plot in which the line's own colour stands in the uppermost fifth
    const columns = await page.evaluate<number[]>(`(() => {
      const canvas = document.querySelector('.plot canvas');
      const over = document.querySelector('.plot .u-over').getBoundingClientRect();
      const box = canvas.getBoundingClientRect();
      const ratio = canvas.width / box.width;
      const left = Math.round((over.left - box.left) * ratio), top = Math.round((over.top - box.top) * ratio);
      const width = Math.round(over.width * ratio), height = Math.round(over.height * ratio / 5);
      const probe = document.createElement('i');
      probe.style.color = 'var(--series0)';
      document.body.append(probe);
      const want = getComputedStyle(probe).color.match(/[\\d.]+/g).map(Number);
      probe.remove();
      const { data } = canvas.getContext('2d').getImageData(left, top, width, height);
      const found = [];
      for (let x = 0; x < width; x += 1) {
        for (let y = 0; y < height; y += 1) {
          const at = (y * width + x) * 4;
          if (data[at + 3] > 60 && Math.abs(data[at] - want[0]) + Math.abs(data[at + 1] - want[1]) + Math.abs(data[at + 2] - want[2]) < 90) {
            found.push(x / width);
            break;
          }
        }
      }
      return found;
    })()`);
    expect(columns.length).toBeGreaterThan(0);
    // the window is the newest 30 s and ends at tick 9999: the spike stands at (30 - 4.68) / 30 of its width
    for (const x of columns) expect(Math.abs(x - (1 - 4.678 / 30))).toBeLessThan(0.02);
    await show(page, 'overview');
    await page
      .locator('.column', { hasText: 'High line' })
      .locator('dd', { hasText: bar(bench.valueAt('highLine.pressure', 5321)) })
      .waitFor();
  });

  test('a chart is read by keyboard and as a table', async () => {
    const bench = syntheticBench();
    await serve(bench);
    bench.advance(20_000);
    const page = await open('#/charts');
    await page.waitForTimeout(300);
    await page.getByRole('button', { name: 'Pause' }).click();
    const cursor = page.getByRole('slider', { name: 'Cursor of the chart High pressure' });
    await cursor.focus();
    await page.keyboard.press('End');
    await page.keyboard.press('ArrowLeft');
    const said = await cursor.getAttribute('aria-valuetext');
    expect(said).toMatch(/^0:19\.\d\d: highLine\.pressure \d+\.\d bar\(g\)/);
    await page.getByRole('button', { name: 'Zoom in' }).click();
    await page.getByRole('button', { name: 'Table' }).first().click();
    await page.locator('.chart table tbody tr').nth(8).waitFor();
    await page.getByRole('button', { name: 'Live' }).click();
    await page.getByRole('button', { name: 'Pause' }).waitFor();
  });

  test('control is refused without the token, then granted, and a warning is acknowledged', async () => {
    const bench = syntheticBench({ control: true });
    await serve(bench);
    bench.advance(36_500);
    const page = await open();
    stop = bench.run();
    const button = page.getByRole('button', { name: 'Acknowledge Relief passing of High line' });
    await button.waitFor();
    expect(await button.isDisabled()).toBe(true);
    await show(page, 'hands');
    expect(await page.locator('.hands > fieldset').getAttribute('disabled')).not.toBeNull();
    expect(await page.getByRole('button', { name: 'End' }).isDisabled()).toBe(true);
    await page.getByLabel('Token').fill('not-the-token-that-is-wanted');
    await page.getByRole('button', { name: 'Take control' }).click();
    await page.getByRole('alert').filter({ hasText: 'that is not the token' }).waitFor();
    expect(bench.commands).toEqual([]);
    await page.getByLabel('Token').fill(token);
    await page.getByRole('button', { name: 'Take control' }).click();
    await page.getByText('Control granted').waitFor();
    await page.getByLabel('Your name').fill('M. Tester');
    await page.getByLabel('Text of the note').fill('Pump sounds rough.');
    await page.getByRole('button', { name: 'Write it down' }).click();
    await page.getByText(/Note: in the record at tick \d+/).waitFor();
    await show(page, 'record');
    await button.click();
    await page.locator('.warning', { hasText: 'relief passing' }).getByText('acknowledged').waitFor();
    expect(bench.commands.map((entry) => entry.command.kind)).toEqual(['note', 'acknowledge']);
    expect(bench.commands[1].hand.who).toBe('M. Tester');
  });

  test('a pedal counts while it is held and no longer', async () => {
    const bench = syntheticBench({ control: true });
    await serve(bench);
    bench.advance(100);
    stop = bench.run();
    const page = await open(`#token=${token}`);
    expect(await page.evaluate<string>('location.href')).not.toContain(token);
    await show(page, 'hands');
    await page.getByLabel('Your name').fill('M. Tester');
    const brake = page.getByRole('group', { name: 'Brake' });
    await brake.getByRole('slider').focus();
    await page.keyboard.press('End');
    expect(bench.commands).toEqual([]);
    await brake.getByRole('button').focus();
    await page.keyboard.down(' ');
    await brake.getByRole('button', { name: 'Holding' }).waitFor();
    await brake.getByText('now 1.00').waitFor();
    await page.waitForTimeout(900);
    // renewed, not let go
    expect(bench.commands.filter((entry) => entry.command.kind === 'set').length).toBeGreaterThan(2);
    expect(bench.commands.every((entry) => entry.command.kind === 'set')).toBe(true);
    await page.keyboard.up(' ');
    await brake.getByRole('button', { name: 'Hold', exact: true }).waitFor();
    await page.getByText(/Brake let go: in the record/).waitFor();
    expect(bench.commands.at(-1)?.command).toMatchObject({ kind: 'release', path: 'driver.brakePedal' });
  });

  test('the page says that its picture is old, and finds the bench again after a restart', async () => {
    const bench = syntheticBench();
    const first = await serve(bench);
    bench.advance(1000);
    stop = bench.run();
    const page = await open();
    await page.locator('.banner.tone-fine').waitFor();
    await first.close();
    await page.locator('.stale-bar', { hasText: 'no connection' }).waitFor();
    expect(await page.locator('.banner .words').textContent()).toContain('Not up to date');
    stop();
    const other = syntheticBench();
    other.advance(3000);
    await serve(other, { port: first.port });
    stop = other.run();
    await page.locator('.stale-bar').waitFor({ state: 'detached' });
    await page.locator('.banner.tone-fine').waitFor();
    await page.locator('.time', { hasText: /^0:0[3-9]/ }).waitFor();
  });

  test('values that stop coming are said to be old, although the connection stands', async () => {
    const bench = syntheticBench();
    await serve(bench);
    bench.advance(1000);
    const halt = bench.run();
    const page = await open();
    await page.locator('.banner.tone-fine').waitFor();
    await page.waitForTimeout(400);
    halt();
    await page.locator('.stale-bar', { hasText: 'no new values' }).waitFor();
  });

  test('ten clients, one of which does not read: the page still moves', async () => {
    const bench = syntheticBench({ extraSignals: 40 });
    const running = await serve(bench);
    bench.advance(60_000);
    const others = await Promise.all(Array.from({ length: 9 }, () => PageClient.connect(running.port)));
    const all = bench.source.signals.map((_, i) => i);
    for (const client of others) client.send({ type: 'subscribe', subscription: 1, signals: all });
    others[0].socket.pause();
    for (let i = 0; i < 40; i += 1)
      others[0].send({ type: 'history', request: i, signals: all.slice(0, 64), from: 0, to: 60_000, bins: 4096 });
    stop = bench.run();
    const page = await open();
    await page.locator('.time', { hasText: /^1:0[1-9]/ }).waitFor();
    await page.getByText('Units and colours').click();
    await page.getByText('10 pages look at this bench').waitFor();
    expect(await page.locator('.stale-bar').count()).toBe(0);
    for (const client of others) client.close();
  });

  test('the circuit is the bench file: every element is there, and flows show their direction', async () => {
    const bench = syntheticBench();
    await serve(bench);
    bench.advance(7000);
    stop = bench.run(0.1);
    const page = await open('#/circuit');
    await page.locator('.drawing').waitFor();
    expect(await page.locator('.node').count()).toBe(bench.source.bench.elements.length);
    await page.locator('.node', { hasText: 'pumpMotor' }).getByText(/▶$/).waitFor();
    expect(await page.locator('.tie .arrow').count()).toBeGreaterThan(1);
    await page.locator('.node', { hasText: 'isolation' }).focus();
    await page.keyboard.press('Enter');
    await page.locator('.particulars', { hasText: 'isolates the accumulator' }).waitFor();
  });

  test('a recording opens in the same page and goes back to the bench', async () => {
    const bench = syntheticBench();
    const { source } = bench;
    await serve(bench, {
      recordings: {
        list: async () => [
          {
            name: 'round 1',
            bench: 'invented',
            scenario: 'harbour',
            startedAt: 1_700_000_000_000,
            length: 50,
            verdict: 'holds',
          },
        ],
        open: async () => ({
          bench: source.bench,
          signals: source.signals,
          events: source.events,
          firstTick: 0,
          lastTick: 49_999,
          history: async (signals, from, to, bins) => {
            const count = Math.min(bins, Math.max(1, Math.round(to - from)));
            const ticks = Float64Array.from({ length: count }, (_, i) => Math.round(from + (i * (to - from)) / count));
            const values = Float32Array.from({ length: count * signals.length }, (_, i) =>
              bench.valueAt(source.signals[signals[Math.floor(i / count)]].path, ticks[i % count]),
            );
            return { ticks, least: values, most: values };
          },
          eventsIn: async () => [{ tick: 26_000, kind: 0, subject: 4, a: 0, b: 0, c: 0 }],
          statusAt: async (tick) => ({ ...source.status(), run: { ...source.status().run, tick, pace: 'recording' } }),
          close: async () => {},
        }),
      },
    });
    bench.advance(2000);
    stop = bench.run();
    const page = await open('#/recordings');
    await page.getByRole('button', { name: 'Open round 1' }).click();
    await page.getByText('Recording round 1').waitFor();
    await show(page, 'overview');
    await page.getByRole('slider', { name: 'Moment' }).fill('12345');
    const value = bench.valueAt('highLine.pressure', 12_345);
    await page
      .locator('.column', { hasText: 'High line' })
      .locator('.value output', { hasText: bar(value) })
      .waitFor();
    await page.getByRole('button', { name: 'Back to the bench' }).first().click();
    await page.getByRole('slider', { name: 'Moment' }).waitFor({ state: 'detached' });
    await page.locator('.run', { hasText: 'live' }).waitFor();
  });

  for (const scheme of ['light', 'dark'] as const) {
    test(`axe finds nothing, ${scheme}`, async () => {
      const bench = syntheticBench({ control: true });
      await serve(bench);
      bench.advance(36_200);
      stop = bench.run(0.02);
      const page = await open(`#token=${token}`);
      await page.emulateMedia({ colorScheme: scheme });
      for (const view of ['overview', 'charts', 'circuit', 'energy', 'controller', 'record', 'hands', 'recordings']) {
        await show(page, view);
        await page.locator(`main.${view}`).waitFor();
        if (view === 'charts') await page.getByRole('button', { name: 'Table' }).first().click();
        if (view === 'charts') await page.getByText('Choose signals').click();
        if (view === 'circuit') await page.locator('.node').first().click();
        // what stands half under the bar that stays on top would count as too small
        await page.evaluate('scrollTo(0, 0)');
        await page.waitForTimeout(250);
        const found = await new AxeBuilder({ page })
          .withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'])
          .analyze();
        expect(
          found.violations.map(
            (violation) =>
              `${view}: ${violation.id} ${violation.nodes
                .map((node) => node.target.join(' '))
                .slice(0, 4)
                .join(', ')}`,
          ),
        ).toEqual([]);
      }
    });
  }
});
