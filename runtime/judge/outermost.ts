/** Kinds of outermost nodes: those that are evaluated once, at tick 0, and gather over the run. */
export const outermost = { always: 0, eventually: 1, until: 2, start: 3, end: 4, not: 5, and: 6, or: 7 } as const;

export interface OutermostNode {
  readonly kind: number;
  /** Nodes. */
  readonly a: number;
  readonly b: number;
  /** Registers of the program, known `horizon` ticks late. */
  readonly body: number;
  readonly second: number;
  readonly horizon: number;
  readonly from: number;
  /** null: the last tick of the run. */
  readonly to: number | null;
  readonly slot: number;
}

/**
 * Gathers what the program computes into values of whole requirements. For each node: `now` (the last known tick),
 * `value` (so far), `at` (the tick that decided it, -1: none) and what is sure: it will not end below `low` nor above `high`.
 */
export class Outermost {
  private readonly kind: Int32Array;
  private readonly a: Int32Array;
  private readonly b: Int32Array;
  private readonly body: Int32Array;
  private readonly second: Int32Array;
  private readonly horizon: Int32Array;
  private readonly slot: Int32Array;
  private readonly from: Float64Array;
  private readonly to: Float64Array;
  readonly now: Float64Array;
  readonly value: Float64Array;
  readonly at: Float64Array;
  readonly low: Float64Array;
  readonly high: Float64Array;
  /** Greatest upper bound that is no `null`, plus its horizon. */
  readonly farthest: number;
  readonly latestStart: number;

  constructor(nodes: readonly OutermostNode[]) {
    const whole = (pick: (node: OutermostNode) => number) => Int32Array.from(nodes, pick);
    this.kind = whole((n) => n.kind);
    this.a = whole((n) => n.a);
    this.b = whole((n) => n.b);
    this.body = whole((n) => n.body);
    this.second = whole((n) => n.second);
    this.horizon = whole((n) => n.horizon);
    this.slot = whole((n) => n.slot);
    this.from = Float64Array.from(nodes, (n) => n.from);
    this.to = Float64Array.from(nodes, (n) => n.to ?? Infinity);
    this.now = new Float64Array(nodes.length);
    this.value = new Float64Array(nodes.length);
    this.at = new Float64Array(nodes.length);
    this.low = new Float64Array(nodes.length);
    this.high = new Float64Array(nodes.length);
    this.farthest = nodes.reduce((far, n) => Math.max(far, n.to === null ? 0 : n.to + n.horizon), 0);
    this.latestStart = nodes.reduce((late, n) => Math.max(late, n.from), 0);
  }

  /** Before the first tick of a run. */
  reset(): void {
    this.now.fill(0);
    this.at.fill(-1);
  }

  /** Takes in one tick; `end` is the last tick of the run as far as known: nothing unbounded reaches behind it. */
  run(tick: number, registers: Float64Array, block: Float64Array, end: number): void {
    const count = this.kind.length;
    for (let i = 0; i < count; i += 1) {
      switch (this.kind[i]) {
        case outermost.always:
          this.extreme(i, tick, registers, block, end, -1);
          break;
        case outermost.eventually:
          this.extreme(i, tick, registers, block, end, 1);
          break;
        case outermost.until:
          this.until(i, tick, registers, block, end);
          break;
        case outermost.start:
        case outermost.end:
          this.once(i, tick, registers, block, end);
          break;
        case outermost.not: {
          const a = this.a[i]!;
          this.now[i] = -this.now[a]!;
          this.value[i] = -this.value[a]!;
          this.at[i] = this.at[a]!;
          this.low[i] = -this.high[a]!;
          this.high[i] = -this.low[a]!;
          break;
        }
        default:
          this.join(i);
      }
    }
  }

  /** Slots: extreme, its tick. */
  private extreme(
    i: number,
    tick: number,
    registers: Float64Array,
    block: Float64Array,
    end: number,
    sign: number,
  ): void {
    const slot = this.slot[i]!;
    const to = this.to[i]!;
    const time = tick - this.horizon[i]!;
    if (time >= this.from[i]! && time <= to && (to !== Infinity || time <= end)) {
      const now = registers[this.body[i]!]!;
      this.now[i] = now;
      const one = sign * now;
      const other = sign * block[slot]!;
      if (one > other || (one === other && 1 / one > 1 / other)) {
        block[slot] = now;
        block[slot + 1] = time;
      }
    }
    const extreme = block[slot]!;
    this.value[i] = extreme;
    this.at[i] = block[slot + 1]!;
    const over = time >= to;
    this.low[i] = over || sign > 0 ? extreme : -Infinity;
    this.high[i] = over || sign < 0 ? extreme : Infinity;
  }

  /** Slots: best, its tick, least of the left side so far. */
  private until(i: number, tick: number, registers: Float64Array, block: Float64Array, end: number): void {
    const slot = this.slot[i]!;
    const to = this.to[i]!;
    const time = tick - this.horizon[i]!;
    if (time >= 0 && time <= to && (to !== Infinity || time <= end)) {
      const left = registers[this.body[i]!]!;
      const right = registers[this.second[i]!]!;
      const now = Math.min(right, block[slot + 2]!);
      this.now[i] = now;
      const best = block[slot]!;
      if (time >= this.from[i]! && (now > best || (now === best && 1 / now > 1 / best))) {
        block[slot] = now;
        block[slot + 1] = time;
      }
      block[slot + 2] = Math.min(block[slot + 2]!, left);
    }
    this.value[i] = block[slot]!;
    this.at[i] = block[slot + 1]!;
    this.low[i] = block[slot]!;
    this.high[i] = time >= to ? block[slot]! : Math.max(block[slot]!, block[slot + 2]!);
  }

  /** Slots: value, its tick. */
  private once(i: number, tick: number, registers: Float64Array, block: Float64Array, end: number): void {
    const slot = this.slot[i]!;
    const time = tick - this.horizon[i]!;
    const start = this.kind[i] === outermost.start;
    if (start ? time === 0 : time >= 0 && time <= end) {
      block[slot] = registers[this.body[i]!]!;
      block[slot + 1] = time;
    }
    const known = block[slot + 1]! >= 0;
    const value = known ? block[slot]! : -Infinity;
    this.now[i] = value;
    this.value[i] = value;
    this.at[i] = block[slot + 1]!;
    this.low[i] = start && known ? value : -Infinity;
    this.high[i] = start && known ? value : Infinity;
  }

  private join(i: number): void {
    const a = this.a[i]!;
    const b = this.b[i]!;
    if (this.kind[i] === outermost.and) {
      this.now[i] = Math.min(this.now[a]!, this.now[b]!);
      this.value[i] = Math.min(this.value[a]!, this.value[b]!);
      this.at[i] = this.value[b]! < this.value[a]! ? this.at[b]! : this.at[a]!;
      this.low[i] = Math.min(this.low[a]!, this.low[b]!);
      this.high[i] = Math.min(this.high[a]!, this.high[b]!);
    } else {
      this.now[i] = Math.max(this.now[a]!, this.now[b]!);
      this.value[i] = Math.max(this.value[a]!, this.value[b]!);
      this.at[i] = this.value[b]! > this.value[a]! ? this.at[b]! : this.at[a]!;
      this.low[i] = Math.max(this.low[a]!, this.low[b]!);
      this.high[i] = Math.max(this.high[a]!, this.high[b]!);
    }
  }
}
