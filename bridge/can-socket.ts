import { errnoName, errnoOf, type LibC, libc } from '../runtime/realtime/ffi.js';
import { frameSizes } from './can-frame.js';
import { interfaceStates, NoteQueue } from './can-notes.js';
import type { WaitingTransport } from './transport.js';

// linux/can.h, linux/can/raw.h, linux/can/error.h, asm-generic/socket.h, linux/sockios.h
const AF_CAN = 29;
const SOCK_RAW = 3;
const SOCK_NONBLOCK = 0o4000;
const SOCK_CLOEXEC = 0o2000000;
const CAN_RAW = 1;
const SOL_CAN_RAW = 101;
const CAN_RAW_FILTER = 1;
const CAN_RAW_ERR_FILTER = 2;
const CAN_RAW_RECV_OWN_MSGS = 4;
const CAN_RAW_FD_FRAMES = 5;
const SOL_SOCKET = 1;
const SO_RCVBUF = 8;
const SO_RCVBUFFORCE = 33;
const SO_TIMESTAMPNS = 35;
const SO_RXQ_OVFL = 40;
const SIOCGIFFLAGS = 0x8913;
const SIOCGIFMTU = 0x8921;
const SIOCGIFINDEX = 0x8933;
const IFF_UP = 1;
const POLLIN = 1;
/** sockaddr_can: family, interface index and room for what transport protocols need. */
const ADDRESS_BYTES = 24;
const REQUEST_BYTES = 40;
const CONTROL_BYTES = 128;
const MESSAGE_BYTES = 56;
/** Polls that found nothing between two looks at the interface: at 1 kHz it is looked at every 64 ms. */
const LOOK_EVERY = 64;

/** Identifier and mask as the kernel compares them: (frame & mask) === (identifier & mask), flags included. */
export interface CanFilter {
  readonly identifier: number;
  readonly mask: number;
}

export interface CanSocketOptions {
  /** Name of the interface, such as can0. */
  readonly interface: string;
  /** Frames to receive; absent: all. */
  readonly filters?: readonly CanFilter[];
  /** Receive error frames too. Default true. */
  readonly errors?: boolean;
  /** Send and receive CAN FD frames; the interface must be able to. */
  readonly flexibleDataRate?: boolean;
  /** Receive also what this socket itself sends. Default false. */
  readonly ownFrames?: boolean;
  /** Receive buffer, bytes; a frame takes about 900 of them. Default 4 MiB. */
  readonly receiveBuffer?: number;
}

/** An error of the operating system about a CAN interface. `code` is its name, for example `ENODEV`. */
export class CanError extends Error {
  override readonly name = 'CanError';
  constructor(
    readonly code: string,
    message: string,
  ) {
    super(message);
  }
}

/**
 * A non-blocking raw CAN socket of the calling thread, by FFI and without an event loop. Nothing here allocates per frame.
 *
 * What a bus may do never throws: `poll` hands over frames as `struct can_frame` or `canfd_frame` and, as notes (see
 * can-notes.ts), that the interface went down, came up, was deleted or made again, that frames were dropped because the
 * receive buffer was full, and that frames could not be sent. A deleted interface is bound again when one of its name
 * appears.
 */
