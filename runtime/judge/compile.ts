import type { BlockLayout } from '../block.js';
import { BuildError, type Problem } from '../contract.js';
import type { SignalTable } from '../signals.js';
import { examineFormula } from './examine.js';
import { type Expression, eachSignal, type Formula, horizon, marginUnits, type Requirement } from './formula.js';
import { Outermost, type OutermostNode, outermost } from './outermost.js';
import { type Operation, operation, Program } from './program.js';
import { extremeSlots, powerOfTwo, untilSlots } from './window.js';

/** What the monitor needs of one requirement. */
export interface CompiledRequirement {
  readonly requirement: Requirement;
  readonly unit: string;
  /** Node of the outermost program whose values are the requirement's. */
  readonly root: number;
  /** First slot of each trigger in the block; empty without `given`. */
  readonly triggers: readonly number[];
  readonly horizon: number;
}

export interface CompiledRequirements {
  readonly program: Program;
  readonly outermost: Outermost;
  readonly requirements: readonly CompiledRequirement[];
  /** Ticks to go on behind the end of a run until everything is known. */
  readonly lookAhead: number;
  readonly depth: number;
}

const lastTick = Number.MAX_SAFE_INTEGER;

/**
 * Compiles requirements into one program; what they have in common is computed once. Results, triggers and outermost
 * extremes take slots of `layout`, history (windows, delays, sums) slots of `windows`. Throws BuildError with everything that
 * is wrong: unknown signals, formulas that say no time, unbounded operators inside others.
 */
export function compile(
  requirements: readonly Requirement[],
  signals: SignalTable,
  step: number,
  layout: BlockLayout,
  windows: BlockLayout,
): CompiledRequirements {
  const problems: Problem[] = [];
  const ids = new Set<string>();
  for (const requirement of requirements) {
    const path = `requirements.${requirement.id}`;
    if (ids.has(requirement.id))
      problems.push({ path, what: 'id used twice', remedy: 'give each requirement its own id' });
    ids.add(requirement.id);
    for (const problem of examineFormula(requirement.formula))
      problems.push({ path, what: problem.what, remedy: problem.remedy });
    const asked = new Set<string>();
    eachSignal(requirement.formula, (name) => asked.add(name));
    for (const name of asked) {
      if (signals.find(name) >= 0) continue;
      const near = signals.nearest(name);
      problems.push({
        path,
        what: 'no such signal',
        value: name,
        remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see the signal list of the bench',
      });
    }
  }
  if (problems.length > 0) throw new BuildError(problems);

  const compiler = new Compiler(signals, layout, windows);
  const compiled = requirements.map((requirement) => compiler.requirement(requirement));
  return {
    program: new Program(compiler.operations, compiler.constants, compiler.registers, step),
    outermost: new Outermost(compiler.nodes),
    requirements: compiled,
    lookAhead: compiler.lookAhead,
    depth: compiler.depth,
  };
}

interface Value {
  readonly register: number;
  readonly horizon: number;
}

class Compiler {
  readonly operations: Operation[] = [];
  readonly constants: [number, number][] = [];
  readonly nodes: OutermostNode[] = [];
  registers = 0;
  lookAhead = 0;
  /** Greatest nesting of begins and ends: behind the end of the run plus this many ticks nothing known is left. */
  depth = 0;
  private readonly known = new Map<string, number>();
  private triggers: number[] = [];
  private id = '';

  constructor(
    private readonly signals: SignalTable,
    private readonly layout: BlockLayout,
    private readonly windows: BlockLayout,
  ) {}

  requirement(requirement: Requirement): CompiledRequirement {
    this.triggers = [];
    this.id = requirement.id;
    const root = this.outer(requirement.formula, 1);
    return {
      requirement,
      unit: [...marginUnits(requirement.formula)][0] ?? '1',
      root,
      triggers: [...new Set(this.triggers)],
      horizon: horizon(requirement.formula),
    };
  }

