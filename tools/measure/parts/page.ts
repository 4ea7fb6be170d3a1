import { existsSync } from 'node:fs';
import type { Page } from 'playwright-core';
import { WebSocket } from 'ws';
import { decode, encode, type ServerMessage } from '../../../bridge/live/wire.js';
import { Recording } from '../../../runtime/recording/reader.js';
import type { RunSummary } from '../../../runtime/run-summary.js';
import { type Part, us } from '../part.js';
import { copyBench, PORTS } from '../workshop.js';

/** Signals that the page draws, and clients beside it of which the last one never reads. */
const DRAWN = 40;
const CLIENTS = 10;

interface Drawn {
  readonly tick: number;
  /** ms since 1970 */
  readonly at: number;
}
interface Phase {
  readonly what: string;
  /** First and last tick. */
  readonly from: number;
  readonly to: number;
  readonly drawn: readonly Drawn[];
}

/**
 * The live page beside the loop that feeds it, all in one run: pictures a second, time from a tick to its picture, and the
 * loop's lateness without clients, with a page, with ten more clients, and without any again (the null control).
 */
export const page: Part = {
  name: 'page',
  about: `the live page with ${DRAWN} signals, and what ${CLIENTS} more clients, one of which never reads, change for the loop`,
  async run({ seconds, say, workshop }) {
    const bench = copyBench(workshop, 'harbour-truck');
    const file = workshop.file('page.osrec');
    const origin = `http://127.0.0.1:${PORTS.page}`;
    const done = workshop.oilspring([
      ...['run', bench, '--page', `127.0.0.1:${PORTS.page}`],
      ...['--for', `${4 * seconds + 120}s`, '--record', file, '--json'],
    ]);
    const phases: Phase[] = [];
    const ended = done.then((summary) => ({ summary }));
    const watcher = await Promise.race([connect(origin), ended.then(({ summary }) => refuse(summary))]);
    const browser = await openBrowser();
    const measured = async (what: string, with_?: Page): Promise<void> => {
      say(what);
      const from = watcher.tick();
      const drawn = with_ === undefined ? [] : await drawing(with_, seconds);
      if (with_ === undefined) await sleep(1000 * seconds);
      phases.push({ what, from, to: watcher.tick(), drawn });
    };
    try {
      await measured('no client that takes signals');
      const shown = browser === undefined ? undefined : await openCharts(browser, origin, watcher.paths());
      await measured('one page', shown);
      const others = await Promise.all(Array.from({ length: CLIENTS }, (_, i) => greedy(origin, i === CLIENTS - 1)));
      await measured(`the page and ${CLIENTS} more clients`, shown);
      for (const socket of others) socket.terminate();
      await shown?.close();
      await sleep(500);
      await measured('none again');
    } finally {
      await browser?.close();
    }
    const stamp = watcher.stamp();
    watcher.close();
    workshop.interrupt();
    const { summary } = await ended;
    const lateness = latenessOf(file, phases);
    const text = (of: (typeof lateness)[number]) =>
      [of.p50, of.p99, of.p999, of.most].map((one) => us(one * 1e9)).join(' / ');
    return {
      rows: [
        ...phases
          .filter(({ drawn }) => drawn.length > 1)
          .map(({ what, drawn }) => ({
            what: `pictures a second; tick to picture: ${what}`,
            value: pictures(drawn, stamp),
          })),
        ...(browser === undefined
          ? [{ what: 'the page itself', value: 'not run: no Chromium (Debian package chromium)' }]
          : []),
        ...phases.map(({ what }, i) => ({
          what: `lateness, median / 99 % / 99.9 % / worst: ${what}`,
          value: text(lateness[i]!),
        })),
        { what: 'rows lost on their way to the host', value: String(summary.rowsLost), goal: 'none' },
      ],
      numbers: phases.map(({ what, drawn }, i) => ({ what, pictures: drawn.length, lateness: lateness[i] })),
    };
  },
};

const sleep = (milliseconds: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, milliseconds));

function refuse(summary: RunSummary): never {
  throw new Error(`the run ended before the page was there: ${summary.verdictText}`);
}

/** A client that takes the status only. */
async function connect(origin: string) {
  let stamp = { tick: -1, at: 0 };
  let paths: string[] = [];
  for (let tries = 0; ; tries += 1) {
    const socket = listen(origin, (message) => {
      if (message.type === 'hello') paths = message.signals.map((info) => info.path);
      else if (message.type === 'status' && message.status.run.wallClock > 0)
        stamp = { tick: message.status.run.tick, at: message.status.run.wallClock };
    });
    let open = true;
    socket.once('close', () => (open = false));
    while (open && stamp.tick < 0) await sleep(50);
    if (open)
      return { tick: () => stamp.tick, stamp: () => stamp, paths: () => paths, close: () => socket.terminate() };
    if (tries > 600) throw new Error(`nothing answers at ${origin}`);
    await sleep(100);
  }
}

