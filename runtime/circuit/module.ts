import { rodas3Stages } from '../solver/rodas3-code.js';
import type { Elimination } from './elimination.js';
import { type Dialect, javaScript, type Output, printChunks } from './emit.js';
import type { Graph } from './graph.js';

/**
 * The functions that a step is made of, compiled around one block of numbers that the code knows by its address: V8
 * then leaves out every check of a bound, and the code is half as long, which is what the processor's instruction cache
 * asks for. Whoever steps a circuit puts states, commands and memory into these arrays first and takes them out after.
 */
export interface CircuitModule {
  /** States. */ readonly y: Float64Array;
  /** Commands. */ readonly u: Float64Array;
  /** Memory. */ readonly m: Float64Array;
  /** dy/dt at `y`, then the ledger rates: supplied, left, brought per stuff. */ readonly d: Float64Array;
  /** Values of the Jacobian at `y`, after `factor` the factors of c I - J; last the least pivot over c. */
  readonly J: Float64Array;
  /** A stage's state; after `stageThree` the new state. */ readonly s: Float64Array;
  /** dy/dt at `s`. */ readonly b: Float64Array;
  /** Stages' increments; `k1` is also what `solve` finds. */ readonly k1: Float64Array;
  /** The largest weighted error estimate: for the safety net, for strides. */ readonly e: Float64Array;
  /** New memory. */ readonly n: Float64Array;
  /** Readings, ledger rates, total energy, holdings at `y`. */ readonly o: Float64Array;
  /** Length h of the substep, s, and c of the factors, 1/s. */ readonly t: Float64Array;
  /** b = dy/dt at s. */ rates(): void;
  ratesAndJacobian(): void;
  /** n = memory after a substep of length t[0] that has led to s. */ update(): void;
  observe(): void;
  factor(): void;
  /** k1 = M^-1 d. */ solve(): void;
  stageOne(): void;
  stageTwo(): void;
  stageThree(): void;
  strideError(): void;
}

export interface ModuleInput {
  readonly graph: Graph;
  readonly outputs: {
    readonly rates: readonly Output[];
    readonly ratesAndJacobian: readonly Output[];
    readonly update: readonly Output[];
    readonly observe: readonly Output[];
  };
  readonly elimination: Elimination;
  readonly commands: number;
  readonly entries: number;
  readonly errorWeights: readonly number[];
  readonly strideWeights: readonly number[];
  /** Operations in one function, at most. */
  readonly most: number;
}

const functionNames = [
  'rates',
  'ratesAndJacobian',
  'update',
  'observe',
  'factor',
  'solve',
  'stageOne',
  'stageTwo',
  'stageThree',
  'strideError',
] as const;
let made = 0;

