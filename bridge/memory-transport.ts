import type { WaitingTransport } from './transport.js';

/**
 * A queue of datagrams in memory with a fixed number of places, all allocated when it is made. A datagram that finds
 * no place is dropped and counted, as a socket's receive buffer does it.
 */
export class DatagramQueue {
  dropped = 0;
  private readonly bytes: Uint8Array;
  private readonly lengths: Int32Array;
  private head = 0;
  private count = 0;

  constructor(
    readonly places: number,
    readonly placeLength: number,
  ) {
    this.bytes = new Uint8Array(places * placeLength);
    this.lengths = new Int32Array(places);
  }

  get waiting(): number {
    return this.count;
  }

  /** Appends the first `length` bytes; false when there is no place or the datagram is longer than one. */
  push(bytes: Uint8Array, length: number): boolean {
    if (this.count === this.places || length > this.placeLength) {
      this.dropped += 1;
      return false;
    }
    const place = (this.head + this.count) % this.places;
    const at = place * this.placeLength;
    for (let i = 0; i < length; i += 1) this.bytes[at + i] = bytes[i];
    this.lengths[place] = length;
    this.count += 1;
    return true;
  }

  /** Moves the oldest datagram into `into`, cut to its length; the datagram's length, or -1 when none waits. */
  shift(into: Uint8Array): number {
    if (this.count === 0) return -1;
    const at = this.head * this.placeLength;
    const length = this.lengths[this.head];
    const copied = Math.min(length, into.length);
    for (let i = 0; i < copied; i += 1) into[i] = this.bytes[at + i];
    this.head = (this.head + 1) % this.places;
    this.count -= 1;
    return length;
  }
}

/**
 * One end of a link in memory. `wait` gives the other end its turn (a controller module steps there) and says whether
 * something came of it; the milliseconds mean nothing here, since nothing else runs meanwhile.
 */
export class MemoryTransport implements WaitingTransport {
  /** Called by `wait` when nothing waits: lets the other end run. */
  turn: () => void = doNothing;

  constructor(
    readonly incoming: DatagramQueue,
    readonly outgoing: DatagramQueue,
  ) {}

  poll(into: Uint8Array): number {
    return this.incoming.shift(into);
  }

  send(bytes: Uint8Array, length: number): number {
    return this.outgoing.push(bytes, length) ? length : -1;
  }

  wait(_milliseconds: number): boolean {
    if (this.incoming.waiting === 0) this.turn();
    return this.incoming.waiting > 0;
  }
}

/** Two ends that hear each other: [the bench's, the controller's]. */
export function memoryPair(places = 256, placeLength = 2048): [MemoryTransport, MemoryTransport] {
  const toBench = new DatagramQueue(places, placeLength);
  const toController = new DatagramQueue(places, placeLength);
  return [new MemoryTransport(toBench, toController), new MemoryTransport(toController, toBench)];
}

function doNothing(): void {}
