import { existsSync } from 'node:fs';
import { Command } from 'commander';
import { chromium } from 'playwright-core';
import { WebSocket } from 'ws';
import { decode, encode, type ServerMessage } from '../../bridge/live/wire.js';

/**
 * Measures a live view that runs: how often a page with 40 signals in its charts draws, how long a tick takes until it
 * is drawn, and what further clients change. Start a bench with a live page, then
 * `node dist/tools/measure/live-view.js http://127.0.0.1:PORT/`.
 */
interface Drawn {
  readonly tick: number;
  /** ms since 1970 */
  readonly at: number;
}

const program = new Command('live-view')
  .argument('<url>', 'address of the live page')
  .option('--clients <n>', 'further clients that subscribe to everything', '10')
  .option('--seconds <n>', 'length of each measurement', '10');
program.parse();
const url = new URL(program.args[0]!);
const { clients, seconds } = program.opts<{ clients: string; seconds: string }>();
const executablePath = ['/usr/bin/chromium', '/usr/bin/chromium-browser'].find((path) => existsSync(path));
if (executablePath === undefined) throw new Error('chromium is not installed: apt-get install chromium');

/** A client that takes everything; `onStatus` hears of every status. */
function connect(onMessage: (message: ServerMessage, socket: WebSocket) => void): WebSocket {
  const socket = new WebSocket(`ws://${url.host}/live`, { headers: { Origin: url.origin } });
  socket.on('message', (data: Buffer) => onMessage(decode(data) as ServerMessage, socket));
  return socket;
}

let pair: { tick: number; at: number } | undefined;
let step = 0.001;
let paths: string[] = [];
const watcher = connect((message) => {
  if (message.type === 'hello') {
    step = message.bench.step;
    paths = message.signals.slice(0, 40).map((info) => info.path);
  } else if (message.type === 'status' && message.status.run.wallClock > 0) {
    pair = { tick: message.status.run.tick, at: message.status.run.wallClock };
  }
});
await new Promise((resolve, reject) => {
  watcher.once('open', resolve);
  watcher.once('error', reject);
});
while (paths.length === 0) await new Promise((resolve) => setTimeout(resolve, 50));

const browser = await chromium.launch({ executablePath, args: ['--headless', '--no-sandbox', '--disable-gpu'] });
const page = await browser.newPage({ viewport: { width: 1280, height: 800 } });
const charts = Array.from({ length: 8 }, (_, i) => ({
  name: `chart ${i + 1}`,
  paths: paths.slice(5 * i, 5 * i + 5),
})).filter((chart) => chart.paths.length > 0);
// the page keeps the choice of charts per bench: here for whatever bench it is
await page.addInitScript(
  `Storage.prototype.getItem = (key) => key.startsWith('oilspring.charts.') ? ${JSON.stringify(JSON.stringify(charts))} : null`,
);
await page.goto(`${url.origin}/#/charts`);
await page.locator('.plot[data-tick]').first().waitFor();

async function measure(what: string): Promise<void> {
  const drawn = await page.evaluate<Drawn[]>(`new Promise((resolve) => {
    const plot = document.querySelector('.plot'), drawn = [], end = Date.now() + ${Number(seconds) * 1000};
    let last = '';
    const look = () => {
      if (plot.dataset.tick !== last) { last = plot.dataset.tick; drawn.push({ tick: Number(last), at: Date.now() }); }
      if (Date.now() < end) requestAnimationFrame(look); else resolve(drawn);
    };
    look();
  })`);
  const span = (drawn.at(-1)!.at - drawn[0]!.at) / 1000;
  const known = pair;
  const delays =
    known === undefined
      ? []
      : drawn.map(({ tick, at }) => at - (known.at + (tick - known.tick) * step * 1000)).sort((a, b) => a - b);
  const share = (q: number) => `${Math.round(delays[Math.min(delays.length - 1, Math.floor(q * delays.length))]!)} ms`;
  const latency =
    delays.length === 0
      ? 'the bench pairs no wall clock with its ticks'
      : `tick to pixel: half within ${share(0.5)}, 99 % within ${share(0.99)}`;
  process.stdout.write(
    `${what.padEnd(28)} ${((drawn.length - 1) / span).toFixed(1)} pictures a second of ${paths.length} signals; ${latency}\n`,
  );
}

await measure('one page');
const others = Array.from({ length: Number(clients) }, () =>
  connect((message, socket) => {
    if (message.type === 'hello')
      socket.send(
        encode({ type: 'subscribe', subscription: 1, signals: message.signals.slice(0, 512).map((_, i) => i) }),
      );
  }),
);
await measure(`with ${clients} more clients`);
for (const socket of [...others, watcher]) socket.terminate();
await browser.close();
