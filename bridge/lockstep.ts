import type { WaitingTransport } from './transport.js';
import { Datagram, UdpInbox, verdicts, writeControl } from './udp-codec.js';
import { header, kinds } from './udp-layout.js';

/** The controller did not answer in lockstep. The run cannot be finished (exit code 5). */
export class LockstepError extends Error {
  override readonly name = 'LockstepError';
}

export interface LockstepOptions {
  readonly link: string;
  readonly mapChecksum: number;
  /** Ticks per period of the controller; `end` goes out in the ticks that it divides. Default 1. */
  readonly every?: number;
  /** Wall-clock time that an answer may take, ms. Default 5000. */
  readonly limit?: number;
  /** Monotonic wall clock, ms; passed in. */
  readonly now: () => number;
}

/**
 * The barrier of lockstep, around a link's transport. After the messages of tick k the bench says `end k`; the
 * controller answers with its messages and then `done k`. `poll` lets the take of tick k+1 have exactly what came up to
 * and with `done k`, waiting for it where need be. The wait never becomes data: it ends well, or the run ends with a
 * LockstepError. Derived again from the record, `done k` is one of the recorded inputs and no barrier is needed.
 */
export class LockstepTransport implements WaitingTransport {
  private readonly every: number;
  private readonly limit: number;
  private readonly control = new Datagram(64);
  private readonly seen: Datagram;
  private readonly inbox: UdpInbox;
  private sequence = 0;
  private awaited = 0;
  private open = true;
  private answered = false;

  constructor(
    private readonly inner: WaitingTransport,
    private readonly options: LockstepOptions,
  ) {
    this.every = options.every ?? 1;
    this.limit = options.limit ?? 5000;
    this.inbox = new UdpInbox([], options.mapChecksum);
    this.seen = new Datagram(this.inbox.capacity);
  }

  /** Waits for the controller's `hello` before the first tick, ms. What else came before it is dropped. */
  awaitHello(limit: number): void {
    const until = this.options.now() + limit;
    for (;;) {
      const length = this.inner.poll(this.seen.bytes);
      if (length >= 0) {
        if (this.controlKind(this.seen.bytes, length) === kinds.hello) return;
        continue;
      }
      const left = until - this.options.now();
      if (left <= 0)
        throw new LockstepError(
          `link ${this.options.link}: no controller said hello within ${limit} ms, start one that knows the present message map, or see what it printed`,
        );
      this.inner.wait(left);
    }
  }

  send(bytes: Uint8Array, length: number): number {
    return this.inner.send(bytes, length);
  }

  wait(milliseconds: number): boolean {
    return this.inner.wait(milliseconds);
  }

  /** After the publish of tick `tick`: the controller has all of it now. */
  end(tick: number): void {
    if (tick % this.every !== 0) return;
    this.inner.send(
      this.control.bytes,
      writeControl(this.control, kinds.end, this.sequence, tick, this.options.mapChecksum),
    );
    this.sequence = (this.sequence + 1) | 0;
    this.awaited = tick;
    this.open = false;
  }

  poll(into: Uint8Array): number {
    if (this.open) return -1;
    for (;;) {
      let length = this.inner.poll(into);
      if (length < 0) length = this.waitFor(into);
      const kind = this.controlKind(into, length);
      // A controller repeats its hello until it hears the bench: how often is chance and must not become data.
      if (kind === kinds.hello && !this.answered) continue;
      if (kind === kinds.done && this.seen.view.getInt32(header.tick, true) === (this.awaited | 0)) {
        this.open = true;
        this.answered = true;
      }
      return length;
    }
  }

  private waitFor(into: Uint8Array): number {
    const until = this.options.now() + this.limit;
    for (;;) {
      const left = until - this.options.now();
      if (left > 0) this.inner.wait(left);
      const length = this.inner.poll(into);
      if (length >= 0) return length;
      if (left <= 0)
        throw new LockstepError(
          `link ${this.options.link}: the controller did not answer \`end ${this.awaited}\` within ${this.limit} ms, it has ended or waits for something; the run ends here`,
        );
    }
  }

  /** The kind of a sound datagram without fields, of which a copy then stands in `seen`; 0 for any other. */
  private controlKind(bytes: Uint8Array, length: number): number {
    if (length >= this.seen.capacity) return 0;
    if (bytes !== this.seen.bytes) for (let i = 0; i < length; i += 1) this.seen.bytes[i] = bytes[i];
    return this.inbox.inspect(this.seen, length) === verdicts.sound ? this.seen.view.getUint8(header.kind) : 0;
  }
}
