import { existsSync } from 'node:fs';
import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import type { Duplex } from 'node:stream';
import sirv from 'sirv';
import { type WebSocket, WebSocketServer } from 'ws';
import { Client } from './client.js';
import { Decimator } from './decimate.js';
import { cookieName, type GuardOptions, isLoopback, refuses, securityHeaders, TokenGate } from './guard.js';
import { Hands } from './hands.js';
import { serve } from './requests.js';
import { signInPage } from './sign-in.js';
import type { LiveEvent, LiveSource, RecordingShelf } from './source.js';
import { largestRequest } from './wire.js';

export interface LiveServerOptions {
  readonly source: LiveSource;
  /** Folder of the built page. */
  readonly page: string;
  /** Default 127.0.0.1. Any other than loopback needs a token. */
  readonly address?: string;
  /** Default 0: any free one. */
  readonly port?: number;
  /** Names by which other machines may call the server. */
  readonly names?: readonly string[];
  /** For control, and for everything at other addresses. */
  readonly token?: string;
  readonly recordings?: RecordingShelf;
  /** A recording on the shelf that every page begins with. */
  readonly opening?: string;
  /** Length of a display interval, s. Default 0.04. */
  readonly interval?: number;
  readonly mostClients?: number;
  /** Milliseconds since 1970; for tests. */
  readonly now?: () => number;
}

export interface LiveServer {
  /** `http://127.0.0.1:port/` */
  readonly url: string;
  readonly port: number;
  /** What the server counted since it started. */
  readonly counts: LiveCounts;
  /** Ends every connection, lets go of every hand, and resolves when the port is free. */
  close(): Promise<void>;
}
export interface LiveCounts {
  refusedRequests: number;
  refusedUpgrades: number;
  wrongMessages: number;
  tooManyMessages: number;
  commands: number;
  refusedCommands: number;
  skippedFrames: number;
}

/** What the parts of the server share. */
export interface Desk {
  readonly options: LiveServerOptions;
  readonly source: LiveSource;
  readonly decimator: Decimator;
  readonly hands: Hands;
  readonly gate: TokenGate | undefined;
  readonly counts: LiveCounts;
  readonly now: () => number;
  readonly serverStart: number;
  /** The newest events, oldest first. */
  readonly events: LiveEvent[];
}
const mostEvents = 2000;

