import type { Graph, NodeId } from './graph.js';

/**
 * Prints nodes as straight-line code. A node used once is written in place, others become constants. Long functions
 * are cut into chunks (V8 leaves a function of more than about 60 kB of bytecode unoptimised); values that cross from
 * one chunk to another go through one array.
 */
export interface Output {
  readonly array: string;
  readonly index: number;
  readonly node: NodeId;
}

export interface Dialect {
  readonly state: (index: number) => string;
  readonly command: (index: number) => string;
  readonly memory: (index: number) => string;
  readonly step: string;
  readonly math: (name: string) => string;
  readonly number: (value: number) => string;
  /** A number in an arm of a choice: text that needs nothing when it is first met. */
  readonly literal: (value: number) => string;
  readonly local: string;
  readonly equals: string;
  readonly differs: string;
  readonly infinity: string;
}

export const javaScript: Dialect = {
  state: (index) => `y[${index}]`,
  command: (index) => `u[${index}]`,
  memory: (index) => `m[${index}]`,
  step: 'h',
  math: (name) => `Math.${name}`,
  number: numberText,
  literal: numberText,
  local: 'const ',
  equals: '===',
  differs: '!==',
  infinity: 'Infinity',
};

export const cLanguage: Dialect = {
  state: (index) => `y[${index}]`,
  command: (index) => `u[${index}]`,
  memory: (index) => `m[${index}]`,
  step: 'h',
  math: (name) => ({ abs: 'fabs', min: 'oilspring_min', max: 'oilspring_max', sign: 'oilspring_sign' })[name] ?? name,
  number: cNumber,
  literal: cNumber,
  local: 'const double ',
  equals: '==',
  differs: '!=',
  infinity: 'INFINITY',
};

function cNumber(value: number): string {
  const text = numberText(value);
  return /[.e]/i.test(text) ? text : text.startsWith('(') ? `${text.slice(0, -1)}.0)` : `${text}.0`;
}

function numberText(value: number): string {
  if (Object.is(value, -0)) return '(-0.0)';
  if (!Number.isFinite(value)) throw new Error(`a constant of the circuit is ${value}`);
  return value < 0 ? `(${value})` : String(value);
}

const infix = new Set(['+', '-', '*', '/']);
const comparisons = new Set(['<', '<=', '>', '>=', '===', '!==']);
const boolean = new Set([...comparisons, '&&', '||', '!']);

export interface Chunk {
  readonly lines: string[];
}

/** Operations in one function, at most. */
export const chunkSize = 1800;

