/**
 * A CAN frame as bytes: `struct can_frame` (16 bytes) and `struct canfd_frame` (72 bytes) of linux/can.h, little-endian.
 * The length tells the two apart, as on a socket.
 *
 * | offset | type | what                                                                                       |
 * |-------:|------|----------------------------------------------------------------------------------------------|
 * |      0 | u32  | identifier, with bit 31 extended (29 bit), bit 30 remote request, bit 29 error frame           |
 * |      4 | u8   | payload length, bytes                                                                          |
 * |      5 | u8   | FD only: bit 0 bit-rate switch, bit 1 error state indicator, bit 2 FD                          |
 * |      6 | u16  | reserved                                                                                       |
 * |      8 | u8[] | payload: 8 or 64 bytes                                                                         |
 */
export const frameSizes = { classic: 16, flexible: 72 } as const;

/** Offset of the payload. */
export const payloadAt = 8;

/** Bits of the identifier word, as signed 32-bit numbers (small integers to the engine). */
export const identifierFlags = { extended: 0x80000000 | 0, remote: 0x40000000, error: 0x20000000 } as const;
export const identifierMasks = { standard: 0x7ff, extended: 0x1fffffff } as const;

export const frameFlags = { bitRateSwitch: 1, errorState: 2, flexible: 4 } as const;

/** Payload lengths that a CAN FD frame can have, bytes (ISO 11898-1). */
export const flexibleLengths: readonly number[] = [0, 1, 2, 3, 4, 5, 6, 7, 8, 12, 16, 20, 24, 32, 48, 64];

/** The identifier word of a frame: identifier and flags, signed. */
export function identifierWord(frame: Uint8Array): number {
  return frame[0] | (frame[1] << 8) | (frame[2] << 16) | (frame[3] << 24);
}

/** Writes the eight bytes ahead of the payload. `word`: identifier with its flags. */
export function writeFrameHead(frame: Uint8Array, word: number, length: number, flags: number): void {
  frame[0] = word;
  frame[1] = word >>> 8;
  frame[2] = word >>> 16;
  frame[3] = word >>> 24;
  frame[4] = length;
  frame[5] = flags;
  frame[6] = 0;
  frame[7] = 0;
}

/** Greatest payload of a frame of `size` bytes; -1 when no frame has this size. */
export function payloadRoom(size: number): number {
  return size === frameSizes.classic ? 8 : size === frameSizes.flexible ? 64 : -1;
}

/** A frame made by hand. Allocates: for tests, tools and set-up, not for a tick. */
export function makeFrame(
  identifier: number,
  payload: Uint8Array | readonly number[],
  kind: {
    readonly extended?: boolean;
    readonly remote?: boolean;
    readonly flexible?: boolean;
    readonly bitRateSwitch?: boolean;
  } = {},
): Uint8Array {
  const frame = new Uint8Array(kind.flexible ? frameSizes.flexible : frameSizes.classic);
  if (payload.length > frame.length - payloadAt)
    throw new RangeError(
      `a payload of ${payload.length} bytes: a ${kind.flexible ? 'CAN FD' : 'classic'} frame carries ${frame.length - payloadAt}`,
    );
  const word = identifier | (kind.extended ? identifierFlags.extended : 0) | (kind.remote ? identifierFlags.remote : 0);
  writeFrameHead(
    frame,
    word,
    payload.length,
    kind.flexible ? frameFlags.flexible | (kind.bitRateSwitch ? frameFlags.bitRateSwitch : 0) : 0,
  );
  frame.set(payload, payloadAt);
  return frame;
}