export function compileModule(input: ModuleInput): CircuitModule {
  const { graph, outputs, elimination, errorWeights, strideWeights, most } = input;
  const states = errorWeights.length;
  const pool: number[] = [];
  const pooled = new Map<string, number>();
  /** Numbers stand in the block too: shorter than numbers in the code. */
  const number = (value: number): string => {
    if (Object.is(value, 0)) return '0';
    const key = Object.is(value, -0) ? '-0' : String(value);
    let at = pooled.get(key);
    if (at === undefined) {
      at = pool.length;
      pool.push(value);
      pooled.set(key, at);
    }
    return `K[${at}]`;
  };
  const dialect: Dialect = { ...javaScript, number, step: 't[0]' };
  let spillCount = 0;
  const parts: string[] = [];
  const write = (name: string, pieces: readonly (readonly string[])[]) => {
    const body = (lines: readonly string[]) => lines.join('\n');
    if (pieces.length === 1) parts.push(`function ${name}() {\n${body(pieces[0]!)}\n}`);
    else {
      for (const [i, lines] of pieces.entries()) parts.push(`function ${name}${i}() {\n${body(lines)}\n}`);
      parts.push(`function ${name}() {\n${pieces.map((_, i) => `${name}${i}();`).join('\n')}\n}`);
    }
  };
  const evaluation = (name: string, list: readonly Output[], array: Readonly<Record<string, string>>, state = 'y') => {
    const { chunks, spills } = printChunks(
      graph,
      list.map((output) => ({ ...output, array: array[output.array] ?? output.array })),
      { ...dialect, state: (index) => `${state}[${index}]` },
      most,
    );
    spillCount = Math.max(spillCount, spills);
    write(
      name,
      chunks.map((chunk) => chunk.lines),
    );
  };
  evaluation('rates', outputs.rates, { d: 'b' }, 's');
  evaluation('ratesAndJacobian', outputs.ratesAndJacobian, {});
  evaluation('update', outputs.update, { out: 'n' }, 's');
  evaluation('observe', outputs.observe, { out: 'o' });
  const straight = (name: string, before: string, lines: readonly string[]) => {
    const size = elimination.cut ? 400 : lines.length;
    const pieces: string[][] = [];
    for (let i = 0; i < Math.max(1, lines.length); i += Math.max(1, size))
      pieces.push([before, ...lines.slice(i, i + size)]);
    write(name, pieces);
  };
  straight('factor', 'const c = t[1];', elimination.factorLines(dialect));
  straight(
    'solve',
    '',
    elimination.solveLines(dialect, 'k1', (state) => `d[${state}]`),
  );
  for (const { name, lines } of rodas3Stages(elimination, errorWeights, strideWeights, dialect))
    straight(name, 'const h = t[0];', lines);

  const sizes: Record<string, number> = {
    y: states,
    s: states,
    u: input.commands,
    m: outputs.update.length,
    t: 2,
    e: 2,
    K: pool.length,
    d: outputs.ratesAndJacobian.length - input.entries,
    b: states,
    k1: states,
    k2: states,
    k3: states,
    k4: states,
    J: elimination.size + 1,
    w: spillCount,
    n: outputs.update.length,
    o: outputs.observe.length,
  };
  const offsets: Record<string, number> = {};
  // never so short that V8 keeps it on its heap, where it may move
  let length = 16;
  for (const [name, size] of Object.entries(sizes)) {
    offsets[name] = length;
    length += size;
  }
  const block = new Float64Array(length);
  const array = (name: string) => block.subarray(offsets[name]!, offsets[name]! + sizes[name]!);
  array('K').set(pool);
  const code = parts
    .join('\n')
    .replace(
      /\b(y|s|u|m|t|e|K|d|b|k1|k2|k3|k4|J|w|n|o)\[(\d+)\]/g,
      (_, name: string, index: string) => `a[${offsets[name]! + Number(index)}]`,
    );
  made += 1;
  // its own text each time: functions of equal text share what V8 has learned, and with it lose the block's address
  const functions = new Function(
    'block',
    `'use strict'; // circuit ${made}\nconst a = block;\n${code}\nreturn { ${functionNames.join(', ')} };`,
  )(block) as Pick<CircuitModule, (typeof functionNames)[number]>;
  return {
    ...functions,
    y: array('y'),
    u: array('u'),
    m: array('m'),
    d: array('d'),
    J: array('J'),
    s: array('s'),
    b: array('b'),
    k1: array('k1'),
    e: array('e'),
    n: array('n'),
    o: array('o'),
    t: array('t'),
  };
}

/**
 * Runs each function a few times before anything else does, first on what is no number and then on numbers that are not
 * whole: V8 takes a value that happened to be whole in the first calls for an integer, works with integers from then on,
 * and throws the optimised code away when it is not, in mid-run.
 */
export function trainModule(
  module: CircuitModule,
  start: {
    readonly states: readonly { readonly initial: number; readonly scale: number }[];
    readonly memory: readonly { readonly initial: number }[];
    readonly commands: readonly { readonly rest: number }[];
  },
): void {
  const { y, u, m, d, J, s, b, k1, t } = module;
  const odd = (i: number, k: number) => 0.1 + 0.5 * Math.abs(Math.sin(12.9898 * (i + 1) + 78.233 * (k + 1)));
  const run = () => {
    module.update();
    module.observe();
    module.rates();
    module.ratesAndJacobian();
    module.factor();
    module.solve();
    module.stageOne();
    module.stageTwo();
    module.stageThree();
    module.strideError();
  };
  for (let k = 0; k < 24; k += 1) {
    t[0] = 2.5e-4;
    t[1] = 8000;
    start.states.forEach((state, i) => {
      y[i] = state.initial * (0.9 + 0.2 * odd(i, k)) + (state.initial === 0 ? state.scale * odd(i, k) * 0.1 : 0);
    });
    s.set(y);
    start.commands.forEach((command, i) => {
      u[i] = command.rest + (k % 2 === 0 ? odd(i, k) : -odd(i, k));
    });
    start.memory.forEach((slot, i) => {
      m[i] = slot.initial + odd(i, k);
    });
    // V8 begins to take notes after a few calls
    if (k % 2 === 1) for (const array of [y, u, m, s, t]) array.fill(Number.NaN);
    run();
  }
  for (const array of [d, J, b, k1]) array.fill(0);
}
