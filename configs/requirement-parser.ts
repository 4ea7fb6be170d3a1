import type { Position, SignalInfo } from '../runtime/contract.js';
import { examineFormula } from '../runtime/judge/examine.js';
import type { Expression, Formula, Relation } from '../runtime/judge/formula.js';
import type { Problems } from './problems.js';
import { shown } from './quantity.js';
import { keywords, TextError, type Token, tokens } from './requirement-tokens.js';
import {
  alike,
  arithmetic,
  checkAlike,
  numberValue,
  one,
  signalValue,
  timed,
  type Value,
} from './requirement-values.js';
import { toTicks } from './ticks.js';
import { formatNumber, parseUnit, quantityName } from './units.js';

/** What a text may refer to. */
export interface RequirementContext {
  readonly signals: { find(path: string): SignalInfo | undefined; nearest(path: string): readonly string[] };
  /** Tick length, s. */
  readonly step: number;
  /** The text is a condition that something waits for, not a requirement: it does not say when. */
  readonly present?: boolean;
}

const relations: readonly Relation[] = ['<=', '>=', '<', '>'];
const deepest = 60;
const second = parseUnit('s');

type Piece = { readonly formula: Formula; readonly at: number } | Value;

/**
 * Reads the text of a requirement. What is wrong is added to `problems`, at `where` an offset of the text stands; undefined then.
 *
 *   formula    always | never | eventually [times] formula        whenever formula then formula      if formula then formula
 *              at the start | at the end formula                   formula until [times] formula
 *              formula implies | or | and formula                  not formula
 *   times      from TIME [to TIME] | within TIME | for TIME
 *   condition  value < | <= | > | >= value [per QUANTITY]          value is between value and value     value is on | off
 *              value rises above | falls below value               value settles to value +- value      ( formula )
 *              each followed by: within TIME [and stays for TIME] | for TIME | happens | begins | ends
 *   value      SIGNAL | QUANTITY | value + - * / value | - value | ( value ) | FUNCTION( value [, TIME] )
 *   FUNCTION   rate change integral peak trough mean abs min max; count( formula ), duration( formula [, TIME] )
 *
 * `happens` makes a condition lend no margin, so that it may stand beside conditions on other quantities.
 * `rises above`, `falls below` without `within` is the tick at which it happens; with it, that the value is there by then.
 */
export function parseFormula(
  text: string,
  context: RequirementContext,
  problems: Problems,
  path: string,
  where: (offset: number) => Position | undefined = () => undefined,
): Formula | undefined {
  const parser = new Parser(text, context);
  const report = (error: TextError) =>
    problems.add(
      where(error.at),
      path,
      error.what,
      error.remedy,
      error.value === undefined ? {} : { value: shown(error.value) },
    );
  let formula: Formula;
  try {
    formula = parser.whole();
  } catch (error) {
    if (!(error instanceof TextError)) throw error;
    report(error);
    return undefined;
  }
  const wrong = examineFormula(
    context.present ? { is: 'always', from: 0, to: null, of: { is: 'happens', of: formula } } : formula,
  );
  for (const problem of wrong) report(new TextError(parser.places.get(problem.at) ?? 0, problem.what, problem.remedy));
  return wrong.length === 0 ? formula : undefined;
}

/** Reads the text of a value, such as `0.5 * highLine.pressure`. What is wrong is added to `problems`; undefined then. */
export function parseValue(
  text: string,
  context: RequirementContext,
  problems: Problems,
  path: string,
  where: (offset: number) => Position | undefined = () => undefined,
): Value | undefined {
  try {
    return new Parser(text, context).wholeValue();
  } catch (error) {
    if (!(error instanceof TextError)) throw error;
    problems.add(
      where(error.at),
      path,
      error.what,
      error.remedy,
      error.value === undefined ? {} : { value: shown(error.value) },
    );
    return undefined;
  }
}

class Parser {
  private readonly list: Token[];
  private next = 0;
  private depth = 0;
  /** Where each node stands, for problems found later. */
  readonly places = new Map<Formula | Expression, number>();
  constructor(
    private readonly text: string,
    private readonly context: RequirementContext,
  ) {
    this.list = [];
  }

