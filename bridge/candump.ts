import {
  frameFlags,
  frameSizes,
  identifierFlags,
  identifierMasks,
  identifierWord,
  payloadAt,
  writeFrameHead,
} from './can-frame.js';

/**
 * The log format of can-utils (`candump -L`, read by canplayer): one frame a line,
 * `(seconds.microseconds) interface identifier#payload`; `##` and a hexadecimal digit of flags for CAN FD, `#R` for a
 * remote request with its length where it is not 0. Identifiers of 29 bits have eight digits, error frames too, with bit
 * 29 in them.
 */
export interface LoggedFrame {
  /** Seconds since 1970. */
  readonly time: number;
  readonly interface: string;
  /** 16 or 72 bytes. */
  readonly frame: Uint8Array;
}

/** One line, without its end. `seconds` and `nanoseconds` since 1970. */
export function candumpLine(
  frame: Uint8Array,
  size: number,
  interfaceName: string,
  seconds: number,
  nanoseconds: number,
): string {
  const word = identifierWord(frame);
  const error = (word & identifierFlags.error) !== 0;
  const long = error || (word & identifierFlags.extended) !== 0;
  const number = (word & identifierMasks.extended) | (error ? identifierFlags.error : 0);
  const identifier = number
    .toString(16)
    .toUpperCase()
    .padStart(long ? 8 : 3, '0');
  const stamp = `(${seconds.toFixed(0).padStart(10, '0')}.${Math.floor(nanoseconds / 1000)
    .toString()
    .padStart(6, '0')})`;
  const payload = (length: number): string =>
    Buffer.from(frame.subarray(payloadAt, payloadAt + length))
      .toString('hex')
      .toUpperCase();
  const length = Math.min(frame[4]!, size - payloadAt);
  let body: string;
  if (size === frameSizes.flexible) body = `##${(frame[5]! & 0xf).toString(16).toUpperCase()}${payload(length)}`;
  else if ((word & identifierFlags.remote) !== 0) body = `#R${length > 0 ? length.toString(16).toUpperCase() : ''}`;
  else body = `#${payload(length)}`;
  return `${stamp} ${interfaceName} ${identifier}${body}`;
}

const line =
  /^\((\d+(?:\.\d+)?)\)\s+(\S+)\s+([0-9A-Fa-f]{3}|[0-9A-Fa-f]{8})#(R[0-8]?|#[0-9A-Fa-f](?:[0-9A-Fa-f]{2})*|(?:[0-9A-Fa-f]{2}){0,8})(?:\s+[TR])?\s*$/;

/** Reads one line; undefined when it is not of this format. */
export function parseCandumpLine(text: string): LoggedFrame | undefined {
  const match = line.exec(text);
  if (!match) return undefined;
  const [, stamp, name, digits, body] = match as unknown as [string, string, string, string, string];
  const value = Number.parseInt(digits, 16);
  const error = digits.length === 8 && (value & identifierFlags.error) !== 0;
  if (
    digits.length === 3
      ? value > identifierMasks.standard
      : (value & ~identifierFlags.error) > identifierMasks.extended || value > 0x3fffffff
  )
    return undefined;
  const flexible = body.startsWith('#');
  const remote = body.startsWith('R');
  const payload = flexible ? body.slice(2) : remote ? '' : body;
  const length = remote ? Number.parseInt(body.slice(1) || '0', 16) : payload.length / 2;
  if (length > (flexible ? 64 : 8)) return undefined;
  const frame = new Uint8Array(flexible ? frameSizes.flexible : frameSizes.classic);
  const word =
    (value & identifierMasks.extended) |
    (error ? identifierFlags.error : digits.length === 8 ? identifierFlags.extended : 0) |
    (remote ? identifierFlags.remote : 0);
  writeFrameHead(frame, word, length, flexible ? Number.parseInt(body[1]!, 16) | frameFlags.flexible : 0);
  frame.set(Buffer.from(payload, 'hex'), payloadAt);
  return { time: Number(stamp), interface: name, frame };
}

export interface CandumpLog {
  readonly frames: readonly LoggedFrame[];
  /** Lines that are not of the format, by number from 1. */
  readonly unread: readonly number[];
}

/** Reads a whole log. Empty lines are passed over. */
export function parseCandump(text: string): CandumpLog {
  const frames: LoggedFrame[] = [];
  const unread: number[] = [];
  text.split('\n').forEach((one, i) => {
    if (one.trim() === '') return;
    const frame = parseCandumpLine(one.trim());
    if (frame) frames.push(frame);
    else unread.push(i + 1);
  });
  return { frames, unread };
}
