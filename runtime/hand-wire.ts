/**
 * A hand as bytes: what the host puts into the ring, what the loop journals as an input before it acts, and what a run
 * derived again takes from the recording. Little endian:
 *
 *     0  u8   kind
 *     2  u16  bytes of text
 *     4  u32  request: a number by which the host knows the answer
 *     8  i32  target (set, release), action (scenario), number of the warning (acknowledge)
 *     12 i32  set: ticks after which the hand lets go unless it is renewed; 0: never
 *     16 f64  set: value, SI
 *     24      text, UTF-8: who, from where, why; a note's own text
 */
export const HAND = { set: 1, release: 2, scenario: 3, acknowledge: 4, note: 5 } as const;
export const scenarioActions = ['', 'hold', 'continue', 'end'] as const;
export const handBytes = { head: 24, most: 8192 } as const;

export interface HandMessage {
  readonly kind: number;
  readonly request: number;
  readonly target: number;
  readonly deadMan: number;
  readonly value: number;
  readonly text: HandText;
}
/** Who did it and what was said. Proves nothing: it is what the person typed. */
export interface HandText {
  readonly who: string;
  readonly address: string;
  readonly said: string;
}

/** Writes a hand into `into` at `at`; its length. Longer text than fits is cut. Host side: allocates. */
export function writeHand(hand: HandMessage, into: Uint8Array, at = 0): number {
  const text = Buffer.from([hand.text.who, hand.text.address, hand.text.said].map(plain).join('\n'), 'utf8');
  const length = Math.min(text.length, handBytes.most - handBytes.head);
  const view = new DataView(into.buffer, into.byteOffset + at, handBytes.head);
  view.setUint32(0, 0);
  view.setUint8(0, hand.kind);
  view.setUint16(2, length, true);
  view.setUint32(4, hand.request, true);
  view.setInt32(8, hand.target, true);
  view.setInt32(12, hand.deadMan, true);
  view.setFloat64(16, hand.value, true);
  into.set(text.subarray(0, length), at + handBytes.head);
  return handBytes.head + length;
}

/** Reads a hand; undefined when the bytes are none. Host side: allocates. */
export function readHand(bytes: Uint8Array): HandMessage | undefined {
  if (bytes.length < handBytes.head) return undefined;
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const length = view.getUint16(2, true);
  if (handBytes.head + length > bytes.length) return undefined;
  const text = Buffer.from(bytes.buffer, bytes.byteOffset + handBytes.head, length).toString('utf8');
  const [who = '', address = '', ...said] = text.split('\n');
  return {
    kind: view.getUint8(0),
    request: view.getUint32(4, true),
    target: view.getInt32(8, true),
    deadMan: view.getInt32(12, true),
    value: view.getFloat64(16, true),
    text: { who, address, said: said.join(' ') },
  };
}

/** One line: lines part the fields. */
function plain(text: string): string {
  return text.replace(/[\r\n]+/g, ' ');
}
