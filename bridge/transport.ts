/**
 * What a link moves datagrams with. The exchange knows nothing of sockets: a socket by FFI, a ring in memory, or the
 * inputs of a recording all fit behind these two calls. Neither call may wait, and neither may allocate.
 */
export interface Transport {
  /**
   * Takes the next waiting datagram into `into`; its length in bytes (0 for an empty one), or -1 when none waits.
   * A datagram longer than `into` is cut to it; the length returned may then be that of `into` or the whole length.
   */
  poll(into: Uint8Array): number;
  /** Sends the first `length` bytes; `length` when accepted, a negative number when not (the datagram is then gone). */
  send(bytes: Uint8Array, length: number): number;
}

/** A transport on which lockstep can wait for the next datagram. Never used in a live run. */
export interface WaitingTransport extends Transport {
  /** Waits until a datagram can be polled, at most `milliseconds`; false when none came. */
  wait(milliseconds: number): boolean;
}

/** A link that nobody is on: nothing comes, and what is sent is accepted and forgotten. */
export const noTransport: WaitingTransport = {
  poll: () => -1,
  send: (_bytes, length) => length,
  wait: () => false,
};
