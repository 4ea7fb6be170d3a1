import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { request } from 'node:http';
import { connect } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest';
import type { LiveServer, LiveServerOptions } from '../../../bridge/live/server.js';
import { startLiveServer } from '../../../bridge/live/server.js';
import type {
  Answer,
  Frame,
  Hello,
  HistoryAnswer,
  Refusal,
  ServerMessage,
  StatusMessage,
} from '../../../bridge/live/wire.js';
import { doublesOf, encode, floatsOf, largestRequest } from '../../../bridge/live/wire.js';
import { PageClient } from './page-client.js';
import { syntheticBench } from './synthetic.js';

const token = 'a-token-that-is-long-enough';
let folder: string;
let page: string;
const running: LiveServer[] = [];
const clients: PageClient[] = [];

beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'live-'));
  page = join(folder, 'page');
  mkdirSync(join(page, 'assets'), { recursive: true });
  writeFileSync(join(page, 'index.html'), '<!doctype html><title>page</title>');
  writeFileSync(join(page, 'assets', 'a.js'), 'export {};');
  writeFileSync(join(page, '.hidden'), 'hidden');
  writeFileSync(join(folder, 'secret.txt'), 'secret');
});
afterAll(() => rmSync(folder, { recursive: true }));
afterEach(async () => {
  for (const client of clients.splice(0)) client.close();
  for (const server of running.splice(0)) await server.close();
});

async function start(options: Partial<LiveServerOptions> = {}): Promise<LiveServer> {
  const server = await startLiveServer({ source: syntheticBench().source, page, ...options });
  running.push(server);
  return server;
}
async function join_(server: LiveServer): Promise<PageClient> {
  const client = await PageClient.connect(server.port);
  clients.push(client);
  return client;
}
interface Got {
  status: number;
  headers: Record<string, string | string[] | undefined>;
  body: string;
}
function ask(
  port: number,
  path: string,
  headers: Record<string, string> = {},
  method = 'GET',
  body = '',
): Promise<Got> {
  return new Promise((resolve, reject) => {
    const outgoing = request({ host: '127.0.0.1', port, path, headers, method }, (response) => {
      let text = '';
      response.on('data', (chunk: Buffer) => (text += chunk.toString()));
      response.on('end', () => resolve({ status: response.statusCode ?? 0, headers: response.headers, body: text }));
    });
    outgoing.on('error', reject);
    outgoing.end(body);
  });
}
/** Bytes as they are, since a client library would tidy the path. */
function raw(port: number, text: string): Promise<string> {
  return new Promise((resolve, reject) => {
    const socket = connect(port, '127.0.0.1', () => socket.write(text));
    let answer = '';
    socket.on('data', (chunk) => (answer += chunk.toString()));
    socket.on('close', () => resolve(answer));
    socket.on('error', reject);
  });
}
const isFrame = (message: ServerMessage): message is Frame => message.type === 'frame' && message.last.length > 0;
const isHello = (message: ServerMessage): message is Hello => message.type === 'hello';
const isRefusal = (message: ServerMessage): message is Refusal => message.type === 'refusal';
const isStatus = (message: ServerMessage): message is StatusMessage => message.type === 'status';
const answers =
  (id: number) =>
  (message: ServerMessage): message is Answer =>
    message.type === 'answer' && message.request === id;

test('the page is served with the headers that keep others out', async () => {
  const server = await start();
  const got = await ask(server.port, '/');
  expect(got.status).toBe(200);
  const policy = String(got.headers['content-security-policy']);
  expect(policy).toContain("default-src 'none'");
  expect(policy).toContain("frame-ancestors 'none'");
  expect(policy).not.toContain('unsafe');
  expect(got.headers['x-content-type-options']).toBe('nosniff');
  expect(got.headers['cache-control']).toBe('no-cache');
  expect((await ask(server.port, '/assets/a.js')).headers['cache-control']).toContain('immutable');
  expect((await ask(server.port, '/', {}, 'POST')).status).toBe(405);
});

