import type { WebSocket } from 'ws';
import type { Decimator } from './decimate.js';
import { Allowance } from './guard.js';
import type { RecordingView } from './source.js';
import { bytesOf, encode, type ServerMessage } from './wire.js';

/** Bytes that may wait in a connection before frames are left out, and before it is dropped. */
export const thinAbove = 256 * 1024;
export const dropAbove = 8 * 1024 * 1024;
/** Most intervals in one frame; a client that lags gets wider ones, none of which hides a spike. */
const mostIntervals = 25;

/** One connection: what it subscribed to, how far its picture is, how much it may still ask. */
export class Client {
  readonly requests: Allowance;
  authorised: boolean;
  /** Not undefined while it looks at a recording instead of the bench. */
  recording: RecordingView | undefined;
  /** Messages not understood. */
  wrong = 0;
  private subscription = 0;
  private signals: readonly number[] = [];
  private sentInterval = -1;
  private thinned = false;

  constructor(
    readonly socket: WebSocket,
    readonly address: string,
    authorised: boolean,
    now: () => number,
  ) {
    this.authorised = authorised;
    this.requests = new Allowance(120, 60, now);
  }

  /** So much waits that it must read before it may ask for more. */
  get choked(): boolean {
    return this.socket.bufferedAmount > dropAbove / 2;
  }

  get reads(): boolean {
    return this.socket.readyState === 1 && this.socket.bufferedAmount < thinAbove;
  }

  send(message: ServerMessage): void {
    if (this.socket.readyState !== 1) return;
    if (this.socket.bufferedAmount > dropAbove) {
      this.socket.terminate();
      return;
    }
    this.socket.send(encode(message));
  }

  subscribe(subscription: number, signals: readonly number[], decimator: Decimator): void {
    this.subscription = subscription;
    this.signals = signals;
    this.sentInterval = Math.max(-1, decimator.newestWhole - 1);
    this.frame(decimator);
  }

  /** Sends what came since the last frame; false when the client is behind: then later, in wider intervals. */
  frame(decimator: Decimator): boolean {
    const newest = decimator.newestWhole;
    if (newest <= this.sentInterval || this.recording !== undefined) return true;
    if (!this.reads) {
      this.thinned = true;
      return false;
    }
    const from = (this.sentInterval + 1) * decimator.interval;
    const to = (newest + 1) * decimator.interval - 1;
    const history = decimator.history(this.signals, from, to, mostIntervals);
    this.sentInterval = newest;
    if (history.ticks.length === 0) return true;
    this.send({
      type: 'frame',
      subscription: this.subscription,
      from,
      to,
      ticks: bytesOf(history.ticks),
      least: bytesOf(history.least),
      most: bytesOf(history.most),
      last: bytesOf(Float32Array.from(this.signals, (signal) => decimator.last[signal])),
      thinned: this.thinned,
    });
    this.thinned = false;
    return true;
  }
}
