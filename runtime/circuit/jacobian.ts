import type { Graph, NodeId } from './graph.js';

/**
 * The exact Jacobian of a circuit by elimination of intermediate values: the graph of the rates with the partial
 * derivative of each operation by each of its operands as the weights of its edges; then one intermediate value after
 * another is removed and its edges are multiplied into those around it (Griewank and Walther, Evaluating Derivatives, 2008,
 * chapter 9). The order is the cheapest next one (Markowitz 1957); of equals the last, so that it is the same everywhere.
 */
export interface JacobianEntries {
  readonly rows: readonly number[];
  readonly columns: readonly number[];
  readonly nodes: readonly NodeId[];
}

type Edges = Map<number, NodeId>;

export function jacobian(graph: Graph, rates: readonly NodeId[]): JacobianEntries {
  // vertices are node ids; the sink of rate i is -1 - i
  const from = new Map<number, Edges>();
  const to = new Map<number, Edges>();
  const edges = (table: Map<number, Edges>, vertex: number): Edges => {
    let found = table.get(vertex);
    if (!found) {
      found = new Map();
      table.set(vertex, found);
    }
    return found;
  };
  const connect = (operand: NodeId, vertex: number, weight: NodeId) => {
    if (graph.isZero(weight)) return;
    const into = edges(from, vertex);
    const known = into.get(operand);
    const sum = known === undefined ? weight : graph.sum(known, weight);
    if (known !== undefined && isNumber(known) && isNumber(weight)) numbers.add(sum);
    into.set(operand, sum);
    edges(to, operand).set(vertex, sum);
  };
  const always = unconditional(graph, rates);
  // weights that are numbers whatever arms of choices are taken
  const numbers = new Set<NodeId>();
  const isNumber = (weight: NodeId) => graph.isConstant(weight) || numbers.has(weight);
  const inner: NodeId[] = [];
  const seen = new Set<NodeId>();
  const visit = (root: NodeId) => {
    const stack: NodeId[] = [root];
    while (stack.length > 0) {
      const id = stack.pop()!;
      if (seen.has(id) || !graph.dependsOnStates(id)) continue;
      seen.add(id);
      if (graph.stateOf(id) !== undefined) continue;
      inner.push(id);
      for (const [operand, weight] of graph.partials(id)) {
        if (!graph.dependsOnStates(operand)) continue;
        if (always.has(id)) numbers.add(weight);
        connect(operand, id, weight);
        stack.push(operand);
      }
    }
  };
  const one = graph.constant(1);
  rates.forEach((node, i) => {
    visit(node);
    if (graph.dependsOnStates(node)) connect(node, -1 - i, one);
  });

  const none: Edges = new Map();
  const costs = new Map<NodeId, number>();
  const cost = (vertex: NodeId): number => (from.get(vertex) ?? none).size * (to.get(vertex) ?? none).size;
  inner.sort((a, b) => a - b);
  for (const vertex of inner) costs.set(vertex, cost(vertex));
  while (costs.size > 0) {
    let best = -1;
    let least = Number.POSITIVE_INFINITY;
    for (const [vertex, price] of costs) {
      if (price <= least) {
        best = vertex;
        least = price;
      }
    }
    costs.delete(best);
    const into = from.get(best) ?? none;
    const out = to.get(best) ?? none;
    for (const operand of into.keys()) to.get(operand)!.delete(best);
    for (const vertex of out.keys()) from.get(vertex)!.delete(best);
    for (const [vertex, weight] of out) {
      for (const [operand, inside] of into) {
        const both = isNumber(weight) && isNumber(inside);
        const product = graph.product(weight, inside, both);
        if (both) numbers.add(product);
        connect(operand, vertex, product);
      }
    }
    from.delete(best);
    to.delete(best);
    for (const vertex of new Set([...into.keys(), ...out.keys()]))
      if (costs.has(vertex)) costs.set(vertex, cost(vertex));
  }

  const rows: number[] = [];
  const columns: number[] = [];
  const nodes: NodeId[] = [];
  rates.forEach((_, row) => {
    const entries = [...(from.get(-1 - row) ?? none)].map(
      ([state, weight]) => [graph.stateOf(state)!, weight] as const,
    );
    entries.sort((a, b) => a[0] - b[0]);
    for (const [column, weight] of entries) {
      if (graph.isZero(weight)) continue;
      rows.push(row);
      columns.push(column);
      nodes.push(weight);
    }
  });
  return { rows, columns, nodes };
}

/** Nodes that the rates need whatever arms of choices are taken. */
function unconditional(graph: Graph, rates: readonly NodeId[]): ReadonlySet<NodeId> {
  const found = new Set<NodeId>();
  const stack = [...rates];
  while (stack.length > 0) {
    const id = stack.pop()!;
    if (found.has(id)) continue;
    found.add(id);
    const { op, operands } = graph.nodes[id]!;
    stack.push(...(op === '?' ? [operands[0]!] : operands));
    if (op === 'law') stack.push(...graph.partials(id).map(([argument]) => argument));
  }
  return found;
}
