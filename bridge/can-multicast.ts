import { CLOCK_REALTIME } from '../runtime/realtime/clock.js';
import { type LibC, libc } from '../runtime/realtime/ffi.js';
import { CanDatagram } from './can-datagram.js';
import { frameSizes } from './can-frame.js';
import { NoteQueue } from './can-notes.js';
import type { WaitingTransport } from './transport.js';
import { UdpSocket } from './udp-socket.js';

export interface CanMulticastOptions {
  readonly group: string;
  readonly port: number;
  /** Own address by which frames go and come; 127.0.0.1 keeps them on this computer. */
  readonly interfaceAddress: string;
}

/**
 * A CAN bus over UDP multicast, in python-can's format: no hardware, no kernel with CAN. It models no bit rate, no
 * arbitration and no errors.
 *
 * Frames are sent from a socket of their own, so that what comes back from there can be told from what others on the
 * same computer send. Nothing here allocates per frame.
 */
export class CanMulticast implements WaitingTransport {
  /** Frames taken, and sent; datagrams that are no frames. */
  received = 0;
  sent = 0;
  malformed = 0;
  /** When the sender of the last frame says that it sent: [seconds, nanoseconds] since 1970. For logs only. */
  readonly stamp = new Float64Array(2);
  private readonly c: LibC = libc();
  private readonly words = new Int32Array(4);
  private readonly wall = new Float64Array(1);
  private readonly notes = new NoteQueue();
  private readonly incoming = new CanDatagram();
  private readonly outgoing = new CanDatagram();
  private readonly frame = new Uint8Array(frameSizes.flexible);
  private readonly receiver: UdpSocket;
  private readonly sender: UdpSocket;
  private dropped = 0;
  private polls = 0;

  /** Opens both sockets. Throws `UdpError` with the kernel's reason and what to do. */
  constructor(options: CanMulticastOptions) {
    const { group, port, interfaceAddress } = options;
    this.sender = new UdpSocket({
      local: { address: interfaceAddress, port: 0 },
      peer: { address: group, port },
      receiveBuffer: 1 << 12,
      multicast: { group, interfaceAddress, receive: false },
    });
    try {
      this.receiver = new UdpSocket({
        local: { address: group, port },
        reuseAddress: true,
        multicast: { group, interfaceAddress },
        ignore: { address: interfaceAddress, port: this.sender.localPort },
      });
    } catch (error) {
      this.sender.close();
      throw error;
    }
  }

  poll(into: Uint8Array): number {
    const told = this.notes.take(into);
    if (told >= 0) return told;
    this.polls += 1;
    if (this.polls % 256 === 0) this.countDropped();
    for (;;) {
      const length = this.receiver.poll(this.incoming.bytes);
      if (length < 0) return this.notes.take(into);
      const size = this.incoming.read(length, this.frame);
      if (size < 0) {
        this.malformed += 1;
        this.notes.malformed += 1;
        return this.notes.take(into);
      }
      this.received += 1;
      this.stamp[0] = Math.floor(this.incoming.stamp[0]);
      this.stamp[1] = Math.round((this.incoming.stamp[0] - this.stamp[0]) * 1e9);
      const kept = Math.min(size, into.length);
      for (let i = 0; i < kept; i += 1) into[i] = this.frame[i];
      return size;
    }
  }

  send(frame: Uint8Array, size: number): number {
    this.c.clock_gettime(CLOCK_REALTIME, this.words);
    this.wall[0] = this.words[0] + this.words[2] * 1e-9;
    const length = this.outgoing.write(frame, size, this.wall, 0);
    if (this.sender.send(this.outgoing.bytes, length) === length) {
      this.sent += 1;
      return size;
    }
    this.notes.unsent += 1;
    this.notes.unsentReason = this.sender.unsentReason;
    return -1;
  }

  wait(milliseconds: number): boolean {
    return this.receiver.wait(milliseconds);
  }

  close(): void {
    this.receiver.close();
    this.sender.close();
  }

  private countDropped(): void {
    const now = this.receiver.dropped;
    if (now > this.dropped) this.notes.dropped += now - this.dropped;
    this.dropped = now;
  }
}