export class CanSocket implements WaitingTransport {
  /** Frames taken, and sent. */
  received = 0;
  sent = 0;
  /** Frames that the kernel did not take because its queue or this socket's buffer was full, and for other reasons. */
  queueFull = 0;
  unsent = 0;
  /** Frames that the kernel dropped because the receive buffer was full. */
  dropped = 0;
  /** One of `interfaceStates`. */
  interfaceState: number = interfaceStates.up;
  /** When the kernel took the last frame: [seconds, nanoseconds] of the wall clock. For logs, never for a computation. */
  readonly stamp = new Float64Array(2);
  /** What the kernel granted, bytes (its own bookkeeping included). */
  readonly receiveBuffer: number;
  private readonly c: LibC = libc();
  private readonly notes = new NoteQueue();
  private readonly address = new Uint8Array(new ArrayBuffer(ADDRESS_BYTES));
  private readonly request = new Uint8Array(new ArrayBuffer(REQUEST_BYTES));
  private readonly requestWords = new Int32Array(this.request.buffer);
  private readonly frame = new Uint8Array(new ArrayBuffer(frameSizes.flexible));
  private readonly control = new DataView(new ArrayBuffer(CONTROL_BYTES));
  private readonly vector = new BigUint64Array(new ArrayBuffer(16));
  private readonly message = new Uint8Array(new ArrayBuffer(MESSAGE_BYTES));
  private readonly messageWords = new Int32Array(this.message.buffer);
  private readonly waitSet = new Int32Array(2);
  private readonly nameBytes: Uint8Array;
  /** [identifier, mask] of each filter. */
  private readonly filters: Int32Array;
  private index = 0;
  private idle = 0;
  private descriptor: number;

  /** Opens and binds. Throws `CanError` with the kernel's reason and what to do, `RealtimeUnavailable` without FFI. */
  constructor(private readonly options: CanSocketOptions) {
    const { c } = this;
    this.nameBytes = new TextEncoder().encode(options.interface);
    if (this.nameBytes.length === 0 || this.nameBytes.length > 15)
      throw new RangeError(`interface ${JSON.stringify(options.interface)}: a name of 1 to 15 bytes such as can0`);
    const everything: readonly CanFilter[] = [{ identifier: 0, mask: 0 }];
    this.filters = Int32Array.from(
      (options.filters ?? everything).flatMap(({ identifier, mask }) => [identifier | 0, mask | 0]),
    );
    this.prepareMessage();
    this.descriptor = c.socket(AF_CAN, SOCK_RAW | SOCK_NONBLOCK | SOCK_CLOEXEC, CAN_RAW);
    if (this.descriptor < 0) throw this.failure('opening a CAN socket');
    try {
      this.configure();
      this.index = this.ask(SIOCGIFINDEX);
      if (this.index < 0) throw this.failure(`finding interface ${options.interface}`);
      if (options.flexibleDataRate && this.ask(SIOCGIFMTU) < frameSizes.flexible)
        throw new CanError(
          'EMSGSIZE',
          `interface ${options.interface} is set up for classic CAN and the map has CAN FD messages: bring it up with \`ip link set ${options.interface} up type can bitrate ... dbitrate ... fd on\` (vcan: \`ip link set ${options.interface} mtu 72\`)`,
        );
      if (!this.bind()) throw this.failure(`binding to interface ${options.interface}`);
      this.receiveBuffer = this.readReceiveBuffer();
      const state = this.lookAtInterface();
      if (state !== interfaceStates.up) this.enter(state);
    } catch (error) {
      this.close();
      throw error;
    }
    this.waitSet[0] = this.descriptor;
  }

  /** Takes the next frame (16 or 72 bytes) or note (8 bytes) into `into`; its length, or -1 when none waits. */
  poll(into: Uint8Array): number {
    const told = this.notes.take(into);
    if (told >= 0) return told;
    const length = this.receive();
    if (length < 0) {
      this.idle += 1;
      if (this.idle % LOOK_EVERY === 0) this.enter(this.lookAtInterface());
      return this.notes.take(into);
    }
    this.received += 1;
    if (this.interfaceState !== interfaceStates.up) this.enter(interfaceStates.up);
    const kept = Math.min(length, into.length);
    for (let i = 0; i < kept; i += 1) into[i] = this.frame[i];
    return length;
  }

