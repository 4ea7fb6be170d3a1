import { errnoName, errnoOf, type LibC, libc } from '../runtime/realtime/ffi.js';
import type { WaitingTransport } from './transport.js';

const AF_INET = 2;
const SOCK_DGRAM = 2;
const SOCK_NONBLOCK = 0o4000;
const SOCK_CLOEXEC = 0o2000000;
const SOL_SOCKET = 1;
const SO_REUSEADDR = 2;
const SO_RCVBUF = 8;
const SO_RCVBUFFORCE = 33;
const SO_MEMINFO = 55;
/** Word of SO_MEMINFO that counts datagrams dropped because the receive buffer was full. */
const MEMINFO_DROPS = 8;
const IPPROTO_IP = 0;
const IP_MULTICAST_IF = 32;
const IP_MULTICAST_TTL = 33;
const IP_MULTICAST_LOOP = 34;
const IP_ADD_MEMBERSHIP = 35;
const MSG_TRUNC = 0x20;
const POLLIN = 1;
const ADDRESS_BYTES = 16;
/** Datagrams of strangers that one call of `poll` passes over, so that a flood cannot hold the tick. */
const MOST_STRANGERS = 64;

export interface SocketAddress {
  /** IPv4, four decimal numbers. */
  readonly address: string;
  readonly port: number;
}

export interface UdpOptions {
  readonly local: SocketAddress;
  /** Where `send` sends to, and the only one whose datagrams are taken. Absent: anybody's, until `adoptSender`. */
  readonly peer?: SocketAddress;
  /** Receive buffer, bytes; the kernel doubles it for its own books and caps it without CAP_NET_ADMIN. Default 1 MiB. */
  readonly receiveBuffer?: number;
  /** Lets several sockets bind the same group port. */
  readonly reuseAddress?: boolean;
  readonly multicast?: {
    readonly group: string;
    readonly interfaceAddress?: string;
    readonly timeToLive?: number;
    readonly loop?: boolean;
    /** False: for sending only, the group is not joined. Default true. */
    readonly receive?: boolean;
  };
  /** Whose datagrams are passed over: an own socket that sends to the same group. */
  readonly ignore?: SocketAddress;
}

/** An error of the operating system about a socket. `code` is its name, for example `EADDRINUSE`. */
export class UdpError extends Error {
  override readonly name = 'UdpError';
  constructor(
    readonly code: string,
    message: string,
  ) {
    super(message);
  }
}

const REMEDIES: Record<string, string> = {
  EADDRINUSE: 'another program holds this port: stop it or choose another localPort',
  EADDRNOTAVAIL:
    'no interface of this computer has this address: use 127.0.0.1, 0.0.0.0 or one that `ip address` lists',
  EACCES: 'ports below 1024 need more rights: choose a higher one',
  EMFILE: 'too many open files: raise `ulimit -n`',
  ENODEV: 'no interface can join this group: name one by interfaceAddress',
  ENETUNREACH: 'no route to that network',
};

/**
 * A non-blocking UDP socket of the calling thread, by FFI and without an event loop. Nothing here allocates per datagram.
 *
 * `poll` and `send` never throw on what a network may do: they count. Failures that mean a broken program or machine
 * (a closed descriptor, for example) throw.
 */
export class UdpSocket implements WaitingTransport {
  /** Datagrams taken, and sent. */
  received = 0;
  sent = 0;
  /** Datagrams from another address or port than the peer's: dropped. */
  strangers = 0;
  /** Datagrams longer than the buffer given to `poll`: taken, cut to the buffer. */
  oversized = 0;
  /** Datagrams that the kernel did not take for sending. */
  unsent = 0;
  /** Error number of the last one that was not sent. */
  unsentReason = 0;
  readonly localPort: number;
  /** What the kernel granted, bytes (its own bookkeeping included). */
  readonly receiveBuffer: number;
  private readonly c: LibC = libc();
  private readonly from = new Uint8Array(new ArrayBuffer(ADDRESS_BYTES));
  private readonly fromLength = new Int32Array([ADDRESS_BYTES]);
  private readonly to = new Uint8Array(new ArrayBuffer(ADDRESS_BYTES));
  private readonly waitSet = new Int32Array(2);
  private readonly memory = new Int32Array(9);
  private readonly own: Uint8Array | undefined;
  private peerKnown = false;
  private descriptor: number;