test('a rebound name gets nothing: Host is checked on every request and at the upgrade', async () => {
  const server = await start();
  for (const host of [
    'evil.example',
    `evil.example:${server.port}`,
    `127.0.0.1:${server.port + 1}`,
    `127.0.0.1.evil.example:${server.port}`,
    'a b',
  ]) {
    const got = await ask(server.port, '/', { Host: host });
    expect([400, 421]).toContain(got.status);
    expect(got.body).not.toContain('<title>');
    await expect(PageClient.connect(server.port, { Host: host, Origin: `http://${host}` })).rejects.toThrow(
      /refused 4(00|21)/,
    );
  }
  expect((await ask(server.port, '/', { Host: `localhost:${server.port}` })).status).toBe(200);
  expect(server.counts.refusedUpgrades).toBe(5);
});

test('a page from elsewhere can neither open the websocket nor read a file', async () => {
  const server = await start();
  for (const origin of [
    'http://evil.example',
    'null',
    `https://127.0.0.1:${server.port}`,
    `http://localhost:${server.port}`,
    `http://127.0.0.1:${server.port}.evil.example`,
  ]) {
    await expect(PageClient.connect(server.port, { Origin: origin })).rejects.toThrow('refused 403');
    expect((await ask(server.port, '/', { Origin: origin })).status).toBe(403);
  }
  await expect(PageClient.connect(server.port, {})).rejects.toThrow('refused 403');
  expect(
    (await ask(server.port, '/assets/a.js', { 'Sec-Fetch-Site': 'cross-site', 'Sec-Fetch-Mode': 'no-cors' })).status,
  ).toBe(403);
  expect(
    (
      await ask(server.port, '/', {
        'Sec-Fetch-Site': 'cross-site',
        'Sec-Fetch-Mode': 'navigate',
        'Sec-Fetch-Dest': 'iframe',
      })
    ).status,
  ).toBe(403);
  expect(
    (
      await ask(server.port, '/', {
        'Sec-Fetch-Site': 'cross-site',
        'Sec-Fetch-Mode': 'navigate',
        'Sec-Fetch-Dest': 'document',
      })
    ).status,
  ).toBe(200);
});

test('no path leaves the folder', async () => {
  const server = await start();
  for (const path of [
    '/../secret.txt',
    '/%2e%2e/secret.txt',
    '/..%2fsecret.txt',
    '/assets/../../secret.txt',
    '/%2e%2e%2fsecret.txt',
    '/..\\secret.txt',
    '//secret.txt',
    '/.hidden',
    '/%00',
    '/assets/%zz',
  ]) {
    const got = await raw(
      server.port,
      `GET ${path} HTTP/1.1\r\nHost: 127.0.0.1:${server.port}\r\nConnection: close\r\n\r\n`,
    );
    expect(got).toMatch(/^HTTP\/1\.1 4\d\d/);
    expect(got).not.toMatch(/\r\n\r\n(secret|hidden)/);
  }
  await expect(
    PageClient.connect(server.port, { Origin: `http://127.0.0.1:${server.port}` }).then((client) =>
      clients.push(client),
    ),
  ).resolves.toBe(1);
});

test('frames carry the least, greatest and last value of what was subscribed', async () => {
  const bench = syntheticBench();
  const server = await start({ source: bench.source });
  const client = await join_(server);
  const hello = await client.find(isHello);
  const line = hello.signals.findIndex((info) => info.path === 'highLine.pressure');
  client.send({ type: 'subscribe', subscription: 3, signals: [line] });
  bench.spike(61, 5e6);
  bench.advance(79);
  const frame = await client.find(isFrame);
  expect(frame.subscription).toBe(3);
  const most = Math.max(...floatsOf(frame.most));
  expect(most).toBe(bench.valueAt('highLine.pressure', 61));
  expect(floatsOf(frame.last)[0]).toBe(bench.valueAt('highLine.pressure', 79));
  client.send({ type: 'history', request: 9, signals: [line], from: 0, to: 79, bins: 100 });
  const history = await client.find((message): message is HistoryAnswer => message.type === 'history');
  expect([...doublesOf(history.ticks)]).toEqual([0, 40]);
  expect(floatsOf(history.most)[1]).toBe(most);
});

