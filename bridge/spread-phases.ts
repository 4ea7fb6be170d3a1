import { frameTime } from './frame-bits.js';
import type { LinkSpec, MessageSpec } from './message-map.js';
import { goesByCycle } from './schedule.js';

/** Ticks that are looked at; where the cycles repeat later than this the rest is left to chance. */
const longestPattern = 20_000;
/** Bit rate where the link says none: only the proportions count. */
const usualRate = 500e3;

/**
 * Phases for the messages that the bench sends by cycle on one CAN link and that have none of their own, so that few fall
 * due in the same tick: one after the other, the fast ones first, each to where the bus then has least to do in a tick.
 * Messages with a phase of their own (`fixed`) stay. Those received are returned as they are.
 */
export function spreadPhases(
  messages: readonly MessageSpec[],
  link: LinkSpec,
  fixed: (message: MessageSpec) => boolean,
): MessageSpec[] {
  const own = messages.filter(
    (message) => message.link === link.name && message.direction === 'sent' && goesByCycle(message),
  );
  const cost = (message: MessageSpec): number => frameTime(message, { ...link, bitRate: link.bitRate ?? usualRate })!;
  const load = new Float64Array(patternLength(own));
  const place = (message: MessageSpec, phase: number): void => {
    for (let tick = phase; tick < load.length; tick += message.every) load[tick] += cost(message);
  };
  for (const message of own) if (fixed(message)) place(message, message.phase);
  const phases = new Map<MessageSpec, number>();
  for (const message of own.filter((one) => !fixed(one)).sort((a, b) => a.every - b.every)) {
    const phase = quietest(load, message.every);
    phases.set(message, phase);
    place(message, phase);
  }
  return messages.map((message) => {
    const phase = phases.get(message);
    return phase === undefined ? message : { ...message, phase };
  });
}

/** The phase whose busiest tick is the least busy, then the one with the least in all, then the first. */
function quietest(load: Float64Array, every: number): number {
  let best = 0;
  let bestPeak = Infinity;
  let bestSum = Infinity;
  for (let phase = 0; phase < every; phase += 1) {
    let peak = 0;
    let sum = 0;
    for (let tick = phase; tick < load.length; tick += every) {
      if (load[tick] > peak) peak = load[tick];
      sum += load[tick];
    }
    if (peak > bestPeak || (peak === bestPeak && sum >= bestSum)) continue;
    best = phase;
    bestPeak = peak;
    bestSum = sum;
  }
  return best;
}

/** Ticks after which the cycles repeat, at most `longestPattern`, at least the longest cycle. */
export function patternLength(messages: readonly MessageSpec[]): number {
  let length = 1;
  for (const { every } of messages) {
    if (every <= 0) continue;
    length = (length / greatestDivisor(length, every)) * every;
    if (length > longestPattern) return Math.max(longestPattern, ...messages.map((message) => message.every));
  }
  return length;
}

function greatestDivisor(a: number, b: number): number {
  return b === 0 ? a : greatestDivisor(b, a % b);
}
