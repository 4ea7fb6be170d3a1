import type { Expression, Formula, Relation } from '../runtime/judge/formula.js';

const kinds = {
  signal: 0,
  number: 1,
  sum: 2,
  difference: 3,
  product: 4,
  quotient: 5,
  lesser: 6,
  greater: 7,
  negative: 8,
  size: 9,
  below: 10,
  notAbove: 11,
  not: 12,
} as const;

/**
 * Small expressions over the signals of this tick, for what absent control units say and for when they say it: arithmetic,
 * least and greatest, size; conditions are 1 or 0. Compiled once into registers; a run allocates nothing.
 */
export class ValueProgram {
  private readonly kind: number[] = [];
  private readonly a: number[] = [];
  private readonly b: number[] = [];
  private readonly constants: number[] = [];
  private kinds = new Int32Array(0);
  private lefts = new Int32Array(0);
  private rights = new Int32Array(0);
  private values = new Float64Array(0);

  /** Register with the value of an expression. `find` gives the index of a signal, and -1 when there is none. */
  expression(x: Expression, find: (path: string) => number): number {
    switch (x.is) {
      case 'signal':
        return this.add(kinds.signal, find(x.path), 0);
      case 'number':
        return this.add(kinds.number, 0, 0, x.value);
      case 'sum':
      case 'difference':
      case 'product':
      case 'quotient':
      case 'lesser':
      case 'greater':
        return this.add(kinds[x.is], this.expression(x.left, find), this.expression(x.right, find));
      case 'negative':
      case 'size':
        return this.add(kinds[x.is], this.expression(x.of, find), 0);
      default:
        throw new Error(`${x.is} looks back in time: only what is true now can be said here`);
    }
  }

  /** Register with 1 where a condition holds now, 0 where not. A value that is not a number makes a comparison false. */
  condition(f: Formula, find: (path: string) => number): number {
    switch (f.is) {
      case 'compare':
        return this.compare(f.relation, this.expression(f.left, find), this.expression(f.right, find));
      case 'and':
        return this.add(kinds.lesser, this.condition(f.left, find), this.condition(f.right, find));
      case 'or':
        return this.add(kinds.greater, this.condition(f.left, find), this.condition(f.right, find));
      case 'not':
        return this.add(kinds.not, this.condition(f.of, find), 0);
      default:
        throw new Error(`${f.is} looks beyond this tick: only what is true now can be said here`);
    }
  }

  /** Ends the compiling. */
  seal(): void {
    this.kinds = Int32Array.from(this.kind);
    this.lefts = Int32Array.from(this.a);
    this.rights = Int32Array.from(this.b);
    this.values = Float64Array.from(this.constants);
  }

  run(signals: Float64Array): void {
    const { kinds: kind, lefts, rights, values } = this;
    for (let i = 0; i < kind.length; i += 1) {
      const a = lefts[i];
      const b = rights[i];
      switch (kind[i]) {
        case 0:
          values[i] = signals[a];
          break;
        case 1:
          break;
        case 2:
          values[i] = values[a] + values[b];
          break;
        case 3:
          values[i] = values[a] - values[b];
          break;
        case 4:
          values[i] = values[a] * values[b];
          break;
        case 5:
          values[i] = values[a] / values[b];
          break;
        case 6:
          values[i] = Math.min(values[a], values[b]);
          break;
        case 7:
          values[i] = Math.max(values[a], values[b]);
          break;
        case 8:
          values[i] = -values[a];
          break;
        case 9:
          values[i] = Math.abs(values[a]);
          break;
        case 10:
          values[i] = values[a] < values[b] ? 1 : 0;
          break;
        case 11:
          values[i] = values[a] <= values[b] ? 1 : 0;
          break;
        default:
          values[i] = 1 - values[a];
      }
    }
  }

  /** Registers after a run. */
  get registers(): Float64Array {
    return this.values;
  }

  private compare(relation: Relation, left: number, right: number): number {
    switch (relation) {
      case '<':
        return this.add(kinds.below, left, right);
      case '<=':
        return this.add(kinds.notAbove, left, right);
      case '>':
        return this.add(kinds.below, right, left);
      default:
        return this.add(kinds.notAbove, right, left);
    }
  }

  private add(kind: number, a: number, b: number, constant = 0): number {
    this.kind.push(kind);
    this.a.push(a);
    this.b.push(b);
    this.constants.push(constant);
    return this.kind.length - 1;
  }
}

/** Whether a formula says only what is true in this tick. */
export function isPresent(f: Formula): boolean {
  switch (f.is) {
    case 'compare':
      return isPresentValue(f.left) && isPresentValue(f.right);
    case 'and':
    case 'or':
      return isPresent(f.left) && isPresent(f.right);
    case 'not':
      return isPresent(f.of);
    default:
      return false;
  }
}

export function isPresentValue(x: Expression): boolean {
  switch (x.is) {
    case 'signal':
    case 'number':
      return true;
    case 'sum':
    case 'difference':
    case 'product':
    case 'quotient':
    case 'lesser':
    case 'greater':
      return isPresentValue(x.left) && isPresentValue(x.right);
    case 'negative':
    case 'size':
      return isPresentValue(x.of);
    default:
      return false;
  }
}
