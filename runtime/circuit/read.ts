import {
  type Expression,
  type FunctionExpression,
  type Node,
  type ObjectPattern,
  type Pattern,
  parseExpressionAt,
  type Statement,
} from 'acorn';
import { BuildError, type Laws, type Position } from '../contract.js';
import { type Graph, mathNames, type NodeId, type Operation } from './graph.js';

/**
 * Reads element functions and laws: parses what `Function.toString()` gives and evaluates it on graph nodes. The
 * subset: `const`, arithmetic, comparisons, `?:`, some of Math, calls of laws, assignments to members of the argument.
 */

/** A table of the argument: what reading or writing one of its members does. */
export interface Table {
  get(name: string): NodeId | undefined;
  /** `add`: `+=`; `subtract`: `-=`; `set`: `=`. */
  set?(name: string, value: NodeId, how: 'set' | 'add' | 'subtract'): boolean;
  /** For messages. */
  readonly members: readonly string[];
}

export interface ReadContext {
  readonly graph: Graph;
  /** For messages: `pumpMotor (pump-motor).flows`. */
  readonly label: string;
  readonly where?: Position;
  readonly tables: Readonly<Record<string, Table>>;
  readonly numbers: Readonly<Record<string, NodeId>>;
  readonly laws: Laws;
}

type AnyFunction = (...values: never[]) => unknown;

const parsed = new WeakMap<AnyFunction, { tree: FunctionExpression; text: string }>();

function parse(fn: AnyFunction, label: string): { tree: FunctionExpression; text: string } {
  const known = parsed.get(fn);
  if (known) return known;
  const source = fn.toString();
  const wrappings: [string, string][] = [
    ['({ ', ' })'],
    ['(', ')'],
    ['({ f: ', ' })'],
  ];
  for (const [before, after] of wrappings) {
    const text = before + source + after;
    let tree: Expression;
    try {
      tree = parseExpressionAt(text, 0, { ecmaVersion: 2022 });
    } catch {
      continue;
    }
    let found: Node | undefined;
    if (tree.type === 'ObjectExpression') {
      const property = tree.properties[0];
      if (property?.type === 'Property') found = property.value;
    } else found = tree;
    if (found && (found.type === 'FunctionExpression' || found.type === 'ArrowFunctionExpression')) {
      const result = { tree: found as FunctionExpression, text };
      parsed.set(fn, result);
      return result;
    }
  }
  throw new BuildError([
    { path: label, what: 'cannot read the source of this function', remedy: 'write it as a plain method or function' },
  ]);
}

class Reader {
  constructor(
    private readonly context: ReadContext,
    private readonly text: string,
    private readonly scope: Map<string, NodeId>,
    /** Inside a law the tables are out of reach. */
    private readonly insideLaw: string | undefined,
    private readonly depth: number,
  ) {}

  private refuse(node: Node, what: string, remedy: string): never {
    const before = this.text.slice(0, node.start);
    const line = before.split('\n').length;
    const snippet = this.text.slice(node.start, Math.min(node.end, node.start + 60)).replace(/\s+/g, ' ');
    const place = this.insideLaw ? `${this.context.label}, law ${this.insideLaw}` : this.context.label;
    throw new BuildError([
      {
        ...(this.context.where ? { where: this.context.where } : {}),
        path: place,
        what: `${what} in line ${line} of the function`,
        value: `\`${snippet}\``,
        remedy,
      },
    ]);
  }

  run(statements: readonly Statement[]): NodeId | undefined {
    for (const statement of statements) {
      switch (statement.type) {
        case 'VariableDeclaration':
          if (statement.kind !== 'const')
            this.refuse(statement, `\`${statement.kind}\` is not in the subset`, 'use const');
          for (const declaration of statement.declarations) {
            if (declaration.id.type !== 'Identifier' || !declaration.init) {
              this.refuse(declaration, 'only `const name = expression` is in the subset', 'name each value by itself');
            }
            this.scope.set((declaration.id as { name: string }).name, this.value(declaration.init!));
          }
          break;
        case 'ExpressionStatement':
          this.assignment(statement.expression);
          break;
        case 'ReturnStatement':
          if (!statement.argument) this.refuse(statement, 'a return without a value', 'return a number');
          return this.value(statement.argument!);
        case 'EmptyStatement':
          break;
        default:
          this.refuse(
            statement,
            `${statement.type} is not in the subset`,
            'use `const`, assignments and `?:`; see DEVELOPERS.md, the subset',
          );
      }
    }
    return undefined;
  }

