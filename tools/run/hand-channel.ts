import type { Acknowledgement, Hand } from '../../bridge/live/source.js';
import { handEventNames, isHandAct } from '../../runtime/hand-events.js';
import { createHandRing, HandRingWriter } from '../../runtime/hand-ring.js';
import { HAND } from '../../runtime/hand-wire.js';
import type { RunReady } from '../loop/run-order.js';

/** ms until a hand without an answer from the loop counts as lost. */
const patience = 2000;
/** Most sentences about hands in a verdict. */
const mostSentences = 20;

export interface HandOrder {
  readonly kind: number;
  /** Number of a target or warning, or of an action. */
  readonly target: number;
  readonly value?: number;
  /** Ticks; 0: no dead man. */
  readonly deadMan?: number;
  /** A note, a reason. */
  readonly said?: string;
  /** What it is called in the verdict: a path, `scenario`. */
  readonly name: string;
}

interface Waiting {
  readonly order: HandOrder;
  readonly hand: Hand;
  readonly resolve: (answer: Acknowledgement) => void;
  readonly timer: NodeJS.Timeout;
}
interface Touched {
  readonly firstTick: number;
  readonly people: Set<string>;
  times: number;
}

/** Carries hands from the host to the loop and brings back at which tick they acted, and keeps account for the verdict. */
export class HandChannel {
  readonly ring = createHandRing();
  private readonly writer = new HandRingWriter(this.ring);
  private readonly waiting = new Map<number, Waiting>();
  private readonly touched = new Map<string, Touched>();
  private readonly texts = new Map<number, { who: string; said: string }>();
  private kinds: readonly { readonly name: string; readonly text: string }[] = [];
  private targets: ReadonlyMap<string, number> = new Map();
  private request = 0;
  private over = false;
  /** Hands that acted so far. */
  count = 0;

  constructor(private readonly step: number) {}

  /** What the loop says when it is built. */
  know(ready: RunReady): void {
    this.kinds = ready.events.kinds;
    this.targets = new Map(ready.hands.map((target, i) => [target.path, i]));
  }

  /** Number of a target, -1 when it is none. */
  target(path: string): number {
    return this.targets.get(path) ?? -1;
  }

  /** Hands it to the loop; resolves when it acted, or says why it did not. Never rejects. */
  put(order: HandOrder, hand: Hand): Promise<Acknowledgement> {
    if (this.over) return Promise.resolve(refused('the run has ended'));
    this.request += 1;
    const request = this.request;
    const message = {
      kind: order.kind,
      request,
      target: order.target,
      deadMan: order.deadMan ?? 0,
      value: order.value ?? 0,
      text: { who: hand.who, address: hand.address, said: order.said ?? '' },
    };
    if (!this.writer.put(message)) return Promise.resolve(refused('too many hands at once'));
    if (order.kind === HAND.note) this.texts.set(request, { who: hand.who, said: order.said ?? '' });
    return new Promise((resolve) => {
      const timer = setTimeout(() => {
        this.waiting.delete(request);
        resolve(refused(`no answer from the bench within ${patience / 1000} s`));
      }, patience);
      this.waiting.set(request, { order, hand, resolve, timer });
    });
  }

  /** An event came from the loop; c is the number of a request where it answers one. */
  answered(tick: number, code: number, c: number): void {
    const kind = this.kinds[code];
    const waiting =
      kind !== undefined && (isHandAct(kind.name) || kind.name.startsWith(handEventNames.refusals))
        ? this.waiting.get(c)
        : undefined;
    if (waiting === undefined || kind === undefined) return;
    this.waiting.delete(c);
    clearTimeout(waiting.timer);
    if (kind.name.startsWith(handEventNames.refusals)) {
      waiting.resolve(refused(kind.text.replace(/^by hand: refused, /, '')));
      return;
    }
    this.count += 1;
    this.account(waiting, tick);
    waiting.resolve({ ok: true, tick, text: 'in the record' });
  }

  /** What was written with a note. */
  textOf(request: number): { readonly who: string; readonly said: string } | undefined {
    return this.texts.get(request);
  }

  /** Nothing more will be answered. */
  end(): void {
    this.over = true;
    for (const { resolve, timer } of this.waiting.values()) {
      clearTimeout(timer);
      resolve(refused('the run has ended'));
    }
    this.waiting.clear();
  }

  /** What hands did to the run. Notes and acknowledgements touch nothing that a controller or a requirement sees. */
  sentences(): string[] {
    const all = [...this.touched].map(([name, { firstTick, times, people }]) => {
      const often = times === 1 ? 'once, at' : `${times} times, first at`;
      return `${name} by hand of ${[...people].join(', ')}, ${often} ${(firstTick * this.step).toFixed(3)} s`;
    });
    const rest = all.length - mostSentences;
    return rest > 0 ? [...all.slice(0, mostSentences), `${rest} other targets by hand`] : all;
  }

  private account({ order, hand }: Waiting, tick: number): void {
    if (order.kind === HAND.note || order.kind === HAND.acknowledge) return;
    const known = this.touched.get(order.name) ?? { firstTick: tick, people: new Set<string>(), times: 0 };
    known.times += 1;
    known.people.add(hand.who);
    this.touched.set(order.name, known);
  }
}

function refused(text: string): Acknowledgement {
  return { ok: false, tick: -1, text };
}