  whole(): Formula {
    this.list.push(...tokens(this.text));
    if (this.peek().kind === 'end')
      throw new TextError(0, 'nothing said', 'write a requirement such as: always highLine.pressure < 345 bar(g)');
    const formula = this.asFormula(this.any());
    if (this.peek().kind !== 'end')
      throw this.unexpected('and, or, until, implies, within, for or the end of the text');
    return formula;
  }

  wholeValue(): Value {
    this.list.push(...tokens(this.text));
    const value = this.value();
    if (this.peek().kind !== 'end') throw this.unexpected('an operator or the end of the text');
    return value;
  }

  // Tokens

  private peek(ahead = 0): Token {
    return this.list[Math.min(this.next + ahead, this.list.length - 1)]!;
  }

  private is(text: string, ahead = 0): boolean {
    const token = this.peek(ahead);
    return (token.kind === 'word' || token.kind === 'symbol') && token.text === text;
  }

  private take(...texts: string[]): boolean {
    for (let i = 0; i < texts.length; i += 1) if (!this.is(texts[i]!, i)) return false;
    this.next += texts.length;
    return true;
  }

  private expect(text: string, where: string): void {
    if (!this.take(text)) throw this.unexpected(`'${text}' ${where}`);
  }

  private unexpected(wanted: string): TextError {
    const token = this.peek();
    const found = token.kind === 'end' ? 'the text ends too early' : 'not understood';
    return new TextError(
      token.start,
      found,
      `expected ${wanted}`,
      token.kind === 'end' ? undefined : this.text.slice(token.start, token.end),
    );
  }

  // Formulas

  private node<T extends Formula>(formula: T, at: number): { readonly formula: T; readonly at: number } {
    this.places.set(formula, at);
    return { formula, at };
  }

  private asFormula(piece: Piece): Formula {
    if ('formula' in piece) return piece.formula;
    const token = this.peek();
    if (token.kind === 'end' || token.start > piece.at) {
      throw new TextError(
        token.start,
        'a value where a condition belongs',
        'compare it: expected <, <=, >, >=, is, rises above, falls below or settles to',
      );
    }
    throw new TextError(piece.at, 'a value where a condition belongs', 'compare it with something');
  }

  private asValue(piece: Piece, wanted = 'a signal, a number or a function'): Value {
    if ('formula' in piece) throw new TextError(piece.at, 'a condition where a value belongs', `expected ${wanted}`);
    return piece;
  }

  private any(): Piece {
    this.depth += 1;
    if (this.depth > deepest)
      throw new TextError(this.peek().start, 'nested too deep', `nest at most ${deepest} levels`);
    const piece = this.prefixed();
    this.depth -= 1;
    return piece;
  }

  private formula(): Formula {
    return this.asFormula(this.any());
  }

  private prefixed(): Piece {
    const at = this.peek().start;
    if (this.take('always')) return this.node({ is: 'always', ...this.times(), of: this.formula() }, at);
    if (this.take('eventually')) return this.node({ is: 'eventually', ...this.times(), of: this.formula() }, at);
    if (this.take('never')) {
      const times = this.times();
      return this.node({ is: 'always', ...times, of: this.node({ is: 'not', of: this.formula() }, at).formula }, at);
    }
    if (this.is('whenever') || this.is('if')) {
      const whenever = this.take('whenever') || !this.take('if');
      const condition = this.formula();
      this.take(',');
      this.expect('then', `behind the condition of '${whenever ? 'whenever' : 'if'}'`);
      const given = this.node({ is: 'given', condition, consequence: this.formula() }, at);
      return whenever ? this.node({ is: 'always', from: 0, to: null, of: given.formula }, at) : given;
    }
    if (this.take('at', 'the', 'start')) return this.node({ is: 'start', of: this.formula() }, at);
    if (this.take('at', 'the', 'end')) return this.node({ is: 'end', of: this.formula() }, at);
    if (this.is('at')) throw this.unexpected("'at the start' or 'at the end'");
    return this.until();
  }

  private times(): { from: number; to: number | null } {
    if (this.take('from')) {
      const from = this.ticks(0);
      return { from, to: this.take('to') ? this.ticks(from) : null };
    }
    if (this.take('within') || this.take('for')) return { from: 0, to: this.ticks(0) };
    return { from: 0, to: null };
  }