  private assignment(expression: Expression): void {
    if (expression.type !== 'AssignmentExpression')
      this.refuse(expression, 'a statement that assigns nothing', 'remove it');
    const { left, operator, right } = expression as Extract<Expression, { type: 'AssignmentExpression' }>;
    const how = operator === '=' ? 'set' : operator === '+=' ? 'add' : operator === '-=' ? 'subtract' : undefined;
    if (!how) this.refuse(expression, `operator ${operator} is not in the subset`, 'use =, += or -=');
    const member = this.member(left as Expression);
    if (!member) this.refuse(left, 'only members of the argument can be assigned', 'use const for values of your own');
    const [table, name] = member!;
    const value = this.value(right);
    if (!table.set?.(name, value, how!)) {
      this.refuse(
        left,
        `\`${name}\` cannot be written here with ${operator}`,
        `can be written: ${table.set ? table.members.join(', ') || 'nothing' : 'nothing'}`,
      );
    }
  }

  private member(expression: Expression | Pattern): [Table, string] | undefined {
    if (expression.type !== 'MemberExpression' || expression.computed || expression.object.type !== 'Identifier')
      return undefined;
    if (this.insideLaw) return undefined;
    const table = this.context.tables[expression.object.name];
    if (!table || this.scope.has(expression.object.name)) return undefined;
    return [table, (expression.property as { name: string }).name];
  }

  value(expression: Expression): NodeId {
    const { graph } = this.context;
    switch (expression.type) {
      case 'Literal':
        if (typeof expression.value !== 'number')
          this.refuse(expression, 'only numbers are in the subset', 'use a number');
        return graph.constant(expression.value as number);
      case 'ParenthesizedExpression':
        return this.value(expression.expression);
      case 'Identifier': {
        const local = this.scope.get(expression.name);
        if (local !== undefined) return local;
        if (!this.insideLaw) {
          const number = this.context.numbers[expression.name];
          if (number !== undefined) return number;
        } else {
          const constant = this.context.laws[expression.name];
          if (typeof constant === 'number') return graph.constant(constant);
        }
        return this.refuse(
          expression,
          `unknown name \`${expression.name}\``,
          'everything a function uses comes in its argument; constants come as law.NAME',
        );
      }
      case 'MemberExpression': {
        if (
          !this.insideLaw &&
          !expression.computed &&
          expression.object.type === 'Identifier' &&
          expression.object.name === 'law'
        ) {
          const name = (expression.property as { name: string }).name;
          const constant = this.context.laws[name];
          if (typeof constant === 'number') return graph.constant(constant);
          return this.refuse(
            expression,
            `no number \`${name}\` among the element's laws`,
            'export it from the law file and list the file under `laws`',
          );
        }
        const member = this.member(expression);
        if (!member) return this.refuse(expression, 'this member cannot be read', 'read members of the argument only');
        const node = member[0].get(member[1]);
        if (node === undefined)
          return this.refuse(
            expression,
            `\`${member[1]}\` is not there to read`,
            `there are: ${member[0].members.join(', ') || 'none'}`,
          );
        return node;
      }
      case 'UnaryExpression':
        if (expression.operator === '-') return graph.apply('neg', [this.value(expression.argument)]);
        if (expression.operator === '+') return this.value(expression.argument);
        if (expression.operator === '!') return graph.apply('!', [this.value(expression.argument)]);
        return this.refuse(expression, `operator ${expression.operator} is not in the subset`, 'write it otherwise');
      case 'BinaryExpression': {
        if (!['+', '-', '*', '/', '<', '<=', '>', '>=', '===', '!=='].includes(expression.operator)) {
          this.refuse(
            expression,
            `operator ${expression.operator} is not in the subset`,
            'use + - * / and comparisons; powers by multiplication or exp(log)',
          );
        }
        return graph.apply(expression.operator as Operation, [
          this.value(expression.left as Expression),
          this.value(expression.right),
        ]);
      }
      case 'LogicalExpression':
        if (expression.operator === '??') this.refuse(expression, 'operator ?? is not in the subset', 'use && and ||');
        return graph.apply(expression.operator as Operation, [
          this.value(expression.left),
          this.value(expression.right),
        ]);
      case 'ConditionalExpression':
        return graph.apply('?', [
          this.value(expression.test),
          this.value(expression.consequent),
          this.value(expression.alternate),
        ]);
      case 'CallExpression':
        return this.call(expression);
      default:
        return this.refuse(expression, `${expression.type} is not in the subset`, 'see DEVELOPERS.md, the subset');
    }
  }