test('what is not understood gets a clear answer and is counted; too much of it ends the connection', async () => {
  const server = await start();
  const client = await join_(server);
  client.socket.send(Buffer.from([0xc1, 0xff]));
  expect((await client.find(isRefusal)).what).toContain('msgpack');
  const wrongs: unknown[] = [
    'text',
    { type: 'nonsense' },
    { type: 'subscribe', subscription: 1, signals: [1e9] },
    { type: 'subscribe', subscription: 1, signals: [0.5] },
    { type: 'history', request: 4, signals: [0], from: 5, to: 1, bins: 10 },
    { type: 'history', request: 4, signals: [0], from: 0, to: 1, bins: 1e9 },
    { type: 'command', request: 5, who: 'A', command: { kind: 'set', path: 'x', value: Number.NaN } },
    { type: 'command', request: 5, who: 'A', command: { kind: 'explode' } },
  ];
  for (const wrong of wrongs) client.socket.send(encode(wrong as never));
  await client.until(() => client.received.filter(isRefusal).length === wrongs.length + 1, 'refusals');
  expect(server.counts.wrongMessages).toBe(wrongs.length + 1);
  expect(client.received.filter(isRefusal).map((refusal) => refusal.what)).toContain('no message is called "nonsense"');
  for (let i = 0; i < 80; i += 1) client.socket.send('text');
  await client.until(() => client.closeCode !== 0, 'end of the connection');
  expect(client.closeCode).toBe(1008);
});

test('a message that is too large ends its connection and no other', async () => {
  const server = await start();
  const [large, other] = [await join_(server), await join_(server)];
  large.socket.send(Buffer.alloc(largestRequest + 1));
  await large.until(() => large.closeCode !== 0, 'end of the connection');
  expect([1006, 1009]).toContain(large.closeCode);
  const seen = other.received.length;
  await other.until(() => other.received.length > seen, 'more');
});

test('more messages than allowed are not answered', async () => {
  const server = await start({ now: () => 1_000_000 });
  const client = await join_(server);
  for (let i = 0; i < 140; i += 1) client.send({ type: 'shelf' });
  await client.find((message) => message.type === 'refusal' && message.what === 'too many messages');
  await client.until(() => server.counts.tooManyMessages === 20, 'count');
  const answered = () => client.received.filter((message) => message.type === 'shelf').length;
  await client.until(() => answered() >= 120, 'answers');
  expect(answered()).toBe(120);
});

test('a client that does not read gets less and delays nobody', async () => {
  const bench = syntheticBench({ extraSignals: 40 });
  const server = await start({ source: bench.source });
  bench.advance(60_000);
  const [slow, ...others] = await Promise.all(Array.from({ length: 10 }, () => join_(server)));
  const all = bench.source.signals.map((_, i) => i);
  for (const client of [slow, ...others]) client.send({ type: 'subscribe', subscription: 1, signals: all });
  await slow.find(isFrame);
  slow.socket.pause();
  for (let i = 0; i < 40; i += 1)
    slow.send({ type: 'history', request: i, signals: all.slice(0, 64), from: 0, to: 60_000, bins: 4096 });
  const stop = bench.run();
  try {
    await others[0].until(
      () => server.counts.skippedFrames > 5 && others.every((client) => client.received.filter(isFrame).length > 30),
      'frames',
    );
  } finally {
    stop();
  }
  expect(others.every((client) => client.received.filter(isFrame).every((frame) => !frame.thinned))).toBe(true);
  slow.socket.resume();
  await slow.until(
    () => slow.received.filter(isFrame).some((frame) => frame.thinned) || slow.closeCode !== 0,
    'what was left',
  );
});