  private outer(formula: Formula, polarity: number): number {
    switch (formula.is) {
      case 'and':
      case 'or':
        return this.node({
          kind: outermost[formula.is],
          a: this.outer(formula.left, polarity),
          b: this.outer(formula.right, polarity),
        });
      case 'implies': {
        const not = this.node({ kind: outermost.not, a: this.outer(formula.left, -polarity) });
        return this.node({ kind: outermost.or, a: not, b: this.outer(formula.right, polarity) });
      }
      case 'not':
        return this.node({ kind: outermost.not, a: this.outer(formula.of, -polarity) });
      case 'always':
      case 'eventually': {
        const body = this.inner(formula.of, polarity, formula.from, formula.to ?? lastTick);
        this.lookAhead = Math.max(this.lookAhead, body.horizon);
        const slot = this.layout.add(`judge.${this.id}.extreme`, formula.is === 'always' ? Infinity : -Infinity);
        this.layout.add(`judge.${this.id}.extremeTick`, -1);
        return this.node({
          kind: outermost[formula.is],
          body: body.register,
          horizon: body.horizon,
          from: formula.from,
          to: formula.to,
          slot,
        });
      }
      case 'until': {
        const last = formula.to ?? lastTick;
        const left = this.inner(formula.left, polarity, 0, last);
        const right = this.inner(formula.right, polarity, formula.from, last);
        const ahead = Math.max(left.horizon, right.horizon);
        this.lookAhead = Math.max(this.lookAhead, ahead);
        const slot = this.layout.add(`judge.${this.id}.best`, -Infinity);
        this.layout.add(`judge.${this.id}.bestTick`, -1);
        this.layout.add(`judge.${this.id}.leastBefore`, Infinity);
        return this.node({
          kind: outermost.until,
          body: this.delayed(left, ahead).register,
          second: this.delayed(right, ahead).register,
          horizon: ahead,
          from: formula.from,
          to: formula.to,
          slot,
        });
      }
      case 'start':
      case 'end': {
        const body = this.inner(formula.of, polarity, 0, formula.is === 'start' ? 0 : lastTick);
        this.lookAhead = Math.max(this.lookAhead, body.horizon);
        const slot = this.layout.add(`judge.${this.id}.${formula.is}`, 0);
        this.layout.add(`judge.${this.id}.${formula.is}Tick`, -1);
        return this.node({ kind: outermost[formula.is], body: body.register, horizon: body.horizon, slot });
      }
      default:
        throw new Error(`${formula.is} stands outermost`);
    }
  }

  private node(node: Partial<OutermostNode> & { readonly kind: number }): number {
    this.nodes.push({ a: 0, b: 0, body: 0, second: 0, horizon: 0, from: 0, to: null, slot: 0, ...node });
    return this.nodes.length - 1;
  }

  /** `first` .. `last`: the ticks at which the result is asked for; triggers count only there. Empty: they do not count. */
  private inner(formula: Formula, polarity: number, first: number, last: number, nesting = 0): Value {
    this.depth = Math.max(this.depth, nesting);
    const inside = (part: Formula, sign = polarity) => this.inner(part, sign, first, last, nesting);
    switch (formula.is) {
      case 'compare':
        return this.compare(formula, polarity);
      case 'and':
      case 'or':
        return this.both(operation[formula.is], inside(formula.left), inside(formula.right));
      case 'implies':
        return this.both(operation.or, this.not(inside(formula.left, -polarity)), inside(formula.right));
      case 'not':
        return this.not(inside(formula.of, -polarity));
      case 'given': {
        const condition = inside(formula.condition, -polarity);
        this.trigger(condition, first, last);
        return this.both(operation.given, condition, inside(formula.consequence));
      }
      case 'happens': {
        const of = inside(formula.of);
        return this.emit({ kind: operation.happens, a: of.register }, of.horizon, 0);
      }
      case 'begins':
      case 'ends': {
        const now = this.inner(formula.of, formula.is === 'begins' ? polarity : -polarity, first, last, nesting + 1);
        // The tick before counts no triggers: each would be counted twice.
        const other = this.inner(
          formula.of,
          formula.is === 'begins' ? -polarity : polarity,
          Infinity,
          -Infinity,
          nesting + 1,
        );
        const previous = this.emit(
          { kind: operation.previous, a: other.register, constant: formula.is === 'begins' ? Infinity : -Infinity },
          other.horizon,
          1,
        );
        return formula.is === 'begins'
          ? this.both(operation.and, now, this.not(previous))
          : this.both(operation.and, this.not(now), previous);
      }
      case 'always':
      case 'eventually': {
        const from = formula.from;
        const to = formula.to!;
        const body = this.inner(formula.of, polarity, first + from, later(last, to), nesting);
        return this.extreme(body, formula.is === 'always' ? -1 : 1, from, to);
      }
      case 'until': {
        const from = formula.from;
        const to = formula.to!;
        const end = later(last, to);
        const left = this.inner(formula.left, polarity, first, end, nesting);
        const right = this.inner(formula.right, polarity, first + from, end, nesting);
        const ahead = Math.max(left.horizon, right.horizon);
        const width = to - from;
        const [a, b] = [this.delayed(left, ahead), this.delayed(right, ahead)];
        const mask = powerOfTwo(width + 1) - 1;
        const until = this.emit(
          { kind: operation.until, a: a.register, b: b.register, span: width, mask },
          ahead,
          untilSlots(width),
          to,
        );
        // What comes before the interval opens must hold throughout: left in [t, t + from).
        return from === 0 ? until : this.both(operation.and, this.extreme(left, -1, 0, from - 1), until);
      }
      default:
        throw new Error(`${formula.is} stands inside`);
    }
  }

