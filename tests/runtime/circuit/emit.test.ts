import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type Output, printFunction } from '../../../runtime/circuit/emit.js';
import { Graph, type NodeId, type Operation } from '../../../runtime/circuit/graph.js';

type Code = (y: Float64Array, out: Float64Array) => void;
const compiled = (graph: Graph, outputs: readonly Output[], most?: number): Code =>
  new Function(`${printFunction(graph, 'f', ['y', 'out'], outputs, most)}\nreturn f;`)() as Code;

const binary: Operation[] = ['+', '-', '*', '/', '<', '<=', '>', '>=', '===', '!==', '&&', '||', 'min', 'max'];
const unary: Operation[] = ['neg', '!', 'abs', 'sign', 'floor', 'tanh'];

/** Value of a node by its meaning, truth as 1 and 0. */
function meaning(graph: Graph, y: Float64Array): (id: NodeId) => number {
  const known = new Map<NodeId, number>();
  const value = (id: NodeId): number => {
    const before = known.get(id);
    if (before !== undefined) return before;
    const { op, operands, value: own } = graph.nodes[id]!;
    const x = operands.map(value) as [number, number, number];
    const result = (() => {
      switch (op) {
        case 'const':
          return own;
        case 'state':
          return y[own]!;
        case '+':
          return x[0] + x[1];
        case '-':
          return x[0] - x[1];
        case '*':
          return x[0] * x[1];
        case '/':
          return x[0] / x[1];
        case 'neg':
          return -x[0];
        case '<':
          return Number(x[0] < x[1]);
        case '<=':
          return Number(x[0] <= x[1]);
        case '>':
          return Number(x[0] > x[1]);
        case '>=':
          return Number(x[0] >= x[1]);
        case '===':
          return Number(x[0] === x[1]);
        case '!==':
          return Number(x[0] !== x[1]);
        case '&&':
          return Number(x[0] !== 0 && x[1] !== 0);
        case '||':
          return Number(x[0] !== 0 || x[1] !== 0);
        case '!':
          return Number(x[0] === 0);
        case '?':
          return x[0] !== 0 ? x[1] : x[2];
        case 'min':
          return Math.min(x[0], x[1]);
        case 'max':
          return Math.max(x[0], x[1]);
        default:
          return Math[op as 'abs'](x[0]);
      }
    })();
    known.set(id, result);
    return result;
  };
  return value;
}

describe('cutting code into chunks', () => {
  it('carries a truth value from one chunk to another, used as a condition and as a number', () => {
    const graph = new Graph(2);
    const truth = graph.apply('<', [graph.state(0), graph.state(1)]);
    const both = graph.apply('&&', [truth, graph.apply('>', [graph.state(1), graph.constant(0)])]);
    const nodes = [
      graph.apply('?', [
        truth,
        graph.apply('+', [graph.state(0), graph.constant(1)]),
        graph.apply('*', [graph.state(1), graph.constant(3)]),
      ]),
      graph.apply('?', [both, graph.state(0), graph.state(1)]),
      graph.apply('!', [both]),
      truth,
    ];
    const outputs = nodes.map((node, index) => ({ array: 'out', index, node }));
    for (const most of [1, 2, 3, 4, 5]) {
      const f = compiled(graph, outputs, most);
      const out = new Float64Array(4);
      f(Float64Array.of(1, 2), out);
      expect([...out], `${most} operations`).toEqual([2, 1, 0, 1]);
      f(Float64Array.of(2, 1), out);
      expect([...out], `${most} operations`).toEqual([3, 1, 1, 0]);
    }
  });

  it('gives the bits of the uncut code and of the meaning, for any expressions and any chunk size', () => {
    const step = fc.tuple(fc.nat(), fc.nat(), fc.nat(), fc.nat());
    fc.assert(
      fc.property(
        fc.array(step, { minLength: 3, maxLength: 60 }),
        fc.integer({ min: 1, max: 40 }),
        fc.array(fc.double({ min: -3, max: 3, noNaN: true }), { minLength: 4, maxLength: 4 }),
        (steps, most, values) => {
          const graph = new Graph(4);
          const nodes: NodeId[] = [0, 1, 2, 3].map((i) => graph.state(i));
          nodes.push(graph.constant(0), graph.constant(1.5));
          for (const [which, a, b, c] of steps) {
            const pick = (k: number) => nodes[k % nodes.length]!;
            const kinds = binary.length + unary.length + 3;
            const kind = which % kinds;
            if (kind < binary.length) nodes.push(graph.apply(binary[kind]!, [pick(a), pick(b)]));
            else if (kind < binary.length + unary.length)
              nodes.push(graph.apply(unary[kind - binary.length]!, [pick(a)]));
            else nodes.push(graph.apply('?', [pick(a), pick(b), pick(c)]));
          }
          fc.pre(graph.nodes.every(({ op, value }) => op !== 'const' || Number.isFinite(value)));
          const outputs = nodes.slice(-12).map((node, index) => ({ array: 'out', index, node }));
          const y = Float64Array.from(values);
          const whole = new Float64Array(outputs.length);
          const cut = new Float64Array(outputs.length);
          compiled(graph, outputs)(y, whole);
          compiled(graph, outputs, most)(y, cut);
          const value = meaning(graph, y);
          outputs.forEach(({ node }, i) => {
            expect(Object.is(cut[i], whole[i])).toBe(true);
            const meant = value(node);
            expect(Object.is(whole[i], meant), `${whole[i]}, ${meant}`).toBe(true);
          });
        },
      ),
      { numRuns: 400 },
    );
  });
});