/** Serves the page and its websocket. Everything here runs on the host thread: nothing can delay a tick. */
export async function startLiveServer(options: LiveServerOptions): Promise<LiveServer> {
  const address = options.address ?? '127.0.0.1';
  const remote = !isLoopback(address);
  if (remote && (options.token ?? '').length < 16) {
    throw new Error(
      `the live view at ${address} needs a token of at least 16 characters, since other machines can reach it; or leave the address at 127.0.0.1`,
    );
  }
  if (options.source.command !== undefined && (options.token ?? '').length < 16) {
    throw new Error('a live view with control needs a token of at least 16 characters');
  }
  const now = options.now ?? Date.now;
  const { source } = options;
  const interval = Math.max(1, Math.round((options.interval ?? 0.04) / source.bench.step));
  const desk: Desk = {
    options,
    source,
    decimator: new Decimator({ signals: source.signals.length, interval }),
    hands: new Hands(source, now),
    gate: options.token === undefined ? undefined : new TokenGate(options.token, now),
    counts: {
      refusedRequests: 0,
      refusedUpgrades: 0,
      wrongMessages: 0,
      tooManyMessages: 0,
      commands: 0,
      refusedCommands: 0,
      skippedFrames: 0,
    },
    now,
    serverStart: now(),
    events: [],
  };
  const clients = new Set<Client>();
  if (!existsSync(join(options.page, 'index.html'))) {
    throw new Error(
      `the live page is not built: ${options.page} has no index.html; run "npm run build" or leave the live view off`,
    );
  }
  const files = sirv(options.page, { etag: true, dotfiles: false, extensions: ['html'], setHeaders: cacheHeaders });
  let guard: GuardOptions = { names: options.names ?? [], port: options.port ?? 0 };

  const http = createServer({ maxHeaderSize: 8192 }, (request, response) => {
    for (const [name, value] of Object.entries(securityHeaders(request.headers.host))) response.setHeader(name, value);
    const refused = refuses(request, guard, false);
    if (refused !== undefined) refuse(response, desk, refused.status, refused.what);
    else if (remote && !desk.gate?.holdsCookie(request)) signIn(request, response, desk);
    else if (request.method !== 'GET' && request.method !== 'HEAD')
      refuse(response, desk, 405, 'only GET and HEAD are served');
    else files(request, response, () => refuse(response, desk, 404, 'there is no such page'));
  });
  http.headersTimeout = 10_000;
  http.requestTimeout = 15_000;
  http.maxConnections = 256;

  const sockets = new WebSocketServer({
    noServer: true,
    maxPayload: largestRequest,
    perMessageDeflate: false,
    clientTracking: false,
  });
  http.on('upgrade', (request: IncomingMessage, socket: Duplex, head: Buffer) => {
    const refused =
      refuses(request, guard, true) ??
      (request.url !== '/live' ? { status: 404, what: 'the websocket is at /live' } : undefined) ??
      (remote && !desk.gate?.holdsCookie(request) ? { status: 401, what: 'send the token first' } : undefined) ??
      (clients.size >= (options.mostClients ?? 64) ? { status: 429, what: 'too many pages are open' } : undefined);
    if (refused !== undefined) {
      desk.counts.refusedUpgrades += 1;
      socket.on('error', () => socket.destroy());
      socket.end(
        `HTTP/1.1 ${refused.status} Refused\r\nContent-Type: text/plain; charset=utf-8\r\nConnection: close\r\n\r\n${refused.what}\n`,
      );
      return;
    }
    sockets.handleUpgrade(request, socket, head, (webSocket) => welcome(webSocket, request, remote));
  });

  function welcome(socket: WebSocket, request: IncomingMessage, signedIn: boolean): void {
    const client = new Client(socket, request.socket.remoteAddress ?? '', signedIn, now);
    clients.add(client);
    socket.on('error', () => socket.terminate());
    socket.on('close', () => {
      clients.delete(client);
      desk.hands.leave(client);
      void client.recording?.close();
    });
    serve(client, desk);
  }

  /** Events since the last frame; never left out for a slow client: one that is too far behind is dropped instead. */
  let fresh: LiveEvent[] = [];
  let knownNames = 0;
  const detach = source.attach({
    rows: (ticks, values, count) => desk.decimator.rows(ticks, values, count),
    event: (event) => {
      desk.events.push(event);
      if (desk.events.length > mostEvents) desk.events.splice(0, desk.events.length - mostEvents);
      fresh.push(event);
    },
  });
  const frames = setInterval(
    () => {
      const events = fresh;
      const names = source.events.kinds.length + source.events.subjects.length;
      const grown = names !== knownNames;
      knownNames = names;
      if (events.length > 0) fresh = [];
      for (const client of clients) {
        if (grown && client.recording === undefined) client.send({ type: 'names', events: source.events });
        if (!client.frame(desk.decimator)) desk.counts.skippedFrames += 1;
        if (events.length > 0 && client.recording === undefined) client.send({ type: 'events', events, past: false });
      }
    },
    Math.max(10, interval * source.bench.step * 1000),
  );
  const statuses = setInterval(() => {
    desk.hands.expire();
    if (clients.size === 0) return;
    const status = source.status();
    for (const client of clients)
      if (client.recording === undefined && client.reads)
        client.send({ type: 'status', status, clients: clients.size });
  }, 100);

  await listen(http, options.port ?? 0, address);
  const port = (http.address() as AddressInfo).port;
  guard = { names: guard.names, port };
  const shown = address.includes(':') ? `[${address}]` : address;
  return {
    url: `http://${shown}:${port}/`,
    port,
    counts: desk.counts,
    async close() {
      clearInterval(frames);
      clearInterval(statuses);
      detach();
      for (const client of clients) {
        desk.hands.leave(client);
        client.socket.close(1001, 'the bench ends');
      }
      const deadline = setTimeout(() => {
        for (const client of clients) client.socket.terminate();
      }, 500);
      await new Promise<void>((resolve) => {
        http.close(() => resolve());
        http.closeAllConnections();
      });
      for (const client of clients) client.socket.terminate();
      clearTimeout(deadline);
    },
  };
}

function listen(http: Server, port: number, address: string): Promise<void> {
  return new Promise((resolve, reject) => {
    http.once('error', (error: NodeJS.ErrnoException) => {
      reject(
        error.code === 'EADDRINUSE'
          ? new Error(`port ${port} at ${address} is taken: choose another for the live view, or 0 for any free one`)
          : error,
      );
    });
    http.listen(port, address, () => resolve());
  });
}

function refuse(response: ServerResponse, desk: Desk, status: number, what: string): void {
  desk.counts.refusedRequests += 1;
  response.writeHead(status, { 'Content-Type': 'text/plain; charset=utf-8', 'Cache-Control': 'no-store' });
  response.end(`${what}\n`);
}

/** Built files carry a hash in their names; the page itself must be asked for each time. */
function cacheHeaders(response: ServerResponse, pathname: string): void {
  response.setHeader(
    'Cache-Control',
    pathname.startsWith('/assets/') ? 'private, max-age=31536000, immutable' : 'no-cache',
  );
}

/** At addresses that other machines reach, nothing is served before the token came: by a form, never in an address. */
function signIn(request: IncomingMessage, response: ServerResponse, desk: Desk): void {
  if (request.method === 'POST' && request.url === '/token') {
    let body = '';
    request.setEncoding('utf8');
    request.on('data', (chunk: string) => {
      body += chunk;
      if (body.length > 1024) request.destroy();
    });
    request.on('end', () => {
      const token = new URLSearchParams(body).get('token') ?? '';
      const result = desk.gate?.try(token, request.socket.remoteAddress ?? '') ?? 'wrong';
      if (result === 'right') {
        response.writeHead(303, {
          Location: '/',
          'Set-Cookie': `${cookieName}=${desk.gate?.cookie}; HttpOnly; SameSite=Strict; Path=/`,
          'Cache-Control': 'no-store',
        });
        response.end();
        return;
      }
      signInPage(
        response,
        result === 'wait' ? 429 : 401,
        result === 'wait' ? 'Too many wrong tokens. Wait a minute.' : 'That is not the token.',
      );
    });
    return;
  }
  if (request.method === 'GET' && request.url === '/') signInPage(response, 401, '');
  else refuse(response, desk, 401, 'send the token first');
}