function listen(origin: string, onMessage: (message: ServerMessage, socket: WebSocket) => void): WebSocket {
  const socket = new WebSocket(`${origin.replace('http', 'ws')}/live`, { headers: { Origin: origin } });
  socket.on('message', (data: Buffer) => onMessage(decode(data) as ServerMessage, socket));
  // seen as its end
  socket.on('error', () => undefined);
  return socket;
}

/** A client that subscribes to all that a subscription takes, and perhaps never reads. */
async function greedy(origin: string, silent: boolean): Promise<WebSocket> {
  const socket = listen(origin, (message, own) => {
    if (message.type !== 'hello') return;
    const signals = message.signals.slice(0, 512).map((_, i) => i);
    own.send(encode({ type: 'subscribe', subscription: 1, signals }), () => silent && own.pause());
  });
  await new Promise((resolve, reject) => socket.once('open', resolve).once('error', reject));
  return socket;
}

async function openBrowser() {
  const executablePath = ['/usr/bin/chromium', '/usr/bin/chromium-browser'].find((path) => existsSync(path));
  const playwright = await import('playwright-core').catch(() => undefined);
  if (executablePath === undefined || playwright === undefined) return undefined;
  return playwright.chromium.launch({
    executablePath,
    args: [
      '--headless',
      '--no-sandbox',
      '--disable-gpu',
      '--disable-background-networking',
      '--disable-component-update',
    ],
  });
}

async function openCharts(
  browser: NonNullable<Awaited<ReturnType<typeof openBrowser>>>,
  origin: string,
  paths: readonly string[],
): Promise<Page> {
  const shown = await browser.newPage({ viewport: { width: 1280, height: 800 } });
  const charts = Array.from({ length: DRAWN / 5 }, (_, i) => ({
    name: `chart ${i + 1}`,
    paths: paths.slice(5 * i, 5 * i + 5),
  })).filter((chart) => chart.paths.length > 0);
  // the page keeps the choice of charts per bench: here for whatever bench it is
  await shown.addInitScript(
    `Storage.prototype.getItem = (key) => key.startsWith('oilspring.charts.') ? ${JSON.stringify(JSON.stringify(charts))} : null`,
  );
  await shown.goto(`${origin}/#/charts`);
  await shown.locator('.plot[data-tick]').first().waitFor();
  return shown;
}

/** Each new picture of the first chart: the last tick in it, and when it was there. */
function drawing(shown: Page, seconds: number): Promise<Drawn[]> {
  return shown.evaluate<Drawn[]>(`new Promise((resolve) => {
    const plot = document.querySelector('.plot'), drawn = [], end = Date.now() + ${seconds * 1000};
    let last = '';
    const look = () => {
      if (plot.dataset.tick !== last) { last = plot.dataset.tick; drawn.push({ tick: Number(last), at: Date.now() }); }
      if (Date.now() < end) requestAnimationFrame(look); else resolve(drawn);
    };
    look();
  })`);
}

function pictures(drawn: readonly Drawn[], stamp: Drawn): string {
  const span = (drawn.at(-1)!.at - drawn[0]!.at) / 1000;
  const delays = drawn.map(({ tick, at }) => at - (stamp.at + tick - stamp.tick)).sort((a, b) => a - b);
  const share = (q: number) => `${Math.round(delays[Math.min(delays.length - 1, Math.floor(q * delays.length))]!)} ms`;
  return `${((drawn.length - 1) / span).toFixed(1)}; half within ${share(0.5)}, 99 % within ${share(0.99)}`;
}

/** The recorded lateness of every tick of each phase, s. */
function latenessOf(file: string, phases: readonly Phase[]) {
  const recording = new Recording(file);
  const found: number[][] = phases.map(() => []);
  try {
    const column = recording.header.signals.findIndex((info) => info.path === 'timing.lateness');
    if (column < 0) throw new Error('the bench does not record timing.lateness');
    for (const block of recording.blocks()) {
      if (block.kind !== 'rows') continue;
      for (let row = 0; row < block.count; row += 1) {
        const tick = block.ticks[row]!;
        const at = phases.findIndex(({ from, to }) => tick > from && tick <= to);
        if (at >= 0) found[at]!.push(block.data[column * block.count + row]!);
      }
    }
  } finally {
    recording.close();
  }
  return found.map((all) => {
    const sorted = Float64Array.from(all).sort();
    const at = (q: number) => sorted[Math.min(sorted.length - 1, Math.floor(q * sorted.length))] ?? Number.NaN;
    return { count: sorted.length, p50: at(0.5), p99: at(0.99), p999: at(0.999), most: at(1) };
  });
}
