import v8 from 'node:v8';

/** Bits of V8's answer about a function (runtime-test.cc, OptimizationStatus). */
const OPTIMISED = 1 << 4;

export interface CodeReport {
  /** False where this engine does not answer: nothing is known then. */
  readonly known: boolean;
  /** Functions looked at, and how many of them ran as optimised code when counting began. */
  readonly functions: number;
  readonly optimised: number;
  /** Those that lost their optimised code afterwards, and the first tick at which it was seen. */
  readonly lost: readonly { readonly name: string; readonly tick: number }[];
  /** Those that were compiled only afterwards. */
  readonly late: readonly { readonly name: string; readonly tick: number }[];
}

type Status = (subject: unknown) => number;
let status: Status | undefined | null;

/**
 * The engine's own answer whether a function runs as optimised code. The switch that allows the question only changes
 * the parser; it is put back at once. Undefined where the engine refuses.
 */
function statusQuestion(): Status | undefined {
  if (status === undefined) {
    try {
      v8.setFlagsFromString('--allow-natives-syntax');
      status = new Function('subject', 'return %GetOptimizationStatus(subject)') as Status;
      if (typeof status(statusQuestion) !== 'number') status = null;
    } catch {
      status = null;
    } finally {
      v8.setFlagsFromString('--no-allow-natives-syntax');
    }
  }
  return status ?? undefined;
}

/**
 * Sees when hot code falls back to the interpreter (a deoptimisation) while the loop runs. One function is asked about
 * per tick (0.7 µs, no allocation), in turn: code that was given up and compiled again between two turns of the same
 * function goes unseen; with a few hundred functions that is some tenths of a second.
 */
export class CodeWatch {
  private readonly names: string[] = [];
  private readonly functions: unknown[] = [];
  private readonly atStart: Uint8Array;
  private readonly lostAt: Float64Array;
  private readonly lateAt: Float64Array;
  private readonly question: Status | undefined;
  private turn = 0;
  private counting = false;

  constructor(subjects: ReadonlyMap<string, unknown>) {
    this.question = statusQuestion();
    for (const [name, one] of subjects) {
      this.names.push(name);
      this.functions.push(one);
    }
    const count = this.names.length;
    this.atStart = new Uint8Array(count);
    this.lostAt = new Float64Array(count).fill(Number.NaN);
    this.lateAt = new Float64Array(count).fill(Number.NaN);
  }

  /** Notes what is optimised now; `check` compares with it from here on. */
  begin(): void {
    for (let i = 0; i < this.functions.length; i += 1) this.atStart[i] = this.optimised(i) ? 1 : 0;
    this.lostAt.fill(Number.NaN);
    this.lateAt.fill(Number.NaN);
    this.counting = true;
    this.turn = 0;
  }

  /** Runs through all that `check` may meet, for a warm-up: that seeing a loss is not a loss itself. */
  rehearse(): void {
    for (let round = 0; round < 3; round += 1) {
      this.begin();
      for (let i = 0; i < this.atStart.length; i += 1) this.atStart[i] = this.atStart[i] === 1 ? 0 : 1;
      for (let tick = 0; tick < 2 * this.atStart.length; tick += 1) this.check(tick);
      this.finish(0);
    }
    this.begin();
  }

  /** Asks about the next function in turn. Allocates nothing. */
  check(tick: number): void {
    if (!this.counting || this.functions.length === 0) return;
    const i = this.turn;
    this.turn = i + 1 < this.functions.length ? i + 1 : 0;
    this.compare(i, tick);
  }

  /** Asks about all. */
  finish(tick: number): void {
    if (!this.counting) return;
    for (let i = 0; i < this.functions.length; i += 1) this.compare(i, tick);
    this.counting = false;
  }

  /** How many functions are optimised now, or -1 where the engine does not say. Not for the tick. */
  count(): number {
    if (this.question === undefined) return -1;
    let count = 0;
    for (let i = 0; i < this.functions.length; i += 1) if (this.optimised(i)) count += 1;
    return count;
  }

  report(): CodeReport {
    const list = (ticks: Float64Array) =>
      this.names.flatMap((name, i) => (Number.isNaN(ticks[i]!) ? [] : [{ name, tick: ticks[i]! }]));
    return {
      known: this.question !== undefined,
      functions: this.functions.length,
      optimised: this.atStart.reduce((sum, one) => sum + one, 0),
      lost: list(this.lostAt),
      late: list(this.lateAt),
    };
  }

  private compare(i: number, tick: number): void {
    const now = this.optimised(i);
    if (this.atStart[i] === 1) {
      if (!now && !(this.lostAt[i]! <= tick)) this.lostAt[i] = tick;
    } else if (now && !(this.lateAt[i]! <= tick)) this.lateAt[i] = tick;
  }

  private optimised(i: number): boolean {
    return this.question !== undefined && (this.question(this.functions[i]) & OPTIMISED) !== 0;
  }
}

/** All methods of the classes of `objects` by `Class.method`, for `CodeWatch`. */
export function methodsOf(objects: readonly object[]): Map<string, unknown> {
  const found = new Map<string, unknown>();
  for (const object of objects) {
    for (
      let proto = Object.getPrototypeOf(object);
      proto !== null && proto !== Object.prototype;
      proto = Object.getPrototypeOf(proto)
    ) {
      for (const [name, { value }] of Object.entries(Object.getOwnPropertyDescriptors(proto))) {
        if (name !== 'constructor' && typeof value === 'function')
          found.set(`${proto.constructor.name}.${name}`, value);
      }
    }
  }
  return found;
}
