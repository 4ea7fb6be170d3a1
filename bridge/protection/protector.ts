/**
 * Counter and checksum inside the payload of one message. Made once; no call allocates. What is remembered (the counter
 * sent last, the one received last) stands with the message and is passed in.
 */
export interface Protector {
  /** Number of values of the counter, which counts 0 .. modulo - 1; 0: there is no counter. */
  readonly modulo: number;
  /** Greatest step of the counter that is a gap and not a message out of order. */
  readonly mostStep: number;
  /** Writes counter and checksum into the payload, over what stands in their bits. */
  protect(payload: Uint8Array, length: number, counter: number): void;
  /** The counter of a payload whose checksum is right (0 without a counter), or -1 when it is wrong. */
  check(payload: Uint8Array, length: number): number;
}

export const wrongCheck = -1;