/** Cuts `outputs` into chunks of at most `most` operations. */
export function printChunks(
  graph: Graph,
  outputs: readonly Output[],
  dialect: Dialect,
  most = chunkSize,
): { chunks: Chunk[]; spills: number } {
  const uses = new Map<NodeId, number>();
  const order: NodeId[] = [];
  const operandsOf = (id: NodeId) => graph.nodes[id]!.operands.map((operand) => throughLaw(graph, operand));
  const visit = (given: NodeId) => {
    const root = throughLaw(graph, given);
    const stack: [NodeId, number][] = [[root, 0]];
    uses.set(root, (uses.get(root) ?? 0) + 1);
    if (uses.get(root)! > 1) return;
    while (stack.length > 0) {
      const top = stack[stack.length - 1]!;
      const operands = operandsOf(top[0]);
      if (top[1] === operands.length) {
        order.push(top[0]);
        stack.pop();
        continue;
      }
      const next = operands[top[1]]!;
      top[1] += 1;
      const seen = uses.get(next) ?? 0;
      uses.set(next, seen + 1);
      if (seen === 0) stack.push([next, 0]);
    }
  };
  for (const output of outputs) visit(output.node);

  const chunkOf = new Map<NodeId, number>();
  let chunk = 0;
  let inChunk = 0;
  for (const id of order) {
    if (isLeaf(graph, id)) continue;
    if (inChunk >= most) {
      chunk += 1;
      inChunk = 0;
    }
    chunkOf.set(id, chunk);
    inChunk += 1;
  }
  const chunkCount = chunk + 1;

  // a node must be reachable in a later chunk by its spill slot; single-use nodes are printed in the chunk of their user
  const spill = new Map<NodeId, number>();
  for (const id of order) {
    const mine = chunkOf.get(id);
    for (const target of operandsOf(id)) {
      const theirs = chunkOf.get(target);
      if (theirs !== undefined && theirs !== mine && !spill.has(target)) spill.set(target, spill.size);
    }
  }

  const chunks: Chunk[] = Array.from({ length: chunkCount }, () => ({ lines: [] }));
  const printed = new Map<NodeId, string>();
  const text = (id: NodeId, at: number): string => {
    const target = throughLaw(graph, id);
    const node = graph.nodes[target]!;
    switch (node.op) {
      case 'const':
        return dialect.number(node.value);
      case 'state':
        return dialect.state(node.value);
      case 'command':
        return dialect.command(node.value);
      case 'memory':
        return dialect.memory(node.value);
      case 'step':
        return dialect.step;
      default:
    }
    const mine = chunkOf.get(target)!;
    if (mine !== at) return `w[${spill.get(target)!}]`;
    const name = printed.get(target);
    return name ?? expression(target, at);
  };
  /** An arm of a choice: a name or a number, so that taking it needs nothing that was never run before. */
  const leafNames = new Set<string>();
  const arm = (id: NodeId, at: number): string => {
    const target = throughLaw(graph, id);
    const node = graph.nodes[target]!;
    if (node.op === 'const') return dialect.literal(node.value);
    const mine = chunkOf.get(target);
    if (mine === at && printed.has(target)) return printed.get(target)!;
    // a leaf, or a value of an earlier chunk
    const name = `l${target}_${at}`;
    if (!leafNames.has(name)) {
      leafNames.add(name);
      chunks[at]!.lines.push(`${dialect.local}${name} = ${text(target, at)};`);
    }
    return name;
  };
  const condition = (id: NodeId, at: number): string => {
    const target = throughLaw(graph, id);
    const node = graph.nodes[target]!;
    const inPlace = chunkOf.get(target) === at && !printed.has(target);
    if (comparisons.has(node.op) && inPlace) return comparison(target, at);
    return `(${text(id, at)} ${dialect.differs} 0)`;
  };
  const comparison = (id: NodeId, at: number): string => {
    const node = graph.nodes[id]!;
    const op = node.op === '===' ? dialect.equals : node.op === '!==' ? dialect.differs : node.op;
    return `(${text(node.operands[0]!, at)} ${op} ${text(node.operands[1]!, at)})`;
  };
  /** A truth value as 1 or 0; a number counts as true when it is not 0. */
  const truth = (id: NodeId, at: number): string =>
    boolean.has(graph.nodes[throughLaw(graph, id)]!.op)
      ? text(id, at)
      : `(${text(id, at)} ${dialect.differs} 0 ? 1 : 0)`;
  const expression = (id: NodeId, at: number): string => {
    const node = graph.nodes[id]!;
    const [a, b, c] = node.operands as [NodeId, NodeId, NodeId];
    if (comparisons.has(node.op)) return `(${comparison(id, at)} ? 1 : 0)`;
    switch (node.op) {
      case 'neg':
        return `(-${text(a, at)})`;
      case '?':
        return `(${condition(a, at)} ? ${arm(b, at)} : ${arm(c, at)})`;
      case 'min':
      case 'max': {
        const sides = heldBy(graph, operandsOf(id));
        if (!sides) break;
        const [limit, held] = [graph.nodes[sides[0]]!.value, arm(sides[1], at)];
        // to the bit what the library function gives, signs of zero and what is no number included
        const beyond = node.op === 'max' ? (limit === 0 ? '<=' : '<') : '>';
        return `(${held} ${beyond} ${dialect.number(limit)} ? ${dialect.literal(limit)} : ${held})`;
      }
      case '!':
        return `(1 - ${truth(a, at)})`;
      case '&&':
        return `(${truth(a, at)} * ${truth(b, at)})`;
      case '||':
        return `${dialect.math('max')}(${truth(a, at)}, ${truth(b, at)})`;
      default:
    }
    if (infix.has(node.op)) return `(${text(a, at)} ${node.op} ${text(b, at)})`;
    return `${dialect.math(node.op)}(${node.operands.map((operand) => text(operand, at)).join(', ')})`;
  };
  // Both arms of a choice are computed ahead of it: code that runs for the first time when a relief valve opens would
  // make V8 throw the optimised function away in the middle of a live run.
  const arms = new Set<NodeId>();
  for (const id of order) {
    const { op } = graph.nodes[id]!;
    if (op === '?') for (const arm of operandsOf(id).slice(1)) arms.add(arm);
    // printed twice
    if (op === 'min' || op === 'max') for (const side of operandsOf(id)) arms.add(side);
  }
  const depth = new Map<NodeId, number>();
  for (const id of order) {
    if (isLeaf(graph, id)) continue;
    const at = chunkOf.get(id)!;
    const below = Math.max(0, ...operandsOf(id).map((operand) => depth.get(operand) ?? 0));
    const spilled = spill.get(id);
    if (uses.get(id) === 1 && spilled === undefined && below < 12 && !arms.has(id)) {
      depth.set(id, below + 1);
      continue;
    }
    depth.set(id, 0);
    const lines = chunks[at]!.lines;
    lines.push(`${dialect.local}v${id} = ${expression(id, at)};`);
    printed.set(id, `v${id}`);
    if (spilled !== undefined) lines.push(`w[${spilled}] = v${id};`);
  }
  for (const output of outputs) {
    const target = throughLaw(graph, output.node);
    const at = isLeaf(graph, target) ? chunkCount - 1 : chunkOf.get(target)!;
    chunks[at]!.lines.push(`${output.array}[${output.index}] = ${text(target, at)};`);
  }
  return { chunks, spills: spill.size };
}