  private extreme(body: Value, sign: number, from: number, to: number): Value {
    const width = to - from;
    if (width === 0) return to === 0 ? body : { register: body.register, horizon: body.horizon + to };
    const mask = powerOfTwo(width + 1) - 1;
    return this.emit(
      { kind: operation.extreme, a: body.register, span: width, mask, sign },
      body.horizon,
      extremeSlots(width),
      to,
    );
  }

  private trigger(condition: Value, first: number, last: number): void {
    if (first > last) return;
    const key = `trigger ${condition.register} ${condition.horizon} ${first} ${last}`;
    let slot = this.known.get(key);
    if (slot === undefined) {
      slot = this.layout.add(`judge.${this.id}.triggers`);
      this.layout.add(`judge.${this.id}.triggered`);
      this.layout.add(`judge.${this.id}.lastTrigger`, -1);
      this.known.set(key, slot);
      this.push({ kind: operation.trigger, a: condition.register, begins: condition.horizon, slot, first, last });
    }
    this.triggers.push(slot);
  }

  private compare(formula: Extract<Formula, { is: 'compare' }>, polarity: number): Value {
    const { left, relation, right } = formula;
    const strict = relation === '<' || relation === '>';
    let value: Value;
    if (left.is === 'signal' && right.is === 'number') {
      const kind = {
        '<': operation.signalBelow,
        '<=': operation.signalNotAbove,
        '>': operation.signalAbove,
        '>=': operation.signalNotBelow,
      }[relation];
      value = this.emit({ kind, a: this.signals.find(left.path), constant: right.value, sign: polarity }, 0, 0);
    } else {
      const [small, large] = relation === '<' || relation === '<=' ? [left, right] : [right, left];
      const a = this.expression(small);
      const b = this.expression(large);
      value = this.emit({ kind: strict ? operation.below : operation.notAbove, a, b, sign: polarity }, 0, 0);
    }
    if (formula.per === undefined || formula.per === 1) return value;
    return this.emit({ kind: operation.divide, a: value.register, constant: formula.per }, value.horizon, 0);
  }