  private until(): Piece {
    const left = this.implies();
    if (!this.is('until')) return left;
    const at = this.peek().start;
    const leftFormula = this.asFormula(left);
    this.take('until');
    const times = this.times();
    return this.node({ is: 'until', left: leftFormula, ...times, right: this.operand(() => this.implies()) }, at);
  }

  private implies(): Piece {
    const left = this.or();
    if (!this.is('implies')) return left;
    const at = this.peek().start;
    const leftFormula = this.asFormula(left);
    this.take('implies');
    return this.node({ is: 'implies', left: leftFormula, right: this.operand(() => this.or()) }, at);
  }

  private or(): Piece {
    let left = this.and();
    while (this.is('or')) {
      const at = this.peek().start;
      const leftFormula = this.asFormula(left);
      this.take('or');
      left = this.node({ is: 'or', left: leftFormula, right: this.operand(() => this.and()) }, at);
    }
    return left;
  }

  private and(): Piece {
    let left = this.unary();
    while (this.is('and') && !this.is('stays', 1)) {
      const at = this.peek().start;
      const leftFormula = this.asFormula(left);
      this.take('and');
      left = this.node({ is: 'and', left: leftFormula, right: this.operand(() => this.unary()) }, at);
    }
    return left;
  }

  /** The right side of an operator: what begins with always, never, ... reaches to the end. */
  private operand(parse: () => Piece): Formula {
    const token = this.peek();
    if (token.kind === 'word' && ['always', 'never', 'eventually', 'whenever', 'if', 'at'].includes(token.text))
      return this.formula();
    return this.asFormula(parse());
  }

  private unary(): Piece {
    const at = this.peek().start;
    if (!this.take('not')) return this.timed();
    this.depth += 1;
    if (this.depth > deepest) throw new TextError(at, 'nested too deep', `nest at most ${deepest} levels`);
    const of = this.operand(() => this.unary());
    this.depth -= 1;
    return this.node({ is: 'not', of }, at);
  }

  /** A condition with what follows it: within, for, begins, ends. */
  private timed(): Piece {
    let piece = this.condition();
    for (;;) {
      const at = this.peek().start;
      if (this.take('within')) {
        const of = this.asFormula(piece);
        const to = this.ticks(0);
        piece = this.node({ is: 'eventually', from: 0, to, of: this.stays(of, at) }, at);
      } else if (this.take('for')) {
        piece = this.node({ is: 'always', from: 0, to: this.ticks(0), of: this.asFormula(piece) }, at);
      } else if (this.take('happens')) {
        piece = this.node({ is: 'happens', of: this.asFormula(piece) }, at);
      } else if (this.take('begins')) {
        piece = this.node({ is: 'begins', of: this.asFormula(piece) }, at);
      } else if (this.take('ends')) {
        piece = this.node({ is: 'ends', of: this.asFormula(piece) }, at);
      } else return piece;
    }
  }

  private stays(of: Formula, at: number): Formula {
    if (!this.take('and', 'stays')) return of;
    this.expect('for', "behind 'stays'");
    return this.node({ is: 'always', from: 0, to: this.ticks(0), of }, at).formula;
  }

  private condition(): Piece {
    const piece = this.sum();
    const at = this.peek().start;
    const relation = relations.find((one) => this.is(one));
    if (relation) {
      const left = this.asValue(piece, "'and', 'or' or the end behind a condition");
      this.next += 1;
      const compared = this.compare(left, relation, this.asValue(this.sum()), at);
      if (relations.some((one) => this.is(one)))
        throw new TextError(this.peek().start, 'two comparisons in a row', 'write: x is between 1 and 2');
      return compared;
    }
    if (this.is('='))
      throw new TextError(
        at,
        'a measured value is never exactly equal',
        'write: abs(x - y) <= tolerance, or: x is between 1 and 2',
      );
    if (this.take('is')) return this.state(this.asValue(piece), at);
    if (this.is('rises') || this.is('crosses') || this.is('falls')) return this.edge(this.asValue(piece), at);
    if (this.take('settles')) {
      this.expect('to', "behind 'settles'");
      const left = this.asValue(piece);
      const target = this.asValue(this.sum());
      this.expect('+-', 'and a band, such as: settles to 1200 rpm +- 20 rpm within 2 s');
      const band = this.asValue(this.sum());
      const size = arithmetic('difference', left, target, at);
      const inside = this.compare({ ...size, expression: { is: 'size', of: size.expression } }, '<=', band, at);
      if (!this.is('within')) throw this.unexpected("'within' and a time");
      return inside;
    }
    return piece;
  }