test('control is refused without control, without the token, and without a name', async () => {
  const without = await start();
  const watcher = await join_(without);
  watcher.send({ type: 'command', request: 1, who: 'A', command: { kind: 'note', text: 'hello' } });
  expect((await watcher.find(answers(1))).acknowledgement).toMatchObject({ ok: false, tick: -1 });

  const bench = syntheticBench({ control: true });
  const server = await start({ source: bench.source, token });
  bench.advance(10);
  const client = await join_(server);
  expect((await client.find(isHello)).control).toBe('token');
  client.send({ type: 'command', request: 2, who: 'A', command: { kind: 'note', text: 'hello' } });
  expect((await client.find(answers(2))).acknowledgement.text).toContain('token');
  client.send({ type: 'token', request: 3, token: 'a-token-that-is-long-enougH' });
  expect((await client.find(answers(3))).acknowledgement.ok).toBe(false);
  client.send({ type: 'token', request: 4, token });
  expect((await client.find(answers(4))).acknowledgement.ok).toBe(true);
  client.send({ type: 'command', request: 5, who: ' ', command: { kind: 'note', text: 'hello' } });
  expect((await client.find(answers(5))).acknowledgement.text).toContain('who you are');
  expect(bench.commands).toEqual([]);
  client.send({ type: 'command', request: 6, who: 'A', command: { kind: 'note', text: 'hello' } });
  expect((await client.find(answers(6))).acknowledgement).toMatchObject({ ok: true, tick: 10 });
  expect(bench.commands[0].hand).toMatchObject({ who: 'A', address: '127.0.0.1' });
  expect(server.counts).toMatchObject({ commands: 1, refusedCommands: 2 });
});

test('guessing tokens is slowed down, also for the right one', async () => {
  let now = 1_000_000;
  const server = await start({ source: syntheticBench({ control: true }).source, token, now: () => now });
  const client = await join_(server);
  for (let i = 0; i < 6; i += 1) client.send({ type: 'token', request: i, token: `guess ${i}` });
  expect((await client.find(answers(5))).acknowledgement.text).toContain('wait');
  client.send({ type: 'token', request: 6, token });
  expect((await client.find(answers(6))).acknowledgement.ok).toBe(false);
  now += 61_000;
  client.send({ type: 'token', request: 7, token });
  expect((await client.find(answers(7))).acknowledgement.ok).toBe(true);
});

test('a hand lets go when nobody renews it or its page is gone, and two hands do not share a pedal', async () => {
  let now = 1_000_000;
  const bench = syntheticBench({ control: true });
  const server = await start({ source: bench.source, token, now: () => now });
  const [one, two] = [await join_(server), await join_(server)];
  for (const client of [one, two]) {
    client.send({ type: 'token', request: 1, token });
    await client.find(answers(1));
  }
  const set = (client: PageClient, request: number, path: string, value: number) => {
    client.send({
      type: 'command',
      request,
      who: client === one ? 'one' : 'two',
      command: { kind: 'set', path, value },
    });
    return client.find(answers(request));
  };
  expect((await set(one, 2, 'driver.brakePedal', 0.4)).acknowledgement.ok).toBe(true);
  expect((await set(two, 2, 'driver.brakePedal', 0.9)).acknowledgement.text).toContain('held by one');
  expect((await set(two, 3, 'driver.brakePedal', 1.4)).acknowledgement.text).toContain('outside 0 .. 1');
  expect((await set(two, 4, 'highLine.pressure', 1)).acknowledgement.text).toContain('nothing that a hand may set');
  now += 700;
  await one.until(() => bench.commands.some((entry) => entry.command.kind === 'release'), 'release');
  expect(bench.commands.at(-1)).toMatchObject({
    command: { kind: 'release', path: 'driver.brakePedal', reason: 'dead man: not renewed in time' },
    hand: { who: 'one' },
  });
  expect((await set(two, 5, 'driver.brakePedal', 0.9)).acknowledgement.ok).toBe(true);
  two.close();
  await one.until(() => bench.commands.filter((entry) => entry.command.kind === 'release').length === 2, 'release');
  expect(bench.commands.at(-1)).toMatchObject({ command: { reason: 'the page that held it is gone' } });
});

