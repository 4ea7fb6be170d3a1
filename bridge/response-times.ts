/** A stream of frames on one bus. Times in s. */
export interface FrameStream {
  /** Smaller goes first (`arbitrationKey`). */
  readonly priority: number;
  /** Least distance of two frames. */
  readonly period: number;
  /** Time of a frame on the bus at worst. */
  readonly time: number;
  /** How late a frame may be queued after it fell due. */
  readonly jitter: number;
}

export interface ResponseTime {
  /** From falling due to the first bit on the bus at worst; Infinity when the bus cannot carry what goes first. */
  readonly queueing: number;
  /** From falling due to the last bit at worst. */
  readonly response: number;
}

/** Frames of one message that are looked at; a bus busy for longer counts as overloaded. */
const mostInstances = 10_000;

/** Place in the arbitration: base identifier, then 11 bits before 29 (their RTR is dominant against SRR), then the rest. */
export function arbitrationKey(identifier: number, extended: boolean): number {
  return extended ? (identifier >>> 18) * 2 ** 19 + 2 ** 18 + (identifier & 0x3ffff) : identifier * 2 ** 19;
}

/**
 * Worst-case response times of all streams of one bus: fixed priority, not pre-emptive, every instance in the busy period
 * looked at, after Davis, Burns, Bril, Lukkien, "Controller Area Network (CAN) schedulability analysis: refuted,
 * revisited and revised", Real-Time Systems 35 (2007) 239, section 3.2. `bit` is the time of one bit in the arbitration.
 *
 * What it takes for granted: every node sends the most urgent of its waiting frames first, and no frame is disturbed.
 */
export function responseTimes(streams: readonly FrameStream[], bit: number): ResponseTime[] {
  return streams.map((stream) => responseTime(stream, streams, bit));
}

function responseTime(own: FrameStream, streams: readonly FrameStream[], bit: number): ResponseTime {
  const never = { queueing: Infinity, response: Infinity };
  const higher = streams.filter((other) => other !== own && other.priority <= own.priority);
  const blocking = Math.max(0, ...streams.filter((other) => other.priority > own.priority).map((other) => other.time));
  if ([own, ...higher].reduce((load, stream) => load + stream.time / stream.period, 0) >= 1) return never;
  const inWindow = (stream: FrameStream, window: number): number =>
    Math.ceil(exact((window + stream.jitter) / stream.period));
  const busy = settle(own.time, (length) =>
    [own, ...higher].reduce((sum, stream) => sum + inWindow(stream, length) * stream.time, blocking),
  );
  const instances = inWindow(own, busy);
  if (!(instances <= mostInstances)) return never;
  let queueing = 0;
  let before = 0;
  for (let q = 0; q < instances; q += 1) {
    const waits = settle(Math.max(before, blocking + q * own.time), (window) =>
      higher.reduce((sum, stream) => sum + inWindow(stream, window + bit) * stream.time, blocking + q * own.time),
    );
    before = waits;
    queueing = Math.max(queueing, own.jitter + waits - q * own.period);
  }
  return { queueing, response: queueing + own.time };
}

/** A quotient of times without the rounding that would count one frame more at an exact multiple. */
function exact(quotient: number): number {
  const whole = Math.round(quotient);
  return Math.abs(quotient - whole) < 1e-9 * Math.max(1, whole) ? whole : quotient;
}

/** The least fixed point of a growing step function, from below; the load is below 1, so there is one. */
function settle(from: number, next: (value: number) => number): number {
  let value = from;
  for (let i = 0; i < 1_000_000; i += 1) {
    const following = next(value);
    if (following <= value * (1 + 1e-12)) return following;
    value = following;
  }
  return Infinity;
}
