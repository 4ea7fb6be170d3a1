import { WebSocket } from 'ws';
import type { PageMessage, ServerMessage } from '../../../bridge/live/wire.js';
import { decode, encode } from '../../../bridge/live/wire.js';

/** A page without a browser: connects, collects what comes, waits for what a test wants to see. */
export class PageClient {
  readonly received: ServerMessage[] = [];
  closeCode = 0;
  private readonly waiting = new Set<() => void>();

  private constructor(readonly socket: WebSocket) {
    socket.on('message', (data: Buffer) => {
      this.received.push(decode(data) as ServerMessage);
      for (const look of [...this.waiting]) look();
    });
    socket.on('close', (code) => {
      this.closeCode = code;
      for (const look of [...this.waiting]) look();
    });
    socket.on('error', () => {});
  }

  static connect(
    port: number,
    headers: Record<string, string> = { Origin: `http://127.0.0.1:${port}` },
    host = '127.0.0.1',
  ): Promise<PageClient> {
    const socket = new WebSocket(`ws://${host}:${port}/live`, { headers });
    const client = new PageClient(socket);
    return new Promise((resolve, reject) => {
      socket.once('open', () => resolve(client));
      socket.once('unexpected-response', (_request, response) => {
        reject(new Error(`refused ${response.statusCode}`));
        response.resume();
      });
      socket.once('error', reject);
    });
  }

  send(message: PageMessage): void {
    this.socket.send(encode(message));
  }

  /** The first message, already here or still to come, that `wanted` accepts. */
  async find<T extends ServerMessage>(wanted: (message: ServerMessage) => message is T): Promise<T>;
  async find(wanted: (message: ServerMessage) => boolean): Promise<ServerMessage>;
  async find(wanted: (message: ServerMessage) => boolean): Promise<ServerMessage> {
    let found: ServerMessage | undefined;
    await this.until(() => (found = this.received.find(wanted)) !== undefined, 'message');
    return found!;
  }

  until(true_: () => boolean, what: string): Promise<void> {
    if (true_()) return Promise.resolve();
    return new Promise((resolve, reject) => {
      const timer = setTimeout(() => {
        this.waiting.delete(look);
        reject(new Error(`the awaited ${what} did not come within 10 s`));
      }, 10_000);
      const look = () => {
        if (!true_()) return;
        clearTimeout(timer);
        this.waiting.delete(look);
        resolve();
      };
      this.waiting.add(look);
    });
  }

  close(): void {
    this.socket.terminate();
  }
}
