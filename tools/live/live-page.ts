import { existsSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import path from 'node:path';
import { setTimeout } from 'node:timers/promises';
import { isLoopback, newToken, securityHeaders } from '../../bridge/live/guard.js';
import { type LiveServer, startLiveServer } from '../../bridge/live/server.js';
import type { LiveSource, RecordingShelf } from '../../bridge/live/source.js';
import { BuildError } from '../../runtime/contract.js';
import { packageRoot } from '../loop/controller-module.js';

/** First port that is tried when none is asked for, and how many from there. */
const usualPort = 47180;
const tries = 20;
/** ms: a display interval and a status behind it. */
const settling = 250;

/** What the command line asks for. */
export interface PageWish {
  readonly address: string;
  /** Undefined: the first free one from a fixed one on. */
  readonly port: number | undefined;
  readonly control: boolean;
  /** Names by which other machines may call the server. */
  readonly names?: readonly string[];
}

/**
 * Reads `--page`: nothing, `off`, a port, an address, or both as `ADDRESS:PORT`. Undefined: no page. Throws BuildError.
 */
export function readPageWish(
  said: string | boolean | undefined,
  control: boolean,
  names: readonly string[] = [],
): PageWish | undefined {
  if (said === 'off' || said === false) {
    if (control) throw wrong('--control', 'hands come in through the live page', 'off', 'leave --page off away');
    return undefined;
  }
  if (said === undefined && !control) return undefined;
  const usual = { address: '127.0.0.1', port: undefined, control, names };
  if (said === undefined || said === true) return usual;
  const match = /^(?:\[([0-9a-f:]+)\]|([\w.-]*?))(?::(\d{1,5}))?$/i.exec(said);
  const onlyPort = /^\d{1,5}$/.test(said);
  const port = onlyPort ? said : match?.[3];
  const address = onlyPort ? '' : (match?.[1] ?? match?.[2] ?? '');
  if ((match === null && !onlyPort) || /^\d+$/.test(address) || Number(port ?? 0) > 65_535)
    throw wrong('--page', 'not understood', said, 'write it as 127.0.0.1:8080, 8080 or off');
  return {
    ...usual,
    ...(address === '' ? {} : { address }),
    ...(port === undefined ? {} : { port: Number(port) }),
  };
}

/** Folder of the built page. */
export function pageFolder(): string {
  return path.join(packageRoot(), 'dist', 'bridge', 'page');
}

export function pageIsBuilt(folder = pageFolder()): boolean {
  return existsSync(path.join(folder, 'index.html'));
}

/**
 * The live page of a run. Its port is taken, and its address known, before the bench is built; until `serve` it says
 * that the bench is being built.
 */
export class LivePage {
  /** For control and for addresses that other machines reach. */
  readonly token: string | undefined;
  private server: LiveServer | undefined;

  private constructor(
    private readonly wish: PageWish,
    private place: Server | undefined,
    readonly port: number,
    private readonly folder: string,
  ) {
    this.token = wish.control || !isLoopback(wish.address) ? newToken() : undefined;
  }

  /** Takes the port. Throws BuildError when it is not to be had, or when the page is not built. */
  static async reserve(wish: PageWish, folder = pageFolder()): Promise<LivePage> {
    if (!pageIsBuilt(folder))
      throw wrong('--page', 'the live page is not built', folder, 'run node tools/prepare.mjs, or leave --page away');
    const ports = wish.port === undefined ? Array.from({ length: tries }, (_, i) => usualPort + i) : [wish.port];
    let last: NodeJS.ErrnoException | undefined;
    for (const port of ports) {
      try {
        const server = await placeholder(wish.address, port);
        return new LivePage(wish, server, (server.address() as { port: number }).port, folder);
      } catch (error) {
        last = error as NodeJS.ErrnoException;
        if (last.code !== 'EADDRINUSE') break;
      }
    }
    const where = `${wish.address}:${ports.length > 1 ? `${ports[0]} .. ${ports.at(-1)}` : ports[0]}`;
    throw wrong(
      '--page',
      `the live page cannot listen there: ${last?.code}`,
      where,
      'choose another with --page ADDRESS:PORT, or --page off',
    );
  }

  get control(): boolean {
    return this.wish.control;
  }

  get url(): string {
    const { address } = this.wish;
    return `http://${address.includes(':') ? `[${address}]` : address}:${this.port}/`;
  }

  /** What to print for people: the address, and the token where one is needed. Behind the # it is never sent in a request. */
  get invitation(): string {
    if (this.token === undefined) return this.url;
    const what = this.wish.control ? 'whoever has it may steer the bench' : 'whoever has it may look';
    return isLoopback(this.wish.address)
      ? `${this.url}#token=${this.token} (${what})`
      : `${this.url} with the token ${this.token} (${what})`;
  }

  async serve(source: LiveSource, recordings?: RecordingShelf, opening?: string): Promise<void> {
    await shut(this.place);
    this.place = undefined;
    this.server = await startLiveServer({
      source,
      page: this.folder,
      address: this.wish.address,
      port: this.port,
      names: this.wish.names ?? [],
      ...(this.token === undefined ? {} : { token: this.token }),
      ...(recordings === undefined ? {} : { recordings }),
      ...(opening === undefined ? {} : { opening }),
    });
  }

  /** Waits until what the server was given last has gone out. */
  async settle(): Promise<void> {
    if (this.server !== undefined) await setTimeout(settling);
  }

  async close(): Promise<void> {
    await shut(this.place);
    this.place = undefined;
    await this.server?.close();
    this.server = undefined;
  }
}

/** Comes back by itself. Not by a header: that would not reload an address with a token behind its #. */
const waitScript = `setInterval(() => {
  fetch('/', { cache: 'no-store' }).then((answer) => { if (answer.ok || answer.status === 401) location.reload(); }, () => {});
}, 500);
`;
const waitPage =
  '<!doctype html><html lang="en"><meta charset="utf-8"><meta name="viewport" content="width=device-width">' +
  '<title>oilspring</title><script src="/wait.js" defer></script><p role="status">The bench is being built.</p></html>';

function placeholder(address: string, port: number): Promise<Server> {
  const server = createServer((request, response) => {
    for (const [name, value] of Object.entries(securityHeaders(request.headers.host))) response.setHeader(name, value);
    const script = request.url === '/wait.js';
    response.writeHead(script ? 200 : 503, {
      'Content-Type': `${script ? 'text/javascript' : 'text/html'}; charset=utf-8`,
      'Cache-Control': 'no-store',
      'Retry-After': '1',
      // the port changes hands soon
      Connection: 'close',
    });
    response.end(script ? waitScript : waitPage);
  });
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(port, address, () => resolve(server));
  });
}

async function shut(server: Server | undefined): Promise<void> {
  if (server === undefined) return;
  await new Promise<void>((resolve) => {
    server.close(() => resolve());
    server.closeAllConnections();
  });
}

function wrong(at: string, what: string, value: string, remedy: string): BuildError {
  return new BuildError([{ path: at, what, value, remedy }]);
}
