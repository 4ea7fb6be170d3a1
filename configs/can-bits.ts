import { bitsOf } from '../bridge/can-bits.js';
import type { CanLayout, MapSignal } from '../bridge/message-map.js';

export { bitsOf };

export interface BitClash {
  readonly signal: string;
  readonly what: string;
  readonly value: string;
  readonly bound: string;
  readonly remedy: string;
}

/** Signals that lie on one another's bits while both are present, and signals beyond the payload. */
export function overlappingBits(signals: readonly MapSignal[], bytes: number): BitClash[] {
  const clashes: BitClash[] = [];
  const placed: { readonly signal: MapSignal; readonly bits: ReadonlySet<number> }[] = [];
  const layouts = new Map(signals.flatMap(({ name, can }) => (can === undefined ? [] : [[name, can] as const])));
  const selectors = new Set(signals.filter((signal) => signal.can?.selector).map((signal) => signal.name));
  for (const signal of signals) {
    const layout = signal.can;
    if (!layout) continue;
    const bits = bitsOf(layout);
    const value = `bits ${Math.min(...bits)} to ${Math.max(...bits)}`;
    const beyond = bits.find((bit) => bit >= bytes * 8);
    if (beyond !== undefined) {
      clashes.push({
        signal: signal.name,
        what: 'signal beyond the payload',
        value,
        bound: `${bytes} bytes`,
        remedy: 'move it or make the message longer',
      });
    }
    if (layout.selectedBy && !selectors.has(layout.selectedBy.signal)) {
      clashes.push({
        signal: signal.name,
        what: 'selected by a signal that is no selector',
        value: layout.selectedBy.signal,
        bound: selectors.size === 0 ? 'no selector in this message' : `selectors ${[...selectors].join(', ')}`,
        remedy: 'mark the selector with selector: on',
      });
    }
    for (const other of placed) {
      const shared = bits.find((bit) => other.bits.has(bit));
      if (shared === undefined || !together(layout, other.signal.can!, layouts)) continue;
      clashes.push({
        signal: signal.name,
        what: `bits shared with ${other.signal.name}`,
        value,
        bound: `bit ${shared} is taken`,
        remedy: 'move one of the two',
      });
      break;
    }
    const short = beyondRange(signal, layout);
    if (short) clashes.push(short);
    placed.push({ signal, bits: new Set(bits) });
  }
  return clashes;
}

/** The range of a signal must be sayable in its bits. */
function beyondRange(signal: MapSignal, layout: CanLayout): BitClash | undefined {
  if (layout.float || !(layout.length <= 64)) return undefined;
  const least = layout.signed ? -(2 ** (layout.length - 1)) : 0;
  const most = layout.signed ? 2 ** (layout.length - 1) - 1 : 2 ** layout.length - 1;
  const raw = [signal.least, signal.most].map((value) => (value - layout.offset) / layout.scale);
  if (raw.every((value) => value > least - 0.5 && value < most + 0.5)) return undefined;
  const ends = [least, most].map((value) => value * layout.scale + layout.offset).sort((a, b) => a - b);
  return {
    signal: signal.name,
    what: `the range does not fit ${layout.length} bits`,
    value: `${signal.least} .. ${signal.most} ${signal.unit}`,
    bound: `${ends[0]} .. ${ends[1]} ${signal.unit}`,
    remedy: 'take more bits or another scale and offset',
  };
}

/** Whether two signals can be in the same frame: no selector above both of them lets in only one. */
function together(a: CanLayout, b: CanLayout, layouts: ReadonlyMap<string, CanLayout>): boolean {
  const above = conditionsOf(b, layouts);
  return conditionsOf(a, layouts).every((own) =>
    above.every(
      (other) =>
        own.signal !== other.signal ||
        own.values.some(([from, to]) => other.values.some(([least, most]) => from <= most && least <= to)),
    ),
  );
}

/** What has to hold for a signal to be there: its selector's values, those of the selector's selector, and so on. */
function conditionsOf(
  layout: CanLayout,
  layouts: ReadonlyMap<string, CanLayout>,
): NonNullable<CanLayout['selectedBy']>[] {
  const found: NonNullable<CanLayout['selectedBy']>[] = [];
  const seen = new Set<string>();
  for (let by = layout.selectedBy; by !== undefined && !seen.has(by.signal); by = layouts.get(by.signal)?.selectedBy) {
    seen.add(by.signal);
    found.push(by);
  }
  return found;
}