  private call(expression: Extract<Expression, { type: 'CallExpression' }>): NodeId {
    const { graph, laws } = this.context;
    const callee = expression.callee;
    const operands = expression.arguments.map((argument) => {
      if (argument.type === 'SpreadElement')
        this.refuse(argument, 'a spread argument is not in the subset', 'name each argument');
      return this.value(argument as Expression);
    });
    if (callee.type === 'MemberExpression' && callee.object.type === 'Identifier' && !callee.computed) {
      const name = (callee.property as { name: string }).name;
      if (callee.object.name === 'Math') {
        if (!mathNames.has(name))
          this.refuse(callee, `Math.${name} is not in the subset`, `there are ${[...mathNames].join(', ')}`);
        const wanted = name === 'min' || name === 'max' ? 2 : 1;
        if (operands.length !== wanted) this.refuse(expression, `Math.${name} takes ${wanted} here`, 'nest the calls');
        return graph.apply(name as Operation, operands);
      }
      if (callee.object.name === 'law' && !this.insideLaw) return this.callLaw(expression, name, operands);
    }
    if (callee.type === 'Identifier' && this.insideLaw && typeof laws[callee.name] === 'function') {
      return this.callLaw(expression, callee.name, operands);
    }
    return this.refuse(expression, 'this call is not in the subset', 'call law.name(...) or Math functions');
  }

  private callLaw(expression: Node, name: string, operands: NodeId[]): NodeId {
    const { graph, laws, label } = this.context;
    const law = laws[name];
    if (typeof law !== 'function')
      this.refuse(expression, `no law \`${name}\` among the element's laws`, 'list its file under `laws`');
    if (this.depth > 40) this.refuse(expression, 'laws call each other without end', 'break the recursion');
    const value = inlineLaw(this.context, name, law as AnyFunction, operands, this.depth + 1);
    const slopes = laws[`${name}Slopes`] as Record<string, AnyFunction> | undefined;
    if (!slopes) return value;
    const names = parameterNames(parse(law as AnyFunction, `${label}, law ${name}`).tree);
    const list = names.flatMap((argumentName, i) => {
      const slope = slopes[argumentName];
      if (!slope) return [];
      return [
        {
          argument: operands[i]!,
          slope: () =>
            inlineLaw(this.context, `${name}Slopes.${argumentName}`, slope, [...operands, value], this.depth + 1),
        },
      ];
    });
    return graph.law(value, list);
  }
}

function parameterNames(tree: FunctionExpression): string[] {
  return tree.params.map((parameter) => (parameter.type === 'Identifier' ? parameter.name : '?'));
}

function inlineLaw(
  context: ReadContext,
  name: string,
  law: AnyFunction,
  operands: readonly NodeId[],
  depth: number,
): NodeId {
  const { tree, text } = parse(law, `${context.label}, law ${name}`);
  const scope = new Map<string, NodeId>();
  const names = parameterNames(tree);
  if (names.length !== operands.length) {
    throw new BuildError([
      {
        path: `${context.label}, law ${name}`,
        what: `takes ${names.length} numbers`,
        value: `${operands.length} given`,
        remedy: 'give each argument',
      },
    ]);
  }
  names.forEach((parameter, i) => {
    scope.set(parameter, operands[i]!);
  });
  const reader = new Reader(context, text, scope, name, depth);
  const body = tree.body as unknown as Node;
  const result =
    body.type === 'BlockStatement'
      ? reader.run((body as unknown as { body: Statement[] }).body)
      : reader.value(body as unknown as Expression);
  if (result === undefined)
    throw new BuildError([
      { path: `${context.label}, law ${name}`, what: 'returns nothing', remedy: 'end it with `return`' },
    ]);
  return result;
}

/** Evaluates an element function on the graph; the node that it returns, if it returns one. */
export function readFunction(context: ReadContext, fn: AnyFunction): NodeId | undefined {
  const { tree, text } = parse(fn, context.label);
  const pattern = tree.params[0];
  if (pattern && pattern.type !== 'ObjectPattern') {
    throw new BuildError([
      { path: context.label, what: 'takes its argument whole', remedy: 'destructure it: ({ parameter, state, ... })' },
    ]);
  }
  for (const property of (pattern as ObjectPattern | undefined)?.properties ?? []) {
    const plain =
      property.type === 'Property' &&
      property.key.type === 'Identifier' &&
      property.value.type === 'Identifier' &&
      property.key.name === property.value.name;
    const name = plain ? (property.key as { name: string }).name : undefined;
    const known = name !== undefined && (name === 'law' || name in context.tables || name in context.numbers);
    if (!known) {
      throw new BuildError([
        {
          path: context.label,
          what: `the argument has no \`${text.slice(property.start, property.end)}\``,
          remedy: `there are: law, ${[...Object.keys(context.tables), ...Object.keys(context.numbers)].join(', ')}; without renaming`,
        },
      ]);
    }
  }
  const body = tree.body as unknown as Node;
  const reader = new Reader(context, text, new Map(), undefined, 0);
  return body.type === 'BlockStatement'
    ? reader.run((body as unknown as { body: Statement[] }).body)
    : reader.value(body as unknown as Expression);
}
