/**
 * Expressions as a hash-consed graph: the same operation on the same operands is one node. Values are built without
 * any rewriting that could change a bit of the result (constants are folded by computing them as the code would);
 * derivatives are simplified freely, they only feed the Jacobian.
 */
export type NodeId = number;

export type Operation =
  | 'const'
  | 'state'
  | 'command'
  | 'memory'
  | 'step'
  | '+'
  | '-'
  | '*'
  | '/'
  | 'neg'
  | '<'
  | '<='
  | '>'
  | '>='
  | '==='
  | '!=='
  | '&&'
  | '||'
  | '!'
  | '?'
  | 'law'
  | MathName;

export type MathName = 'sqrt' | 'exp' | 'log' | 'tanh' | 'sin' | 'cos' | 'atan' | 'abs' | 'floor' | 'sign' | 'min' | 'max';
export const mathNames: ReadonlySet<string> = new Set<MathName>([
  'sqrt', 'exp', 'log', 'tanh', 'sin', 'cos', 'atan', 'abs', 'floor', 'sign', 'min', 'max',
]);

interface GraphNode {
  readonly op: Operation;
  readonly operands: readonly NodeId[];
  /** Constant value, or index of a state, command or memory slot. */
  readonly value: number;
}

export class Graph {
  readonly nodes: GraphNode[] = [];
  private readonly known = new Map<string, NodeId>();
  private readonly dependencies: (Uint32Array | undefined)[] = [];
  private readonly derivatives = new Map<number, NodeId>();
  /** Of a `law` node: its arguments and the graph-building slopes of its value. */
  private readonly lawSlopes = new Map<NodeId, readonly { argument: NodeId; slope: () => NodeId }[]>();
  private readonly words: number;

  constructor(readonly stateCount: number) {
    this.words = (stateCount + 31) >>> 5;
  }

  private make(op: Operation, operands: readonly NodeId[], value = 0): NodeId {
    const key = op === 'const' ? `c${Object.is(value, -0) ? '-0' : value}` : `${op}|${operands.join(',')}|${value}`;
    let id = this.known.get(key);
    if (id === undefined) {
      id = this.nodes.length;
      this.nodes.push({ op, operands, value });
      this.known.set(key, id);
    }
    return id;
  }

  constant(value: number): NodeId {
    return this.make('const', [], value);
  }
  state(index: number): NodeId {
    return this.make('state', [], index);
  }
  command(index: number): NodeId {
    return this.make('command', [], index);
  }
  memory(index: number): NodeId {
    return this.make('memory', [], index);
  }
  step(): NodeId {
    return this.make('step', []);
  }

  isConstant(id: NodeId): boolean {
    return this.nodes[id]!.op === 'const';
  }
  constantValue(id: NodeId): number {
    return this.nodes[id]!.value;
  }

  /** An operation as the code would compute it: only foldings that keep every bit. */
  apply(op: Operation, operands: readonly NodeId[]): NodeId {
    const [a, b, c] = operands as [NodeId, NodeId, NodeId];
    if (op === '?' && this.isConstant(a)) return this.constantValue(a) !== 0 ? b : c;
    if (operands.every((id) => this.isConstant(id))) {
      return this.constant(fold(op, operands.map((id) => this.constantValue(id))));
    }
    switch (op) {
      case '+':
        if (this.isExactly(a, -0)) return b;
        if (this.isExactly(b, -0)) return a;
        break;
      case '-':
        if (this.isExactly(b, 0)) return a;
        if (this.isExactly(a, -0)) return this.apply('neg', [b]);
        break;
      case '*':
        if (this.isExactly(a, 1)) return b;
        if (this.isExactly(b, 1)) return a;
        break;
      case '/':
        if (this.isExactly(b, 1)) return a;
        if (this.isConstant(b) && isPowerOfTwo(this.constantValue(b))) return this.apply('*', [a, this.constant(1 / this.constantValue(b))]);
        break;
      case '?':
        if (b === c) return b;
        break;
      default:
    }
    return this.make(op, operands);
  }

  /** A law's value with slopes of its own: d(value) = sum slope_i d(argument_i). */
  law(value: NodeId, slopes: readonly { argument: NodeId; slope: () => NodeId }[]): NodeId {
    if (this.isConstant(value)) return value;
    const id = this.make('law', [value]);
    this.lawSlopes.set(id, slopes);
    return id;
  }

  private isExactly(id: NodeId, value: number): boolean {
    return this.isConstant(id) && Object.is(this.constantValue(id), value);
  }

  /** The states that a node depends on, as a bit set; a law node depends on what its arguments depend on. */
  private reach(id: NodeId): Uint32Array {
    const known = this.dependencies[id];
    if (known) return known;
    const set = new Uint32Array(this.words);
    const node = this.nodes[id]!;
    if (node.op === 'state') set[node.value >>> 5]! |= 1 << (node.value & 31);
    for (const operand of node.operands) {
      const below = this.reach(operand);
      for (let i = 0; i < this.words; i += 1) set[i]! |= below[i]!;
    }
    this.dependencies[id] = set;
    return set;
  }

  dependsOn(id: NodeId, state: number): boolean {
    return (this.reach(id)[state >>> 5]! & (1 << (state & 31))) !== 0;
  }