function throughLaw(graph: Graph, id: NodeId): NodeId {
  let at = id;
  while (graph.nodes[at]!.op === 'law') at = graph.nodes[at]!.operands[0]!;
  return at;
}

/** The constant and the other operand of a minimum or maximum with one constant that is no negative zero. */
function heldBy(graph: Graph, [a, b]: readonly NodeId[]): [NodeId, NodeId] | undefined {
  const limit = (id: NodeId) =>
    graph.isConstant(id) && !Object.is(graph.constantValue(id), -0) && !Number.isNaN(graph.constantValue(id));
  return limit(a!) ? [a!, b!] : limit(b!) ? [b!, a!] : undefined;
}

function isLeaf(graph: Graph, id: NodeId): boolean {
  const op = graph.nodes[id]!.op;
  return op === 'const' || op === 'state' || op === 'command' || op === 'memory' || op === 'step';
}

/** A JavaScript function over the arrays named in `parameters` that fills all outputs; `w` is its own spill array. */
export function printFunction(
  graph: Graph,
  name: string,
  parameters: readonly string[],
  outputs: readonly Output[],
  most = chunkSize,
): string {
  const { chunks, spills } = printChunks(graph, outputs, javaScript, most);
  const list = parameters.join(', ');
  if (chunks.length === 1) return `function ${name}(${list}) {\n${indent(chunks[0]!.lines)}\n}`;
  const parts = chunks.map((chunk, i) => `function ${name}${i}(${list}, w) {\n${indent(chunk.lines)}\n}`);
  const calls = chunks.map((_, i) => `${name}${i}(${list}, ${name}W);`);
  return `const ${name}W = new Float64Array(${Math.max(1, spills)});\n${parts.join('\n')}\nfunction ${name}(${list}) {\n${indent(calls)}\n}`;
}

export function indent(lines: readonly string[]): string {
  return lines.map((line) => `  ${line}`).join('\n');
}