  /** Opens and binds. Throws `UdpError` with the kernel's reason and what to do, `RealtimeUnavailable` without FFI. */
  constructor(options: UdpOptions) {
    const c = this.c;
    const local = new Uint8Array(new ArrayBuffer(ADDRESS_BYTES));
    writeAddress(local, options.local);
    if (options.peer !== undefined) {
      writeAddress(this.to, options.peer);
      this.peerKnown = true;
    }
    if (options.ignore !== undefined) {
      this.own = new Uint8Array(new ArrayBuffer(ADDRESS_BYTES));
      writeAddress(this.own, options.ignore);
    }
    this.descriptor = c.socket(AF_INET, SOCK_DGRAM | SOCK_NONBLOCK | SOCK_CLOEXEC, 0);
    if (this.descriptor < 0) throw this.failure('opening a UDP socket');
    try {
      if (options.reuseAddress) this.set(SOL_SOCKET, SO_REUSEADDR, Int32Array.of(1), 'sharing the port');
      const size = Int32Array.of(options.receiveBuffer ?? 1 << 20);
      if (c.setsockopt(this.descriptor, SOL_SOCKET, SO_RCVBUFFORCE, size, 4) < 0)
        this.set(SOL_SOCKET, SO_RCVBUF, size, 'sizing the receive buffer');
      if (c.bind(this.descriptor, local, ADDRESS_BYTES) < 0)
        throw this.failure(`binding UDP ${addressText(options.local)}`);
      this.localPort = this.readBack(local);
      this.receiveBuffer = this.readOption(SO_RCVBUF);
      if (options.multicast) this.join(options.multicast);
    } catch (error) {
      this.close();
      throw error;
    }
    this.waitSet[0] = this.descriptor;
  }

  /**
   * Takes the next datagram of the peer into `into`; its length in bytes, or -1 when none waits (or when a flood of
   * strangers has used up this call's patience; the rest waits for the next one). One that is longer than `into` is cut
   * to it and counted in `oversized`.
   */
  poll(into: Uint8Array): number {
    const c = this.c;
    for (let i = 0; i < MOST_STRANGERS; i += 1) {
      this.fromLength[0] = ADDRESS_BYTES;
      const length = c.recvfrom(this.descriptor, into, into.length, MSG_TRUNC, this.from, this.fromLength);
      if (length < 0) {
        const errno = c.errno();
        if (errno === errnoOf.EAGAIN) return -1;
        // A pending error of an earlier send (a peer that is not there) is consumed by this call.
        if (
          errno === errnoOf.EINTR ||
          errno === errnoOf.ECONNREFUSED ||
          errno === errnoOf.EHOSTUNREACH ||
          errno === errnoOf.ENETUNREACH
        )
          continue;
        throw this.failure('receiving');
      }
      if (this.peerKnown && !sameAddress(this.from, this.to)) {
        this.strangers += 1;
        continue;
      }
      if (this.own !== undefined && sameAddress(this.from, this.own)) continue;
      this.received += 1;
      if (length <= into.length) return length;
      this.oversized += 1;
      return into.length;
    }
    return -1;
  }

  /** Sends the first `length` bytes to the peer; `length`, or -1 (counted) when the kernel did not take them or no peer is known. */
  send(bytes: Uint8Array, length: number): number {
    if (!this.peerKnown) {
      this.unsent += 1;
      this.unsentReason = errnoOf.EDESTADDRREQ;
      return -1;
    }
    if (this.c.sendto(this.descriptor, bytes, length, 0, this.to, ADDRESS_BYTES) === length) {
      this.sent += 1;
      return length;
    }
    const errno = this.c.errno();
    if (errno === errnoOf.EBADF || errno === errnoOf.EFAULT || errno === errnoOf.EINVAL) throw this.failure('sending');
    this.unsent += 1;
    this.unsentReason = errno;
    return -1;
  }

  /** Waits up to `milliseconds` of wall time (0: not at all) until something is there to receive. For lockstep, not for live. */
  wait(milliseconds: number): boolean {
    this.waitSet[1] = POLLIN;
    const ready = this.c.poll(this.waitSet, 1, milliseconds);
    if (ready < 0 && this.c.errno() !== errnoOf.EINTR) throw this.failure('waiting for a datagram');
    return ready > 0;
  }

  /** Makes the sender of the datagram last taken the peer. */
  adoptSender(): void {
    this.to.set(this.from);
    this.peerKnown = true;
  }

