import { frameTime } from './frame-bits.js';
import type { LinkSpec, MessageMap, MessageSpec } from './message-map.js';
import { arbitrationKey, type FrameStream, responseTimes } from './response-times.js';
import { changeDistance, goesByChange, goesByCycle } from './schedule.js';
import { patternLength } from './spread-phases.js';

/** What a CAN bus has to carry at worst. Times in s. */
export interface BusLoad {
  readonly link: string;
  readonly bitRate: number;
  readonly dataBitRate: number | undefined;
  /** Share of the time in which the bus is busy, every frame at its longest and as often as it may come. */
  readonly load: number;
  readonly messages: readonly MessageLoad[];
  /** The tick in which the bench sends most, of those that repeat. */
  readonly burst: Burst;
}

export interface MessageLoad {
  readonly name: string;
  readonly identifier: number;
  readonly extended: boolean;
  readonly direction: 'sent' | 'received';
  /** Least time between two frames. */
  readonly period: number;
  readonly time: number;
  readonly queueing: number;
  readonly response: number;
}

export interface Burst {
  readonly tick: number;
  readonly messages: readonly string[];
  /** Time that they take on the bus, one after the other. */
  readonly time: number;
}

interface Stream extends FrameStream {
  readonly message: MessageSpec;
}

/** Load and worst waiting times of one CAN link; undefined where it says no bit rate. `step`: length of a tick, s. */
export function busLoad(map: MessageMap, link: LinkSpec, step: number): BusLoad | undefined {
  const { bitRate } = link;
  if (link.kind === 'udp' || bitRate === undefined) return undefined;
  const own = map.messages.filter((message) => message.link === link.name);
  const streams = own.flatMap((message) => streamsOf(message, link, step));
  const times = responseTimes(streams, 1 / bitRate);
  const messages = own
    .map((message) => {
      const places = streams.flatMap((stream, i) => (stream.message === message ? [i] : []));
      return {
        name: message.name,
        identifier: message.identifier,
        extended: message.extended === true,
        direction: message.direction,
        period: Math.min(...places.map((i) => streams[i].period)),
        time: frameTime(message, link)!,
        queueing: Math.max(...places.map((i) => times[i].queueing)),
        response: Math.max(...places.map((i) => times[i].response)),
      };
    })
    .sort((a, b) => arbitrationKey(a.identifier, a.extended) - arbitrationKey(b.identifier, b.extended));
  return {
    link: link.name,
    bitRate,
    dataBitRate: link.dataBitRate,
    load: streams.reduce((sum, stream) => sum + stream.time / stream.period, 0),
    messages,
    burst: worstBurst(own, link),
  };
}

/** The frames of a message: those of its cycle, and those that go because a value moved. */
function streamsOf(message: MessageSpec, link: LinkSpec, step: number): Stream[] {
  const stream = (ticks: number): Stream => ({
    message,
    priority: arbitrationKey(message.identifier, message.extended === true),
    period: ticks * step,
    time: frameTime(message, link)!,
    jitter: 0,
  });
  return [
    ...(goesByCycle(message) ? [stream(message.every)] : []),
    ...(goesByChange(message) ? [stream(changeDistance(message))] : []),
  ];
}

function worstBurst(messages: readonly MessageSpec[], link: LinkSpec): Burst {
  const sent = messages.filter((message) => message.direction === 'sent' && goesByCycle(message));
  const load = new Float64Array(patternLength(sent));
  for (const message of sent)
    for (let tick = message.phase; tick < load.length; tick += message.every) load[tick] += frameTime(message, link)!;
  let tick = 0;
  for (let i = 1; i < load.length; i += 1) if (load[i] > load[tick]) tick = i;
  return {
    tick,
    messages: sent
      .filter((message) => tick % message.every === message.phase % message.every)
      .map((message) => message.name),
    time: load[tick],
  };
}

/** What is worth a warning about a bus, in words; the first of `overloaded` makes a bench unfit. */
export function busRemarks(
  { load, messages, burst }: BusLoad,
  map: MessageMap,
  step: number,
): { overloaded: string[]; warnings: string[] } {
  const ms = (time: number): string => `${Number((time * 1e3).toPrecision(4))} ms`;
  if (load >= 1)
    return {
      overloaded: [
        `its messages need ${(load * 100).toFixed(0)} % of the bus: give it a higher bit rate, or longer cycles`,
      ],
      warnings: [],
    };
  const warnings: string[] = [];
  if (burst.time > step)
    warnings.push(
      `burst: in tick ${burst.tick} and its like the bench sends ${burst.messages.join(', ')}, ${ms(burst.time)} on the bus, longer than the tick of ${ms(step)}: leave their phases away to have them spread`,
    );
  for (const { name, period, response } of messages) {
    const { timeout } = map.messages.find((message) => message.name === name)!;
    if (timeout > 0 && response + period > timeout * step)
      warnings.push(
        `${name} may be ${ms(response)} on its way and comes every ${ms(period)}: a time-out of ${ms(timeout * step)} may strike without a fault`,
      );
    else if (response > period)
      warnings.push(`${name} may still wait after ${ms(response)}, when the next is due after ${ms(period)}`);
  }
  return { overloaded: [], warnings };
}