  /** d(node)/d(state), exact, simplified. */
  derivative(id: NodeId, state: number): NodeId {
    if (!this.dependsOn(id, state)) return this.constant(0);
    const key = id * this.stateCount + state;
    const known = this.derivatives.get(key);
    if (known !== undefined) return known;
    const result = this.derive(id, state);
    this.derivatives.set(key, result);
    return result;
  }

  private derive(id: NodeId, state: number): NodeId {
    const { op, operands, value } = this.nodes[id]!;
    const [a, b, c] = operands as [NodeId, NodeId, NodeId];
    const d = (operand: NodeId) => this.derivative(operand, state);
    switch (op) {
      case 'state':
        return this.constant(value === state ? 1 : 0);
      case '+':
        return this.sum(d(a), d(b));
      case '-':
        return this.difference(d(a), d(b));
      case '*':
        return this.sum(this.product(d(a), b), this.product(a, d(b)));
      case '/': {
        const reciprocal = this.apply('/', [this.constant(1), b]);
        return this.product(this.difference(d(a), this.product(id, d(b))), reciprocal);
      }
      case 'neg':
        return this.product(this.constant(-1), d(a));
      case 'sqrt':
        return this.product(d(a), this.apply('/', [this.constant(0.5), id]));
      case 'exp':
        return this.product(d(a), id);
      case 'log':
        return this.product(d(a), this.apply('/', [this.constant(1), a]));
      case 'tanh':
        return this.product(d(a), this.difference(this.constant(1), this.product(id, id)));
      case 'sin':
        return this.product(d(a), this.apply('cos', [a]));
      case 'cos':
        return this.product(this.constant(-1), this.product(d(a), this.apply('sin', [a])));
      case 'atan':
        return this.product(d(a), this.apply('/', [this.constant(1), this.sum(this.constant(1), this.product(a, a))]));
      case 'abs':
        return this.choice(this.apply('<', [a, this.constant(0)]), this.product(this.constant(-1), d(a)), d(a));
      case 'min':
        return this.choice(this.apply('<=', [a, b]), d(a), d(b));
      case 'max':
        return this.choice(this.apply('>=', [a, b]), d(a), d(b));
      case '?':
        return this.choice(a, d(b), d(c));
      case 'law': {
        let total = this.constant(0);
        for (const { argument, slope } of this.lawSlopes.get(id)!) {
          const inner = d(argument);
          if (!(this.isConstant(inner) && this.constantValue(inner) === 0)) total = this.sum(total, this.product(slope(), inner));
        }
        return total;
      }
      default:
        return this.constant(0);
    }
  }

  sum(a: NodeId, b: NodeId): NodeId {
    if (this.isZero(a)) return b;
    if (this.isZero(b)) return a;
    return this.apply('+', [a, b]);
  }
  difference(a: NodeId, b: NodeId): NodeId {
    if (this.isZero(b)) return a;
    if (this.isZero(a)) return this.product(this.constant(-1), b);
    return this.apply('-', [a, b]);
  }
  product(a: NodeId, b: NodeId): NodeId {
    if (this.isZero(a) || this.isZero(b)) return this.constant(0);
    if (this.isExactly(a, -1)) return this.apply('neg', [b]);
    if (this.isExactly(b, -1)) return this.apply('neg', [a]);
    return this.apply('*', [a, b]);
  }
  private choice(condition: NodeId, a: NodeId, b: NodeId): NodeId {
    if (this.isZero(a) && this.isZero(b)) return a;
    return this.apply('?', [condition, a, b]);
  }
  isZero(id: NodeId): boolean {
    return this.isConstant(id) && this.constantValue(id) === 0;
  }
}

function isPowerOfTwo(value: number): boolean {
  if (!Number.isFinite(value) || value === 0) return false;
  const exponent = Math.round(Math.log2(Math.abs(value)));
  return Math.abs(exponent) < 500 && Math.abs(value) === 2 ** exponent;
}

/** The operation on numbers, as generated code computes it; truth is 1 or 0. */
function fold(op: Operation, x: readonly number[]): number {
  const a = x[0]!;
  const b = x[1]!;
  switch (op) {
    case '+':
      return a + b;
    case '-':
      return a - b;
    case '*':
      return a * b;
    case '/':
      return a / b;
    case 'neg':
      return -a;
    case '<':
      return Number(a < b);
    case '<=':
      return Number(a <= b);
    case '>':
      return Number(a > b);
    case '>=':
      return Number(a >= b);
    case '===':
      return Number(a === b);
    case '!==':
      return Number(a !== b);
    case '&&':
      return Number(a !== 0 && b !== 0);
    case '||':
      return Number(a !== 0 || b !== 0);
    case '!':
      return Number(a === 0);
    case 'min':
      return Math.min(a, b);
    case 'max':
      return Math.max(a, b);
    case 'sqrt':
    case 'exp':
    case 'log':
    case 'tanh':
    case 'sin':
    case 'cos':
    case 'atan':
    case 'abs':
    case 'floor':
    case 'sign':
      return Math[op](a);
    default:
      throw new Error(`operation ${op} cannot be folded`);
  }
}