  /** The peer, or undefined. Allocates: not for the tick. */
  get peer(): SocketAddress | undefined {
    return this.peerKnown ? readAddress(this.to) : undefined;
  }

  /** Who sent the datagram last received, taken or not. Allocates: not for the tick. */
  get sender(): SocketAddress {
    return readAddress(this.from);
  }

  /** Datagrams that the kernel dropped because the receive buffer was full, since the socket was opened. */
  get dropped(): number {
    this.fromLength[0] = this.memory.byteLength;
    if (this.c.getsockopt(this.descriptor, SOL_SOCKET, SO_MEMINFO, this.memory, this.fromLength) < 0) return 0;
    return this.memory[MEMINFO_DROPS]! >>> 0;
  }

  /** Name of the reason why the last unsent datagram was not sent, or ''. */
  get unsentReasonName(): string {
    return this.unsentReason === 0 ? '' : errnoName(this.unsentReason);
  }

  /** Harmless when repeated. */
  close(): void {
    if (this.descriptor >= 0) this.c.close(this.descriptor);
    this.descriptor = -1;
  }

  private join(multicast: NonNullable<UdpOptions['multicast']>): void {
    const membership = new Uint8Array(8);
    membership.set(addressBytes(multicast.group), 0);
    membership.set(addressBytes(multicast.interfaceAddress ?? '0.0.0.0'), 4);
    if (multicast.receive !== false)
      this.set(IPPROTO_IP, IP_ADD_MEMBERSHIP, membership, `joining group ${multicast.group}`);
    if (multicast.interfaceAddress !== undefined) {
      this.set(
        IPPROTO_IP,
        IP_MULTICAST_IF,
        addressBytes(multicast.interfaceAddress),
        `sending by ${multicast.interfaceAddress}`,
      );
    }
    this.set(IPPROTO_IP, IP_MULTICAST_TTL, Int32Array.of(multicast.timeToLive ?? 1), 'setting the time to live');
    this.set(
      IPPROTO_IP,
      IP_MULTICAST_LOOP,
      Int32Array.of(multicast.loop === false ? 0 : 1),
      'setting the loop-back of multicast',
    );
  }

  private set(level: number, name: number, value: Uint8Array | Int32Array, what: string): void {
    if (this.c.setsockopt(this.descriptor, level, name, value, value.byteLength) < 0) throw this.failure(what);
  }

  private readOption(name: number): number {
    this.fromLength[0] = 4;
    const out = new Int32Array(1);
    this.c.getsockopt(this.descriptor, SOL_SOCKET, name, out, this.fromLength);
    return out[0]!;
  }

  private readBack(address: Uint8Array): number {
    this.fromLength[0] = ADDRESS_BYTES;
    if (this.c.getsockname(this.descriptor, address, this.fromLength) < 0)
      throw this.failure('reading the own address');
    return readAddress(address).port;
  }

  private failure(what: string): UdpError {
    const code = errnoName(this.c.errno());
    const remedy = REMEDIES[code];
    return new UdpError(code, `${what} failed: ${code}${remedy === undefined ? '' : `; ${remedy}`}`);
  }
}

function sameAddress(a: Uint8Array, b: Uint8Array): boolean {
  return a[2] === b[2] && a[3] === b[3] && a[4] === b[4] && a[5] === b[5] && a[6] === b[6] && a[7] === b[7];
}

/** sockaddr_in: family in host order, port and address in network order. */
function writeAddress(into: Uint8Array, address: SocketAddress): void {
  if (!Number.isInteger(address.port) || address.port < 0 || address.port > 65535)
    throw new RangeError(`port ${address.port}: a whole number 0 .. 65535`);
  into[0] = AF_INET;
  into[1] = 0;
  into[2] = address.port >> 8;
  into[3] = address.port & 255;
  into.set(addressBytes(address.address), 4);
}

function readAddress(from: Uint8Array): SocketAddress {
  return { address: from.subarray(4, 8).join('.'), port: from[2]! * 256 + from[3]! };
}

function addressBytes(text: string): Uint8Array {
  const parts = /^(\d{1,3})\.(\d{1,3})\.(\d{1,3})\.(\d{1,3})$/.exec(text)?.slice(1).map(Number);
  if (parts === undefined || parts.some((part) => part > 255)) {
    throw new RangeError(`address ${JSON.stringify(text)}: an IPv4 address such as 127.0.0.1`);
  }
  return Uint8Array.from(parts);
}

function addressText(address: SocketAddress): string {
  return `${address.address}:${address.port}`;
}
