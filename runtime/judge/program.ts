import { addTo, slideExtreme, slideUntil } from './window.js';

/**
 * What an operation of a compiled requirement does; expressions first, so that they can be told apart by number. The switch in
 * `run` says the numbers themselves: the engine makes a jump table of literals only, and compares one by one otherwise.
 */
export const operation = {
  signal: 0,
  sum: 1,
  difference: 2,
  product: 3,
  quotient: 4,
  lesser: 5,
  greater: 6,
  negative: 7,
  size: 8,
  change: 9,
  rate: 10,
  integral: 11,
  integralOver: 12,
  peak: 13,
  trough: 14,
  extremeOver: 15,
  mean: 16,
  meanOver: 17,
  count: 18,
  duration: 19,
  durationOver: 20,
  // Formulas.
  below: 21,
  notAbove: 22,
  divide: 23,
  and: 24,
  or: 25,
  not: 26,
  given: 27,
  trigger: 28,
  previous: 29,
  delay: 30,
  extreme: 31,
  until: 32,
  happens: 33,
  signalBelow: 34,
  signalNotAbove: 35,
  signalAbove: 36,
  signalNotBelow: 37,
} as const;

const firstFormula = operation.below;

/** One operation: writes register `to` from registers `a` and `b`. */
export interface Operation {
  readonly kind: number;
  readonly a: number;
  readonly b: number;
  readonly to: number;
  /** First tick at which it runs: what its inputs look ahead. */
  readonly begins: number;
  /** First slot in the windows, or in the block for a trigger. */
  readonly slot: number;
  /** Ticks: span of a window, length of a delay. */
  readonly span: number;
  readonly mask: number;
  /** Polarity of a comparison, sign of an extreme. */
  readonly sign: number;
  readonly constant: number;
  readonly first: number;
  readonly last: number;
}

/** The operations of all requirements, run in order once a tick. Registers hold nothing from one tick to the next. */
export class Program {
  private readonly kind: Int32Array;
  private readonly a: Int32Array;
  private readonly b: Int32Array;
  private readonly to: Int32Array;
  private readonly begins: Int32Array;
  private readonly slot: Int32Array;
  private readonly span: Int32Array;
  private readonly mask: Int32Array;
  private readonly sign: Float64Array;
  private readonly constant: Float64Array;
  private readonly first: Float64Array;
  private readonly last: Float64Array;
  readonly registers: Float64Array;

  constructor(
    operations: readonly Operation[],
    constants: readonly (readonly [register: number, value: number])[],
    registerCount: number,
    private readonly step: number,
  ) {
    const whole = (pick: (operation: Operation) => number) => Int32Array.from(operations, pick);
    const real = (pick: (operation: Operation) => number) => Float64Array.from(operations, pick);
    this.kind = whole((o) => o.kind);
    this.a = whole((o) => o.a);
    this.b = whole((o) => o.b);
    this.to = whole((o) => o.to);
    this.begins = whole((o) => o.begins);
    this.slot = whole((o) => o.slot);
    this.span = whole((o) => o.span);
    this.mask = whole((o) => o.mask);
    this.sign = real((o) => o.sign);
    this.constant = real((o) => o.constant);
    this.first = real((o) => o.first);
    this.last = real((o) => o.last);
    this.registers = new Float64Array(registerCount);
    for (const [register, value] of constants) this.registers[register] = value;
  }

  get length(): number {
    return this.kind.length;
  }