  /** Sends a frame of 16 or 72 bytes; `length`, or -1 (counted, and told by a note) when the kernel did not take it. */
  send(bytes: Uint8Array, length: number): number {
    if (this.c.send(this.descriptor, bytes, length, 0) === length) {
      this.sent += 1;
      return length;
    }
    const errno = this.c.errno();
    if (errno === errnoOf.ENOBUFS || errno === errnoOf.EAGAIN) {
      this.queueFull += 1;
      this.notes.queueFull += 1;
      return -1;
    }
    if (errno === errnoOf.EBADF || errno === errnoOf.EFAULT) throw this.failure('sending');
    if (errno === errnoOf.ENETDOWN) this.enter(interfaceStates.down);
    else if (errno === errnoOf.ENODEV || errno === errnoOf.ENXIO) this.enter(interfaceStates.gone);
    this.unsent += 1;
    this.notes.unsent += 1;
    this.notes.unsentReason = errno;
    return -1;
  }

  /** Waits up to `milliseconds` of wall time until something is there to receive. For listening, not for live. */
  wait(milliseconds: number): boolean {
    this.waitSet[1] = POLLIN;
    const ready = this.c.poll(this.waitSet, 1, milliseconds);
    if (ready < 0 && this.c.errno() !== errnoOf.EINTR) throw this.failure('waiting for a frame');
    return ready > 0;
  }

  /** Harmless when repeated. */
  close(): void {
    if (this.descriptor >= 0) this.c.close(this.descriptor);
    this.descriptor = -1;
  }

  /** Length of a frame that stands in `frame`, or -1 when none waits. */
  private receive(): number {
    for (let tries = 0; tries < 4; tries += 1) {
      this.messageWords[10] = CONTROL_BYTES;
      const length = this.c.recvmsg(this.descriptor, this.message, 0);
      if (length >= 0) {
        this.readControl();
        return length;
      }
      const errno = this.c.errno();
      if (errno === errnoOf.EAGAIN) return -1;
      // A pending state of the interface is consumed by whichever call comes first.
      if (errno === errnoOf.ENETDOWN) this.enter(interfaceStates.down);
      else if (errno === errnoOf.ENODEV || errno === errnoOf.ENXIO) this.enter(interfaceStates.gone);
      else if (errno !== errnoOf.EINTR && errno !== errnoOf.ENOBUFS) throw this.failure('receiving');
    }
    return -1;
  }

  /** Stamp and drop count out of the control messages: cmsghdr is [length u64, level i32, type i32], data after 16 bytes. */
  private readControl(): void {
    const { control } = this;
    const end = this.messageWords[10];
    let at = 0;
    while (at + 16 <= end) {
      const length = control.getUint32(at, true);
      if (length < 16) return;
      if (control.getInt32(at + 8, true) === SOL_SOCKET) {
        const type = control.getInt32(at + 12, true);
        if (type === SO_TIMESTAMPNS) {
          this.stamp[0] = control.getUint32(at + 16, true) + control.getUint32(at + 20, true) * 0x100000000;
          this.stamp[1] = control.getUint32(at + 24, true);
        } else if (type === SO_RXQ_OVFL) {
          // The kernel counts modulo 2^32 since the socket was opened.
          const more = (control.getUint32(at + 16, true) - this.dropped) >>> 0;
          this.dropped += more;
          this.notes.dropped += more;
        }
      }
      at += (length + 7) & ~7;
    }
  }

  private enter(state: number): void {
    if (state === this.interfaceState) return;
    this.interfaceState = state;
    this.notes.interface(state);
  }

  /** The interface's state now; binds to one of the name that is another than before. */
  private lookAtInterface(): number {
    const index = this.ask(SIOCGIFINDEX);
    if (index < 0) return interfaceStates.gone;
    if (index !== this.index || this.interfaceState === interfaceStates.gone) {
      this.index = index;
      if (!this.applyFilters() || !this.bind()) return interfaceStates.gone;
    }
    const flags = this.ask(SIOCGIFFLAGS);
    if (flags < 0) return interfaceStates.gone;
    return (flags & IFF_UP) !== 0 ? interfaceStates.up : interfaceStates.down;
  }

