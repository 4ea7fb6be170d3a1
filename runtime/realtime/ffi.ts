import { createRequire } from 'node:module';
import os from 'node:os';

/**
 * The C library by FFI, loaded when first asked for. Arguments are numbers and typed arrays only: struct objects cost
 * six times as much and allocate. Every function returns what the C function returns (-1 on failure unless said
 * otherwise); `errno()` is then the reason. Linux on 64-bit little-endian machines only.
 */
export interface LibC {
  /** `out`: timespec as four 32-bit words [seconds, 0, nanoseconds, 0]. */
  clock_gettime(clock: number, out: Int32Array): number;
  /** Returns the error number itself, 0 when it slept to the end. */
  clock_nanosleep(clock: number, flags: number, request: Int32Array, remain: null): number;
  sched_setscheduler(pid: number, policy: number, parameter: Int32Array): number;
  sched_getscheduler(pid: number): number;
  sched_getparam(pid: number, parameter: Int32Array): number;
  sched_setaffinity(pid: number, bytes: number, mask: Uint8Array): number;
  sched_getaffinity(pid: number, bytes: number, mask: Uint8Array): number;
  sched_getcpu(): number;
  prctl(option: number, a: number, b: number, c: number, d: number): number;
  /** `address` as a number: user space ends below 2^53. */
  mlock(address: number, bytes: number): number;
  munlockall(): number;
  /** Address of a view's memory. Allocates. */
  addressOf(view: ArrayBufferView): number;
  socket(family: number, type: number, protocol: number): number;
  bind(socket: number, address: Uint8Array, length: number): number;
  getsockname(socket: number, address: Uint8Array, length: Int32Array): number;
  setsockopt(socket: number, level: number, name: number, value: Uint8Array | Int32Array, length: number): number;
  getsockopt(socket: number, level: number, name: number, value: Int32Array, length: Int32Array): number;
  recvfrom(
    socket: number,
    into: Uint8Array,
    length: number,
    flags: number,
    from: Uint8Array,
    fromLength: Int32Array,
  ): number;
  sendto(socket: number, bytes: Uint8Array, length: number, flags: number, to: Uint8Array, toLength: number): number;
  send(socket: number, bytes: Uint8Array, length: number, flags: number): number;
  /** `message`: struct msghdr, 56 bytes, with addresses from `addressOf`. */
  recvmsg(socket: number, message: Uint8Array, flags: number): number;
  /** `request`: struct ifreq, 40 bytes. */
  ioctl(socket: number, command: number, request: Uint8Array): number;
  /** `sets`: pollfd as [socket, events | result << 16]. */
  poll(sets: Int32Array, count: number, milliseconds: number): number;
  close(socket: number): number;
  errno(): number;
}

export class RealtimeUnavailable extends Error {
  override readonly name = 'RealtimeUnavailable';
}

const ARCHITECTURES = ['x64', 'arm64', 'riscv64', 'loong64'];

/** Why this machine cannot run live, or '' when it can. */
export function whyNotLive(): string {
  if (process.platform !== 'linux') return `live runs need Linux (this is ${process.platform}); use --pace fast here`;
  if (!ARCHITECTURES.includes(process.arch)) {
    return `live runs need one of ${ARCHITECTURES.join(', ')} (this is ${process.arch}); use --pace fast here`;
  }
  try {
    libc();
    return '';
  } catch (error) {
    return (error as Error).message;
  }
}

const SIGNATURES: Record<Exclude<keyof LibC, 'errno' | 'addressOf'>, [string, string[]]> = {
  clock_gettime: ['int', ['int', 'void *']],
  clock_nanosleep: ['int', ['int', 'int', 'void *', 'void *']],
  sched_setscheduler: ['int', ['int', 'int', 'void *']],
  sched_getscheduler: ['int', ['int']],
  sched_getparam: ['int', ['int', 'void *']],
  sched_setaffinity: ['int', ['int', 'size_t', 'void *']],
  sched_getaffinity: ['int', ['int', 'size_t', 'void *']],
  sched_getcpu: ['int', []],
  prctl: ['int', ['int', 'ulong', 'ulong', 'ulong', 'ulong']],
  mlock: ['int', ['size_t', 'size_t']],
  munlockall: ['int', []],
  socket: ['int', ['int', 'int', 'int']],
  bind: ['int', ['int', 'void *', 'uint32_t']],
  getsockname: ['int', ['int', 'void *', 'void *']],
  setsockopt: ['int', ['int', 'int', 'int', 'void *', 'uint32_t']],
  getsockopt: ['int', ['int', 'int', 'int', 'void *', 'void *']],
  recvfrom: ['int', ['int', 'void *', 'size_t', 'int', 'void *', 'void *']],
  sendto: ['int', ['int', 'void *', 'size_t', 'int', 'void *', 'uint32_t']],
  send: ['int', ['int', 'void *', 'size_t', 'int']],
  recvmsg: ['int', ['int', 'void *', 'int']],
  ioctl: ['int', ['int', 'ulong', 'void *']],
  poll: ['int', ['void *', 'ulong', 'int']],
  close: ['int', ['int']],
};

let loaded: LibC | undefined;

/** The C library. Throws `RealtimeUnavailable` where there is no Linux or no FFI, saying what works instead. */
export function libc(): LibC {
  if (loaded !== undefined) return loaded;
  if (process.platform !== 'linux' || !ARCHITECTURES.includes(process.arch) || os.endianness() !== 'LE') {
    throw new RealtimeUnavailable(
      `live runs need Linux on ${ARCHITECTURES.join(', ')} (this is ${process.platform} on ${process.arch}); use --pace fast here`,
    );
  }
  try {
    const koffi = createRequire(import.meta.url)('koffi') as typeof import('koffi');
    const library = koffi.load(null);
    const bound: Record<string, unknown> = {
      errno: () => koffi.errno(),
      addressOf: (view: ArrayBufferView) => Number(koffi.address(view)),
    };
    for (const [name, [result, parameters]] of Object.entries(SIGNATURES))
      bound[name] = library.func(name, result, parameters);
    loaded = bound as unknown as LibC;
    return loaded;
  } catch (error) {
    throw new RealtimeUnavailable(
      `the package koffi (calls into the C library) does not load: ${(error as Error).message}; reinstall with npm ci, or use --pace fast`,
    );
  }
}

const nameByNumber = new Map<number, string>();
for (const [name, number] of Object.entries(os.constants.errno))
  if (!nameByNumber.has(number)) nameByNumber.set(number, name);

/** `EADDRINUSE` for 98 and so on; `errno 1234` for a number without a name here. */
export function errnoName(number: number): string {
  return nameByNumber.get(number) ?? `errno ${number}`;
}

export const errnoOf = os.constants.errno;