  /**
   * Runs one tick. `view` 0: the signals are those of `tick`. Behind the end of the run 1 or -1: comparisons are missing and
   * count for (weak view) or against the requirement (strong view); expressions are not evaluated. `end` is the last tick
   * of the run, as far as known.
   */
  run(
    tick: number,
    signals: Float64Array,
    block: Float64Array,
    windows: Float64Array,
    view: number,
    end: number,
  ): void {
    // Read once: the fields would be loaded anew for each operation.
    const registers = this.registers;
    const kinds = this.kind;
    const begins = this.begins;
    const as = this.a;
    const bs = this.b;
    const tos = this.to;
    const signs = this.sign;
    const constants = this.constant;
    const count = kinds.length;
    for (let i = 0; i < count; i += 1) {
      const kind = kinds[i]!;
      const time = tick - begins[i]!;
      if (time < 0) continue;
      const a = as[i]!;
      const to = tos[i]!;
      if (view !== 0) {
        if (kind < firstFormula) continue;
        if (kind === operation.below || kind === operation.notAbove || kind >= operation.signalBelow) {
          registers[to] = view * signs[i]! * Infinity;
          continue;
        }
      }
      switch (kind) {
        case 0: // signal
          registers[to] = signals[a]!;
          break;
        case 1: // sum
          registers[to] = registers[a]! + registers[bs[i]!]!;
          break;
        case 2: // difference
          registers[to] = registers[a]! - registers[bs[i]!]!;
          break;
        case 3: // product
          registers[to] = registers[a]! * registers[bs[i]!]!;
          break;
        case 4: // quotient
          registers[to] = registers[a]! / registers[bs[i]!]!;
          break;
        case 5: // lesser
          registers[to] = Math.min(registers[a]!, registers[bs[i]!]!);
          break;
        case 6: // greater
          registers[to] = Math.max(registers[a]!, registers[bs[i]!]!);
          break;
        case 7: // negative
          registers[to] = -registers[a]!;
          break;
        case 8: // size
          registers[to] = Math.abs(registers[a]!);
          break;
        case 9: // change
        case 10: // rate
          this.change(i, time, windows);
          break;
        case 11: // integral
        case 12: // integralOver
          this.integral(i, time, windows);
          break;
        case 13: // peak
          windows[this.slot[i]!] = Math.max(windows[this.slot[i]!]!, registers[a]!);
          registers[to] = windows[this.slot[i]!]!;
          break;
        case 14: // trough
          windows[this.slot[i]!] = Math.min(windows[this.slot[i]!]!, registers[a]!);
          registers[to] = windows[this.slot[i]!]!;
          break;
        case 15: // extremeOver
          this.extremeOver(i, time, windows);
          break;
        case 31: // extreme
          slideExtreme(windows, this.slot[i]!, this.span[i]!, this.mask[i]!, signs[i]!, time, registers, a, to);
          break;
        case 16: // mean
        case 17: // meanOver
          this.mean(i, time, windows);
          break;
        case 18: // count
        case 19: // duration
        case 20: // durationOver
          this.tally(i, time, windows);
          break;
        case 21: {
          // below
          // Equal sides must give -0 here and +0 below; `+ 0` takes the sign off (-0) - 0.
          const margin = -(registers[a]! - registers[bs[i]!]! + 0);
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 22: {
          // notAbove
          const margin = registers[bs[i]!]! - registers[a]! + 0;
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 34: {
          // signalBelow
          const margin = -(signals[a]! - constants[i]! + 0);
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 35: {
          // signalNotAbove
          const margin = constants[i]! - signals[a]! + 0;
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 36: {
          // signalAbove
          const margin = -(constants[i]! - signals[a]! + 0);
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 37: {
          // signalNotBelow
          const margin = signals[a]! - constants[i]! + 0;
          registers[to] = Number.isNaN(margin) ? -signs[i]! * Infinity : margin;
          break;
        }
        case 23: // divide
          registers[to] = registers[a]! / constants[i]!;
          break;
        case 24: // and
          registers[to] = Math.min(registers[a]!, registers[bs[i]!]!);
          break;
        case 25: // or
          registers[to] = Math.max(registers[a]!, registers[bs[i]!]!);
          break;
        case 26: // not
          registers[to] = -registers[a]!;
          break;
        case 27: {
          // given
          const condition = registers[a]!;
          registers[to] = condition > 0 || 1 / condition === Infinity ? registers[bs[i]!]! : Infinity;
          break;
        }
        case 33: {
          // happens
          const margin = registers[a]!;
          registers[to] = margin > 0 || 1 / margin === Infinity ? Infinity : -Infinity;
          break;
        }
        case 28: // trigger
          this.trigger(i, time, block, end);
          break;
        case 29: {
          // previous
          const slot = this.slot[i]!;
          registers[to] = time === 0 ? constants[i]! : windows[slot]!;
          windows[slot] = registers[a]!;
          break;
        }
        case 30: {
          // delay
          const slot = this.slot[i]!;
          const mask = this.mask[i]!;
          windows[slot + (time & mask)] = registers[a]!;
          if (time >= this.span[i]!) registers[to] = windows[slot + ((time - this.span[i]!) & mask)]!;
          break;
        }
        case 32: // until
          slideUntil(windows, this.slot[i]!, this.span[i]!, this.mask[i]! + 1, time, registers, a, bs[i]!, to);
          break;
      }
    }
  }

  /** Slots: x(0), ring of the last `span` values. */
  private change(i: number, time: number, windows: Float64Array): void {
    const slot = this.slot[i]!;
    const span = this.span[i]!;
    const mask = this.mask[i]!;
    const now = this.registers[this.a[i]!]!;
    if (time === 0) windows[slot] = now;
    const before = time >= span ? windows[slot + 1 + ((time - span) & mask)]! : windows[slot]!;
    windows[slot + 1 + (time & mask)] = now;
    let change = now - before;
    if (this.kind[i] === operation.rate) change = time === 0 ? 0 : change / (Math.min(time, span) * this.step);
    this.registers[this.to[i]!] = change;
  }

  /** Slots: value before, sum with correction, 1 + tick of the last trapezoid that is not finite, ring of trapezoids. */
  private integral(i: number, time: number, windows: Float64Array): void {
    const slot = this.slot[i]!;
    const span = this.span[i]!;
    const registers = this.registers;
    const to = this.to[i]!;
    const from = this.a[i]!;
    if (time > 0) {
      registers[to] = 0.5 * (windows[slot]! + registers[from]!) * this.step;
      if (!Number.isFinite(registers[to]!)) {
        windows[slot + 3] = time + 1;
        registers[to] = 0;
      }
      addTo(windows, slot + 1, registers, to, 1);
      if (this.kind[i] === operation.integralOver) {
        const mask = this.mask[i]!;
        // The trapezoid of tick `time - span` leaves; there is none at tick 0.
        if (time > span) addTo(windows, slot + 1, windows, slot + 4 + ((time - span) & mask), -1);
        windows[slot + 4 + (time & mask)] = registers[to]!;
      }
    }
    windows[slot] = registers[from]!;
    const spoilt =
      windows[slot + 3] !== 0 && (this.kind[i] === operation.integral || time - windows[slot + 3]! + 1 < span);
    registers[to] = spoilt ? Number.NaN : windows[slot + 1]! + windows[slot + 2]!;
  }

  /** Slots: 1 + tick of the last value that is no number, then the extreme. Such a value spoils its whole span. */
  private extremeOver(i: number, time: number, windows: Float64Array): void {
    const slot = this.slot[i]!;
    const registers = this.registers;
    const now = registers[this.a[i]!]!;
    const to = this.to[i]!;
    if (Number.isNaN(now)) windows[slot] = time + 1;
    registers[to] = Number.isNaN(now) ? 0 : now;
    slideExtreme(windows, slot + 1, this.span[i]!, this.mask[i]!, this.sign[i]!, time, registers, to, to);
    const seen = windows[slot]! - 1;
    if (seen >= 0 && time - seen <= this.span[i]!) registers[to] = Number.NaN;
  }

  /** Slots: sum with correction, 1 + tick of the last value that is not finite, ring. */
  private mean(i: number, time: number, windows: Float64Array): void {
    const slot = this.slot[i]!;
    const span = this.span[i]!;
    const registers = this.registers;
    const to = this.to[i]!;
    registers[to] = registers[this.a[i]!]!;
    if (!Number.isFinite(registers[to]!)) {
      windows[slot + 2] = time + 1;
      registers[to] = 0;
    }
    addTo(windows, slot, registers, to, 1);
    let count = time + 1;
    if (this.kind[i] === operation.meanOver) {
      const mask = this.mask[i]!;
      if (time > span) {
        addTo(windows, slot, windows, slot + 3 + ((time - span - 1) & mask), -1);
        count = span + 1;
      }
      windows[slot + 3 + (time & mask)] = registers[to]!;
    }
    const spoilt =
      windows[slot + 2] !== 0 && (this.kind[i] === operation.mean || time - windows[slot + 2]! + 1 <= span);
    registers[to] = spoilt ? Number.NaN : (windows[slot]! + windows[slot + 1]!) / count;
  }

  /** Slots: whether it held before, tally, ring of what held. */
  private tally(i: number, time: number, windows: Float64Array): void {
    const slot = this.slot[i]!;
    const margin = this.registers[this.a[i]!]!;
    const held = margin > 0 || 1 / margin === Infinity ? 1 : 0;
    const to = this.to[i]!;
    if (this.kind[i] === operation.count) {
      if (held === 1 && (time === 0 || windows[slot] === 0)) windows[slot + 1] = windows[slot + 1]! + 1;
      windows[slot] = held;
      this.registers[to] = windows[slot + 1]!;
      return;
    }
    let ticks = windows[slot + 1]! + held;
    if (this.kind[i] === operation.durationOver) {
      const span = this.span[i]!;
      const mask = this.mask[i]!;
      if (time >= span) ticks -= windows[slot + 2 + ((time - span) & mask)]!;
      windows[slot + 2 + (time & mask)] = held;
    }
    windows[slot + 1] = ticks;
    this.registers[to] = ticks * this.step;
  }

  /** Slots in the block: how often it began to hold, whether it held before, last tick at which it held. */
  private trigger(i: number, time: number, block: Float64Array, end: number): void {
    if (time < this.first[i]! || time > this.last[i]! || time > end) return;
    const slot = this.slot[i]!;
    const margin = this.registers[this.a[i]!]!;
    const held = margin > 0 || 1 / margin === Infinity ? 1 : 0;
    if (held === 1) {
      if (block[slot + 1] === 0) block[slot] = block[slot]! + 1;
      block[slot + 2] = time;
    }
    block[slot + 1] = held;
  }
}
