import type { LinkSpec, MessageSpec } from './message-map.js';

/**
 * Length of a CAN frame on the wire at worst, with the most stuff bits and the three bits of intermission behind it, in
 * bits that go at the nominal and at the data bit rate (ISO 11898-1).
 *
 * Classic: 34 (11 bit identifier) or 54 (29 bit) bits and the payload are stuffed, after the first bit one stuff bit in
 * four at most; 13 more are not (Davis, Burns, Bril, Lukkien, Real-Time Systems 35 (2007) 239, equation 1).
 *
 * FD: stuffed up to the last bit of the payload; then stuff count (4) and CRC of 17 bits (to 16 bytes) or 21 bits with 6 or
 * 7 fixed stuff bits. With a bit-rate switch everything between the bits BRS and CRC delimiter goes at the data bit rate;
 * stuff bits that can fall ahead of BRS count there, where they cost most.
 */
export interface FrameBits {
  readonly nominal: number;
  readonly data: number;
}

/** CRC delimiter, acknowledgement slot and delimiter, 7 bits end of frame, 3 bits intermission. */
const tail = 13;

export function frameBits(
  bytes: number,
  kind: { readonly extended?: boolean; readonly flexible?: boolean; readonly bitRateSwitch?: boolean } = {},
): FrameBits {
  const payload = 8 * bytes;
  if (!kind.flexible) {
    const stuffed = (kind.extended ? 54 : 34) + payload;
    return { nominal: stuffed + Math.floor((stuffed - 1) / 4) + tail, data: 0 };
  }
  // SOF, identifier, RRS, IDE, FDF, res, BRS (with SRR where the identifier is long); then ESI and DLC.
  const ahead = kind.extended ? 36 : 17;
  const inside = 5 + payload;
  const stuff = Math.floor((ahead + inside - 1) / 4);
  const stuffAhead = Math.floor((ahead - 1) / 4);
  const check = bytes <= 16 ? 4 + 17 + 6 : 4 + 21 + 7;
  const nominal = ahead + stuffAhead + tail;
  const data = inside + (stuff - stuffAhead) + check;
  return kind.bitRateSwitch ? { nominal, data } : { nominal: nominal + data, data: 0 };
}

/** Time of a message's frame on the bus at worst, s. Undefined where the link says no bit rate. */
export function frameTime(message: MessageSpec, link: LinkSpec): number | undefined {
  const { bitRate } = link;
  if (bitRate === undefined) return undefined;
  const bits = frameBits(message.bytes ?? 8, {
    extended: message.extended === true,
    flexible: message.flexibleDataRate === true,
    bitRateSwitch: message.bitRateSwitch === true,
  });
  return bits.nominal / bitRate + bits.data / (link.dataBitRate ?? bitRate);
}
