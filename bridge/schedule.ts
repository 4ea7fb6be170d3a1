import type { MessageSpec } from './message-map.js';

/**
 * When a cyclic message is due: in the ticks t with t mod every = phase, from the start delay on. Phases thus hold
 * against the tick number itself, so that two messages keep their distance whatever their start delays are; a start
 * delay only silences the beginning. Ticks before tick 0 (the pre-roll) count alike.
 */
export function dueByCycle(tick: number, firstTick: number, every: number, phase: number, startDelay: number): boolean {
  if (every <= 0 || tick - firstTick < startDelay) return false;
  const past = (tick - phase) % every;
  return past === 0;
}

/** Whether a message goes by its cycle, and whether it goes when a value moves. One on request does neither. */
export function goesByCycle({ trigger }: Pick<MessageSpec, 'trigger'>): boolean {
  return trigger === 'cyclic' || trigger === 'cyclic-and-change';
}
export function goesByChange({ trigger }: Pick<MessageSpec, 'trigger'>): boolean {
  return trigger === 'on-change' || trigger === 'cyclic-and-change';
}

/** The least distance, in ticks, of two sends of a message that goes out because its values changed. */
export function changeDistance(message: MessageSpec): number {
  return Math.max(1, message.fastEvery ?? 1);
}
