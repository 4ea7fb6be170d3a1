import type { Assembly } from '../../configs/assemble.js';
import { createHandRing, HandRing, HandRingWriter } from '../../runtime/hand-ring.js';
import { HAND, type HandMessage } from '../../runtime/hand-wire.js';

/** Ticks at the start of a dry run in which hands are rehearsed, and ticks between two of them. */
const rehearsed = 900;
const between = 3;

/**
 * Hands for a dry run, one of each kind again and again, so that the first real one meets code that has run before. What
 * they leave behind is thrown away with the rest of the dry run. To be called before each tick.
 */
export function rehearseHands(assembly: Assembly): (tick: number) => void {
  const ring = createHandRing();
  const writer = new HandRingWriter(ring);
  assembly.hands.source = new HandRing(ring);
  const hands = messages(assembly);
  let next = 0;
  return (tick) => {
    const at = tick - assembly.firstTick;
    if (at >= rehearsed || at % between !== 0) return;
    writer.put(hands[next]!);
    next = (next + 1) % hands.length;
  };
}

function messages({ handTargets, block }: Assembly): HandMessage[] {
  const text = { who: 'dry run', address: '', said: '' };
  const plain = { request: 0, deadMan: 0, value: 0, text };
  const command = handTargets.findIndex((target) => target.slot >= 0);
  const signal = handTargets.findIndex((target) => target.signal >= 0);
  const hands: HandMessage[] = [];
  for (const target of [command, signal]) {
    if (target < 0) continue;
    const { slot } = handTargets[target]!;
    const set = { ...plain, kind: HAND.set, target, value: slot < 0 ? 0.5 : block[slot]! };
    hands.push(
      set,
      set,
      { ...plain, kind: HAND.release, target },
      { ...plain, kind: HAND.release, target },
      { ...set, deadMan: 2 },
    );
  }
  const on = (kind: number, target: number) => hands.push({ ...plain, kind, target });
  on(HAND.scenario, 1);
  on(HAND.scenario, 2);
  on(HAND.scenario, 2);
  on(HAND.acknowledge, 0);
  on(HAND.acknowledge, 100_000);
  on(HAND.note, 0);
  on(0, 0);
  on(HAND.set, -1);
  return hands;
}
