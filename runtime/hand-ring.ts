import type { HandSource } from './hand.js';
import { type HandMessage, handBytes, writeHand } from './hand-wire.js';
import { createRing, type RingHandle, RingReader, RingWriter } from './ring.js';

const RECORD_HAND = 1;

/** The ring by which hands go from the host to the loop. What does not fit is refused at the host, never waited for. */
export function createHandRing(): RingHandle {
  return createRing({ capacity: 1 << 18, reserve: 0, whenFull: 'drop' });
}

/** The loop's end. */
export class HandRing implements HandSource {
  private readonly ring: RingReader;

  constructor(handle: RingHandle) {
    this.ring = new RingReader(handle);
  }

  poll(into: Uint8Array): number {
    const { ring } = this;
    if (!ring.next()) return -1;
    const { bytes, offset } = ring;
    const length = Math.min(ring.length, into.length);
    for (let i = 0; i < length; i += 1) into[i] = bytes[offset + i]!;
    ring.release();
    return length;
  }
}

/** The host's end. */
export class HandRingWriter {
  private readonly ring: RingWriter;
  private readonly scratch = new Uint8Array(handBytes.most);

  constructor(handle: RingHandle) {
    this.ring = new RingWriter(handle);
  }

  /** False when the ring is full. */
  put(hand: HandMessage): boolean {
    const length = writeHand(hand, this.scratch);
    const at = this.ring.claim(RECORD_HAND, length, true);
    if (at < 0) return false;
    this.ring.bytes.set(this.scratch.subarray(0, length), at);
    this.ring.publish();
    return true;
  }
}