  private state(left: Value, at: number): Piece {
    const half: Value = { expression: { is: 'number', value: 0.5 }, unit: one, scale: 'difference', zero: false, at };
    if (this.take('on')) return this.compare(left, '>', half, at);
    if (this.take('off')) return this.compare(left, '<', half, at);
    if (this.take('between')) {
      const low = this.asValue(this.sum());
      this.expect('and', "and the upper end behind 'between'");
      const high = this.asValue(this.sum());
      const above = this.compare(left, '>=', low, at).formula;
      return this.node({ is: 'and', left: above, right: this.compare(left, '<=', high, at).formula }, at);
    }
    throw this.unexpected("'on', 'off' or 'between'");
  }

  private edge(left: Value, at: number): Piece {
    const crosses = this.is('crosses');
    const falls = this.is('falls');
    this.next += 1;
    const above = this.is('above');
    if (!(above && !falls) && !(this.is('below') && (falls || crosses))) {
      throw this.unexpected(falls ? "'below'" : crosses ? "'above' or 'below'" : "'above'");
    }
    this.next += 1;
    const compared = this.compare(left, above ? '>' : '<', this.asValue(this.sum()), at);
    if (!crosses && this.is('within')) return compared;
    return this.node({ is: 'begins', of: compared.formula }, at);
  }

  private compare(
    left: Value,
    relation: Relation,
    right: Value,
    at: number,
  ): { readonly formula: Formula; readonly at: number } {
    checkAlike(left, right);
    const named = left.expression.is === 'number' || left.zero ? right : left;
    const formula = {
      is: 'compare' as const,
      left: left.expression,
      relation,
      right: right.expression,
      unit: named.unit.text,
    };
    if (!this.take('per')) return this.node(formula, at);
    const scale = this.asValue(this.primary(), 'a quantity');
    if (
      scale.expression.is !== 'number' ||
      scale.zero ||
      scale.scale === 'point' ||
      !alike(scale.unit, named.unit) ||
      !(scale.expression.value > 0)
    ) {
      throw new TextError(
        scale.at,
        'not a scale of the margin',
        `write ${quantityName(named.unit)} above zero, not on a scale`,
      );
    }
    return this.node(
      {
        ...formula,
        unit: '1',
        per: scale.expression.value,
        perWritten: scale.expression.written ?? String(scale.expression.value),
      },
      at,
    );
  }

  // Values

  private sum(): Piece {
    let left = this.product();
    while (this.is('+') || this.is('-')) {
      const at = this.peek().start;
      const is = this.is('+') ? 'sum' : 'difference';
      const value = this.asValue(left);
      this.next += 1;
      left = this.place(arithmetic(is, value, this.asValue(this.product()), at));
    }
    return left;
  }

  private product(): Piece {
    let left = this.primary();
    while (this.is('*') || this.is('/')) {
      const at = this.peek().start;
      const is = this.is('*') ? 'product' : 'quotient';
      const value = this.asValue(left);
      this.next += 1;
      left = this.place(arithmetic(is, value, this.asValue(this.primary()), at));
    }
    return left;
  }

  private place(value: Value): Value {
    this.places.set(value.expression, value.at);
    return value;
  }