  /** Register of an expression; its horizon is always 0. */
  private expression(expression: Expression): number {
    switch (expression.is) {
      case 'signal':
        return this.emit({ kind: operation.signal, a: this.signals.find(expression.path) }, 0, 0).register;
      case 'number':
        return this.constant(expression.value);
      case 'negative':
      case 'size':
        return this.emit({ kind: operation[expression.is], a: this.expression(expression.of) }, 0, 0).register;
      case 'change':
      case 'rate':
        return this.past(
          operation[expression.is],
          this.expression(expression.of),
          expression.over,
          1 + powerOfTwo(expression.over),
          powerOfTwo(expression.over),
        );
      case 'integral': {
        const a = this.expression(expression.of);
        if (expression.over === null) return this.past(operation.integral, a, 0, 4, 1);
        return this.past(
          operation.integralOver,
          a,
          expression.over,
          4 + powerOfTwo(expression.over),
          powerOfTwo(expression.over),
        );
      }
      case 'peak':
      case 'trough': {
        const a = this.expression(expression.of);
        const sign = expression.is === 'peak' ? 1 : -1;
        if (expression.over === null) return this.past(operation[expression.is], a, 0, 1, 1, sign, -sign * Infinity);
        return this.past(
          operation.extremeOver,
          a,
          expression.over,
          1 + extremeSlots(expression.over),
          powerOfTwo(expression.over + 1),
          sign,
        );
      }
      case 'mean': {
        const a = this.expression(expression.of);
        if (expression.over === null) return this.past(operation.mean, a, 0, 3, 1);
        const size = powerOfTwo(expression.over + 1);
        return this.past(operation.meanOver, a, expression.over, 3 + size, size);
      }
      case 'count':
        return this.past(operation.count, this.inner(expression.of, 1, Infinity, -Infinity).register, 0, 2, 1);
      case 'duration': {
        const a = this.inner(expression.of, 1, Infinity, -Infinity).register;
        if (expression.over === null) return this.past(operation.duration, a, 0, 2, 1);
        return this.past(
          operation.durationOver,
          a,
          expression.over,
          2 + powerOfTwo(expression.over),
          powerOfTwo(expression.over),
        );
      }
      default:
        return this.emit(
          { kind: operation[expression.is], a: this.expression(expression.left), b: this.expression(expression.right) },
          0,
          0,
        ).register;
    }
  }

  private past(kind: number, a: number, span: number, slots: number, size: number, sign = 0, initial = 0): number {
    return this.emit({ kind, a, span, mask: size - 1, sign }, 0, slots, 0, initial).register;
  }

  private not(value: Value): Value {
    return this.emit({ kind: operation.not, a: value.register }, value.horizon, 0);
  }

  private both(kind: number, left: Value, right: Value): Value {
    const ahead = Math.max(left.horizon, right.horizon);
    return this.emit({ kind, a: this.delayed(left, ahead).register, b: this.delayed(right, ahead).register }, ahead, 0);
  }

  private delayed(value: Value, ahead: number): Value {
    const span = ahead - value.horizon;
    if (span === 0) return value;
    const size = powerOfTwo(span + 1);
    return this.emit({ kind: operation.delay, a: value.register, span, mask: size - 1 }, value.horizon, size, span);
  }

  /** `begins`: the horizon of the inputs; `adds`: what the operation adds to it. Equal operations are emitted once. */
  private emit(
    given: Partial<Operation> & { readonly kind: number },
    begins: number,
    slots: number,
    adds = 0,
    initial = 0,
  ): Value {
    const key = `${given.kind} ${given.a ?? 0} ${given.b ?? 0} ${begins} ${given.span ?? 0} ${given.sign ?? 0} ${numberKey(given.constant ?? 0)}`;
    let to = this.known.get(key);
    if (to === undefined) {
      to = this.registers;
      this.registers += 1;
      this.known.set(key, to);
      const slot = slots > 0 ? this.windows.addMany(`judge.history.${to}`, slots, initial) : 0;
      this.push({ ...given, to, begins, slot });
    }
    return { register: to, horizon: begins + adds };
  }

  private constant(value: number): number {
    const key = `constant ${numberKey(value)}`;
    let register = this.known.get(key);
    if (register === undefined) {
      register = this.registers;
      this.registers += 1;
      this.known.set(key, register);
      this.constants.push([register, value]);
    }
    return register;
  }

  private push(given: Partial<Operation> & { readonly kind: number }): void {
    this.operations.push({
      a: 0,
      b: 0,
      to: 0,
      begins: 0,
      slot: 0,
      span: 0,
      mask: 0,
      sign: 0,
      constant: 0,
      first: 0,
      last: 0,
      ...given,
    });
  }
}

function later(last: number, by: number): number {
  return last === lastTick ? lastTick : last + by;
}

function numberKey(value: number): string {
  return Object.is(value, -0) ? '-0' : String(value);
}