test('other addresses and control need a token; with one nothing is served before it came', async () => {
  const { source } = syntheticBench();
  await expect(startLiveServer({ source, page, address: '0.0.0.0' })).rejects.toThrow('needs a token');
  await expect(startLiveServer({ source: syntheticBench({ control: true }).source, page })).rejects.toThrow(
    'needs a token',
  );
  const server = await start({ source, address: '0.0.0.0', token });
  const first = await ask(server.port, '/');
  expect(first.status).toBe(401);
  expect(first.body).toContain('<form method="post" action="/token">');
  expect(first.body).not.toContain(token);
  expect((await ask(server.port, '/assets/a.js')).status).toBe(401);
  await expect(PageClient.connect(server.port)).rejects.toThrow('refused 401');
  const origin = `http://127.0.0.1:${server.port}`;
  const form = { 'Content-Type': 'application/x-www-form-urlencoded', Origin: origin };
  expect((await ask(server.port, '/token', form, 'POST', 'token=wrong')).status).toBe(401);
  expect(
    (await ask(server.port, '/token', { ...form, Origin: 'http://evil.example' }, 'POST', `token=${token}`)).status,
  ).toBe(403);
  const right = await ask(server.port, '/token', form, 'POST', `token=${token}`);
  expect(right.status).toBe(303);
  const cookie = String(right.headers['set-cookie']).split(';')[0];
  expect(String(right.headers['set-cookie'])).toContain('HttpOnly; SameSite=Strict');
  expect((await ask(server.port, '/', { Cookie: cookie })).body).toContain('<title>page');
  const client = await PageClient.connect(server.port, { Origin: origin, Cookie: cookie });
  clients.push(client);
  await client.find(isHello);
});

test('recordings are opened by a name on the shelf only, and cannot be steered', async () => {
  const bench = syntheticBench({ control: true });
  const opened: string[] = [];
  const { source } = bench;
  const server = await start({
    source,
    token,
    recordings: {
      list: async () => [{ name: 'round 1', bench: 'b', scenario: 's', startedAt: 0, length: 10, verdict: 'holds' }],
      open: async (name) => {
        opened.push(name);
        return {
          bench: source.bench,
          signals: source.signals,
          events: source.events,
          firstTick: 0,
          lastTick: 999,
          history: async () => ({ ticks: Float64Array.of(5), least: Float32Array.of(1), most: Float32Array.of(2) }),
          eventsIn: async () => [],
          statusAt: async (tick) => ({
            ...source.status(),
            run: { ...source.status().run, tick, pace: 'recording' as const },
          }),
          close: async () => {},
        };
      },
    },
  });
  const client = await join_(server);
  client.send({ type: 'open', request: 1, name: '../../etc/passwd' });
  expect((await client.find(isRefusal)).what).toContain('no recording called');
  client.send({ type: 'open', request: 2, name: 'round 1' });
  await client.find((message) => message.type === 'opened');
  expect(opened).toEqual(['round 1']);
  client.send({ type: 'moment', request: 3, tick: 500 });
  const moment = await client.find(
    (message): message is StatusMessage => message.type === 'status' && message.request === 3,
  );
  expect(moment.status.run).toMatchObject({ tick: 500, pace: 'recording' });
  client.send({ type: 'token', request: 4, token });
  await client.find(answers(4));
  client.send({ type: 'command', request: 5, who: 'A', command: { kind: 'note', text: 'x' } });
  expect((await client.find(answers(5))).acknowledgement.text).toContain('cannot be steered');
});

test('closing lets go of hands, ends connections with a reason and frees the port', async () => {
  const bench = syntheticBench({ control: true });
  const server = await start({ source: bench.source, token });
  const client = await join_(server);
  client.send({ type: 'token', request: 1, token });
  await client.find(answers(1));
  client.send({ type: 'command', request: 2, who: 'A', command: { kind: 'set', path: 'driver.brakePedal', value: 1 } });
  await client.find(answers(2));
  await client.find(isStatus);
  running.splice(running.indexOf(server), 1);
  const closed = server.close();
  await client.until(() => client.closeCode !== 0, 'end of the connection');
  await closed;
  expect([1001, 1006]).toContain(client.closeCode);
  expect(bench.commands.at(-1)?.command.kind).toBe('release');
  const again = await start({ port: server.port });
  expect(again.port).toBe(server.port);
  await expect(startLiveServer({ source: bench.source, page, token, port: server.port })).rejects.toThrow('is taken');
});