  private primary(): Piece {
    const token = this.peek();
    if (this.is('-')) {
      this.next += 1;
      const number = this.peek();
      if (number.kind === 'number') {
        this.next += 1;
        return this.place(numberValue(-number.value, number.unit, `-${number.written}`, token.start));
      }
      this.depth += 1;
      if (this.depth > deepest) throw new TextError(token.start, 'nested too deep', `nest at most ${deepest} levels`);
      const of = this.asValue(this.primary());
      this.depth -= 1;
      if (of.scale === 'point')
        throw new TextError(token.start, 'a point of a scale turned negative', 'subtract it from another');
      return this.place({ ...of, expression: { is: 'negative', of: of.expression }, zero: false, at: token.start });
    }
    if (token.kind === 'number') {
      this.next += 1;
      return this.place(numberValue(token.value, token.unit, token.written, token.start));
    }
    if (this.take('(')) {
      const inside = this.any();
      this.expect(')', 'to close the bracket');
      return { ...inside, at: token.start };
    }
    if (token.kind === 'word' && this.is('(', 1)) return this.call(token.text, token.start);
    if (token.kind === 'path' || (token.kind === 'word' && !keywords.has(token.text))) {
      this.next += 1;
      return this.signal(token.text, token.start);
    }
    throw this.unexpected("a signal, a number, a function, '(' or a word such as always, not");
  }

  private signal(path: string, at: number): Value {
    const info = this.context.signals.find(path);
    if (info) return this.place(signalValue(info, at));
    const near = this.context.signals.nearest(path);
    const remedy =
      near.length > 0 ? `did you mean ${near.slice(0, 3).join(' or ')}?` : 'see the signal list of the bench';
    throw new TextError(at, 'no such signal', remedy, path);
  }

  private call(name: string, at: number): Value {
    this.next += 2;
    const done = (expression: Expression, unit: Value['unit'], scale: Value['scale'] = 'difference'): Value => {
      this.expect(')', `behind what ${name} takes`);
      return this.place({ expression, unit, scale, zero: false, at });
    };
    const over = (): number | null => (this.take(',') ? this.ticks(1) : null);
    switch (name) {
      case 'count':
        return done({ is: 'count', of: this.formula() }, one);
      case 'duration': {
        const of = this.formula();
        return done({ is: 'duration', of, over: over() }, second);
      }
      case 'abs': {
        const of = this.value();
        return done({ is: 'size', of: of.expression }, of.unit, of.scale);
      }
      case 'rate':
      case 'change': {
        const of = this.value();
        const span = over() ?? 1;
        return done({ is: name, of: of.expression, over: span }, name === 'rate' ? timed(of.unit, -1, of.at) : of.unit);
      }
      case 'integral': {
        const of = this.value();
        return done({ is: 'integral', of: of.expression, over: over() }, timed(of.unit, 1, of.at));
      }
      case 'peak':
      case 'trough':
      case 'mean': {
        const of = this.value();
        return done({ is: name, of: of.expression, over: over() }, of.unit, of.scale);
      }
      case 'min':
      case 'max': {
        let left = this.value();
        this.expect(',', `and a second value in ${name}`);
        do left = arithmetic(name === 'min' ? 'lesser' : 'greater', left, this.value(), at);
        while (this.take(','));
        return done(left.expression, left.unit, left.scale);
      }
      default:
        throw new TextError(
          at,
          'no such function',
          'use rate, change, integral, peak, trough, mean, abs, min, max, count or duration',
          name,
        );
    }
  }

  private value(): Value {
    return this.asValue(this.any());
  }

  /** A time as whole ticks. */
  private ticks(least: number): number {
    const token = this.peek();
    if (token.kind !== 'number') throw this.unexpected('a time, such as 2 s or 50 ms');
    this.next += 1;
    const value = numberValue(token.value, token.unit, token.written, token.start);
    if (value.expression.is !== 'number' || (!value.zero && (token.unit === undefined || !alike(value.unit, second)))) {
      throw new TextError(token.start, 'not a time', 'write one such as 2 s or 50 ms', token.written);
    }
    const ticks = toTicks(value.expression.value, this.context.step);
    if (ticks === undefined) {
      const step = `${formatNumber(this.context.step * 1000, 9)} ms`;
      throw new TextError(token.start, 'not a multiple of the step', `use a multiple of ${step}`, token.written);
    }
    if (ticks < least)
      throw new TextError(
        token.start,
        'too short a time',
        `use at least ${formatNumber(least * this.context.step * 1000, 9)} ms`,
        token.written,
      );
    return ticks;
  }
}