  /** What the kernel says of the interface by name: 16 bytes of name, then the answer. -1: there is none. */
  private ask(command: number): number {
    this.request.fill(0);
    for (let i = 0; i < this.nameBytes.length; i += 1) this.request[i] = this.nameBytes[i];
    if (this.c.ioctl(this.descriptor, command, this.request) < 0) return -1;
    return command === SIOCGIFFLAGS ? this.requestWords[4] & 0xffff : this.requestWords[4];
  }

  /** The kernel forgets a socket's filters when its interface is deleted. */
  private applyFilters(): boolean {
    const { filters } = this;
    return this.c.setsockopt(this.descriptor, SOL_CAN_RAW, CAN_RAW_FILTER, filters, filters.byteLength) === 0;
  }

  private bind(): boolean {
    const { address } = this;
    address.fill(0);
    address[0] = AF_CAN;
    address[4] = this.index;
    address[5] = this.index >>> 8;
    address[6] = this.index >>> 16;
    address[7] = this.index >>> 24;
    return this.c.bind(this.descriptor, address, ADDRESS_BYTES) === 0;
  }

  private configure(): void {
    const { options } = this;
    const on = Int32Array.of(1);
    if (!this.applyFilters()) throw this.failure('setting the filters (at most 512)');
    this.set(
      SOL_CAN_RAW,
      CAN_RAW_ERR_FILTER,
      Int32Array.of(options.errors === false ? 0 : 0x1fffffff),
      'asking for error frames',
    );
    if (options.ownFrames) this.set(SOL_CAN_RAW, CAN_RAW_RECV_OWN_MSGS, on, 'asking for own frames');
    if (options.flexibleDataRate) this.set(SOL_CAN_RAW, CAN_RAW_FD_FRAMES, on, 'asking for CAN FD frames');
    this.set(SOL_SOCKET, SO_TIMESTAMPNS, on, 'asking for receive stamps');
    this.set(SOL_SOCKET, SO_RXQ_OVFL, on, 'asking for the count of dropped frames');
    const size = Int32Array.of(options.receiveBuffer ?? 4 << 20);
    if (this.c.setsockopt(this.descriptor, SOL_SOCKET, SO_RCVBUFFORCE, size, 4) < 0)
      this.set(SOL_SOCKET, SO_RCVBUF, size, 'sizing the receive buffer');
  }

  private prepareMessage(): void {
    const words = new BigUint64Array(this.message.buffer);
    this.vector[0] = BigInt(this.c.addressOf(this.frame));
    this.vector[1] = BigInt(frameSizes.flexible);
    words[2] = BigInt(this.c.addressOf(this.vector));
    words[3] = 1n;
    words[4] = BigInt(this.c.addressOf(this.control));
    words[5] = BigInt(CONTROL_BYTES);
  }

  private readReceiveBuffer(): number {
    const out = new Int32Array(1);
    this.c.getsockopt(this.descriptor, SOL_SOCKET, SO_RCVBUF, out, Int32Array.of(4));
    return out[0]!;
  }

  private set(level: number, name: number, value: Int32Array, what: string): void {
    if (this.c.setsockopt(this.descriptor, level, name, value, value.byteLength) < 0) throw this.failure(what);
  }

  private failure(what: string): CanError {
    const code = errnoName(this.c.errno());
    const remedy = remedies[code];
    return new CanError(code, `${what} failed: ${code}${remedy === undefined ? '' : `; ${remedy}`}`);
  }
}

const remedies: Record<string, string> = {
  EAFNOSUPPORT:
    'this kernel has no CAN: load it with `modprobe can_raw vcan`, or use a link of kind can-multicast, which needs none',
  EPROTONOSUPPORT: 'this kernel has CAN but no raw sockets: `modprobe can_raw`',
  ENODEV:
    'no interface of this name: see `ip link`; a virtual one is made by `ip link add dev vcan0 type vcan && ip link set vcan0 up`',
  EPERM: 'this user may not open CAN sockets here',
  EMFILE: 'too many open files: raise `ulimit -n`',
};
