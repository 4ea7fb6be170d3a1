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

export type MathName =
  | 'sqrt'
  | 'exp'
  | 'log'
  | 'tanh'
  | 'sin'
  | 'cos'
  | 'atan'
  | 'abs'
  | 'floor'
  | 'sign'
  | 'min'
  | 'max';
export const mathNames: ReadonlySet<string> = new Set<MathName>([
  'sqrt',
  'exp',
  'log',
  'tanh',
  'sin',
  'cos',
  'atan',
  'abs',
  'floor',
  'sign',
  'min',
  'max',
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
      return this.constant(
        fold(
          op,
          operands.map((id) => this.constantValue(id)),
        ),
      );
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
        if (this.isConstant(b) && isPowerOfTwo(this.constantValue(b)))
          return this.apply('*', [a, this.constant(1 / this.constantValue(b))]);
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

  dependsOnStates(id: NodeId): boolean {
    return this.reach(id).some((word) => word !== 0);
  }

  /** The index of the state that this node is, if it is one. */
  stateOf(id: NodeId): number | undefined {
    const node = this.nodes[id]!;
    return node.op === 'state' ? node.value : undefined;
  }

  /** d(node)/d(state), exact, simplified. */
  derivative(id: NodeId, state: number): NodeId {
    if (!this.dependsOn(id, state)) return this.constant(0);
    if (this.stateOf(id) !== undefined) return this.constant(1);
    const key = id * this.stateCount + state;
    const known = this.derivatives.get(key);
    if (known !== undefined) return known;
    let result = this.constant(0);
    for (const [operand, slope] of this.partials(id)) {
      if (this.dependsOn(operand, state))
        result = this.sum(result, this.product(slope, this.derivative(operand, state)));
    }
    this.derivatives.set(key, result);
    return result;
  }

  /** Each operand of an operation (of a law with slopes: each argument) with the exact derivative of the value by it. */
  partials(id: NodeId): readonly (readonly [operand: NodeId, slope: NodeId])[] {
    const { op, operands } = this.nodes[id]!;
    const [a, b, c] = operands as [NodeId, NodeId, NodeId];
    const zero = this.constant(0);
    const one = this.constant(1);
    const minus = this.constant(-1);
    switch (op) {
      case '+':
        return [
          [a, one],
          [b, one],
        ];
      case '-':
        return [
          [a, one],
          [b, minus],
        ];
      case '*':
        return [
          [a, b],
          [b, a],
        ];
      case '/': {
        const reciprocal = this.apply('/', [one, b]);
        if (this.isConstant(b)) return [[a, reciprocal]];
        return [
          [a, reciprocal],
          [b, this.product(minus, this.product(id, reciprocal))],
        ];
      }
      case 'neg':
        return [[a, minus]];
      case 'sqrt':
        return [[a, this.apply('/', [this.constant(0.5), id])]];
      case 'exp':
        return [[a, id]];
      case 'log':
        return [[a, this.apply('/', [one, a])]];
      case 'tanh':
        return [[a, this.difference(one, this.product(id, id))]];
      case 'sin':
        return [[a, this.apply('cos', [a])]];
      case 'cos':
        return [[a, this.product(minus, this.apply('sin', [a]))]];
      case 'atan':
        return [[a, this.apply('/', [one, this.sum(one, this.product(a, a))])]];
      case 'abs':
        return [[a, this.choice(this.apply('<', [a, zero]), minus, one)]];
      case 'min': {
        const first = this.apply('<=', [a, b]);
        return [
          [a, this.choice(first, one, zero)],
          [b, this.choice(first, zero, one)],
        ];
      }
      case 'max': {
        const first = this.apply('>=', [a, b]);
        return [
          [a, this.choice(first, one, zero)],
          [b, this.choice(first, zero, one)],
        ];
      }
      case '?':
        return [
          [b, this.choice(a, one, zero)],
          [c, this.choice(a, zero, one)],
        ];
      case 'law':
        return this.lawSlopes
          .get(id)!
          .map(({ argument, slope }) => [argument, this.dependsOnStates(argument) ? slope() : zero] as const);
      default:
        return [];
    }
  }

  sum(a: NodeId, b: NodeId): NodeId {
    if (this.isZero(a)) return b;
    if (this.isZero(b)) return a;
    const first = this.nodes[a]!;
    const second = this.nodes[b]!;
    if (first.op === '?' && second.op === '?' && first.operands[0] === second.operands[0]) {
      const [condition, a1, a2] = first.operands as [NodeId, NodeId, NodeId];
      const [, b1, b2] = second.operands as [NodeId, NodeId, NodeId];
      if (this.isZero(a1) || this.isZero(a2) || this.isZero(b1) || this.isZero(b2))
        return this.choice(condition, this.sum(a1, b1), this.sum(a2, b2));
    }
    if (second.op === 'neg') return this.difference(a, second.operands[0]!);
    if (first.op === 'neg') return this.difference(b, first.operands[0]!);
    return this.apply('+', [a, b]);
  }
  difference(a: NodeId, b: NodeId): NodeId {
    if (this.isZero(b)) return a;
    if (this.isZero(a)) return this.negative(b);
    return this.apply('-', [a, b]);
  }
  /**
   * A choice with an arm that is zero stays outermost: what it is multiplied by may be no number while that arm is taken
   * (the slope of a root in the arm that is not). `numbers`: both are known to be numbers, whatever arms are taken.
   */
  product(a: NodeId, b: NodeId, numbers = false): NodeId {
    if (this.isZero(a) || this.isZero(b)) return this.constant(0);
    if (this.isExactly(a, 1)) return b;
    if (this.isExactly(b, 1)) return a;
    if (this.isExactly(a, -1)) return this.negative(b);
    if (this.isExactly(b, -1)) return this.negative(a);
    for (const [one, other] of [
      [a, b],
      [b, a],
    ] as const) {
      const { op, operands } = this.nodes[one]!;
      if (op !== '?') continue;
      const [condition, x, y] = operands as [NodeId, NodeId, NodeId];
      const sign = (arm: NodeId) => this.isZero(arm) || this.isUnit(arm);
      const guard = this.isZero(x) || this.isZero(y);
      if ((guard && !numbers) || (sign(x) && sign(y)))
        return this.choice(condition, this.product(x, other, numbers), this.product(y, other, numbers));
    }
    const left = this.nodes[a]!;
    const right = this.nodes[b]!;
    if (left.op === 'neg' && right.op === 'neg') return this.product(left.operands[0]!, right.operands[0]!, numbers);
    if (left.op === 'neg') return this.negative(this.product(left.operands[0]!, b, numbers));
    if (right.op === 'neg') return this.negative(this.product(a, right.operands[0]!, numbers));
    return this.apply('*', a < b ? [a, b] : [b, a]);
  }
  private negative(id: NodeId): NodeId {
    const { op, operands } = this.nodes[id]!;
    if (op === 'neg') return operands[0]!;
    if (op === '?') {
      const [condition, x, y] = operands as [NodeId, NodeId, NodeId];
      if (this.isZero(x) || this.isZero(y) || (this.isUnit(x) && this.isUnit(y)))
        return this.choice(condition, this.negative(x), this.negative(y));
    }
    return this.isZero(id) ? id : this.apply('neg', [id]);
  }
  /** Is it 1 or -1? */
  isUnit(id: NodeId): boolean {
    return this.isConstant(id) && Math.abs(this.constantValue(id)) === 1;
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
