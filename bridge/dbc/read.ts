import type { AttributeDefinition, Database, NamedValue } from './database.js';
import { nobody } from './database.js';
import { DatabaseBuilder, type MessageDraft, type SignalDraft } from './draft.js';
import { type Token, tokensOf } from './tokens.js';

/** Something in a file that was not understood, or that was read over because nothing here has a use for it. */
export interface Finding {
  readonly line: number;
  readonly column: number;
  readonly what: string;
}

export interface ReadDatabase {
  readonly database: Database;
  /** Not understood: the statement was left away. */
  readonly problems: readonly Finding[];
  /** Understood and of no use to a message map. */
  readonly remarks: readonly Finding[];
}

/** Thrown inside a statement; the reader goes on with the next one. */
class Unreadable extends Error {
  constructor(
    readonly token: Token,
    what: string,
  ) {
    super(what);
  }
}

const extendedBit = 0x80000000;
/** Identifier of the message that holds signals of no message. */
const unplaced = 0xc0000000;

/** Statements that are read over, with what they are. */
const readOver: Readonly<Record<string, string>> = {
  EV_: 'an environment variable',
  ENVVAR_DATA_: 'data of an environment variable',
  EV_DATA_: 'data of an environment variable',
  SGTYPE_: 'a signal type',
  SIG_TYPE_REF_: 'a signal type reference',
  SIGTYPE_VALTYPE_: 'a signal type',
  SGTYPE_VAL_: 'a signal type',
  BA_DEF_SGTYPE_: 'an attribute of a signal type',
  BA_SGTYPE_: 'an attribute of a signal type',
  BA_DEF_REL_: 'an attribute of a relation',
  BA_DEF_DEF_REL_: 'an attribute of a relation',
  BA_REL_: 'an attribute of a relation',
  BU_SG_REL_: 'a relation',
  BU_EV_REL_: 'a relation',
  BU_BO_REL_: 'a relation',
  SIG_GROUP_: 'a signal group',
  CAT_DEF_: 'a category',
  CAT_: 'a category',
  FILTER: 'a filter',
};

/**
 * Reads CAN database text (`.dbc`). Never throws for what a file may hold: each statement that is not understood is a
 * problem with line and column, and the rest is read.
 */
export function readDatabase(text: string): ReadDatabase {
  const reader = new Reader(tokensOf(text));
  reader.run();
  const { builder } = reader;
  const database = builder.finish((line, column, what) => reader.problems.push({ line, column, what }));
  return { database, problems: sorted(reader.problems), remarks: sorted(reader.remarks) };
}

function sorted(findings: readonly Finding[]): Finding[] {
  return [...findings].sort((a, b) => a.line - b.line || a.column - b.column);
}

class Reader {
  readonly builder = new DatabaseBuilder();
  readonly problems: Finding[] = [];
  readonly remarks: Finding[] = [];
  private at = 0;

  constructor(private readonly tokens: readonly Token[]) {}

  run(): void {
    while (this.peek().kind !== 'end') {
      const start = this.peek();
      try {
        this.statement();
      } catch (error) {
        if (!(error instanceof Unreadable)) throw error;
        const { token } = error;
        this.problems.push({ line: token.line, column: token.column, what: error.message });
        if (this.peek() === start) this.at += 1;
        this.skipToStatement();
      }
    }
  }

  private peek(): Token {
    return this.tokens[this.at];
  }

  private statement(): void {
    const token = this.peek();
    if (token.kind !== 'word') throw new Unreadable(token, `${shown(token)} where a statement belongs`);
    this.at += 1;
    switch (token.text) {
      case 'VERSION':
        this.builder.version = this.string();
        return;
      case 'NS_':
        this.newSymbols();
        return;
      case 'BS_':
        this.bitTiming(token);
        return;
      case 'BU_':
        this.sign(':');
        while (this.peek().kind === 'word' && !this.peek().first) this.builder.node(this.word('a node'));
        return;
      case 'BO_':
        this.message();
        return;
      case 'SG_':
        throw new Unreadable(token, 'a signal outside a message');
      case 'BO_TX_BU_':
        this.transmitters();
        return;
      case 'VAL_TABLE_':
        this.builder.valueTables.push({ name: this.word('the name of a value table'), values: this.namedValues() });
        return;
      case 'VAL_':
        this.values(token);
        return;
      case 'CM_':
        this.comment(token);
        return;
      case 'BA_DEF_':
        this.definition(token);
        return;
      case 'BA_DEF_DEF_': {
        const name = this.string();
        this.builder.usual(name, this.value(), () => this.fail(token, `no attribute ${name} is defined`));
        this.sign(';');
        return;
      }
      case 'BA_':
        this.attribute(token);
        return;
      case 'SIG_VALTYPE_':
        this.valueType();
        return;
      case 'SG_MUL_VAL_':
        this.multiplexing();
        return;
      default: {
        const what = readOver[token.text];
        if (what === undefined) throw new Unreadable(token, `unknown statement ${token.text}`);
        this.remark(token, `${what} is read over (${token.text})`);
        this.skipPastSemicolon();
      }
    }
  }

  /** The list of keywords that most files begin with: indented words. */
  private newSymbols(): void {
    this.sign(':');
    while (this.peek().kind === 'word' && this.peek().column > 1) this.at += 1;
  }

  private bitTiming(token: Token): void {
    this.sign(':');
    if (this.peek().kind !== 'number' || this.peek().first) return;
    while (!this.peek().first && this.peek().kind !== 'end') this.at += 1;
    this.remark(token, 'the bit timing is read over: a link of the bench says its bit rate');
  }

  private message(): void {
    const place = this.peek();
    const identifier = this.identifier();
    const name = this.word('the name of the message');
    this.sign(':');
    const bytes = this.whole('the length in bytes');
    const sender = this.word('the sender');
    const draft = this.builder.message(place, identifier, name, bytes, sender === nobody ? [] : [sender]);
    if (identifier === unplaced) this.remark(place, 'signals that belong to no message are read over');
    while (this.peek().kind === 'word' && this.peek().text === 'SG_') {
      const start = this.peek();
      this.at += 1;
      try {
        this.signal(draft);
      } catch (error) {
        if (!(error instanceof Unreadable)) throw error;
        this.problems.push({ line: error.token.line, column: error.token.column, what: error.message });
        while (this.peek().kind !== 'end' && (this.peek().line === start.line || !this.peek().first)) this.at += 1;
      }
    }
  }

  private signal(draft: MessageDraft): void {
    const place = this.peek();
    const name = this.word('the name of the signal');
    let selector = false;
    let selected: number | undefined;
    if (this.peek().kind === 'word') {
      const text = this.word('M or m and a number');
      const match = /^(?:M|m(\d+)(M?))$/.exec(text);
      if (!match) throw new Unreadable(this.before, `${text} where M, m0, m1 or m0M belongs`);
      selector = match[1] === undefined || match[2] === 'M';
      if (match[1] !== undefined) selected = Number(match[1]);
    }
    this.sign(':');
    const startBit = this.whole('the start bit');
    this.sign('|');
    const length = this.whole('the length in bits');
    this.sign('@');
    const order = this.whole('the byte order');
    if (order !== 0 && order !== 1)
      throw new Unreadable(this.before, `byte order ${order}, 0 (big endian) or 1 (little endian)`);
    const signed = this.oneOf('+', '-') === '-';
    this.sign('(');
    const scale = this.number('the factor');
    this.sign(',');
    const offset = this.number('the offset');
    this.sign(')');
    this.sign('[');
    const least = this.number('the minimum');
    this.sign('|');
    const most = this.number('the maximum');
    this.sign(']');
    const unit = this.string();
    const receivers: string[] = [];
    while (this.peek().kind === 'word' && !this.peek().first) {
      const receiver = this.word('a receiver');
      if (receiver !== nobody) receivers.push(receiver);
      if (this.peek().text === ',') this.at += 1;
    }
    if (length < 1 || length > 64) throw new Unreadable(place, `${name}: ${length} bits, 1 to 64`);
    if (scale === 0) throw new Unreadable(place, `${name}: its factor is 0`);
    const made: SignalDraft = {
      place,
      name,
      selector,
      selected,
      startBit,
      length,
      byteOrder: order === 1 ? 'little' : 'big',
      signed,
      scale,
      offset,
      least,
      most,
      unit,
      receivers,
      float: false,
      selectedBy: undefined,
      comment: '',
      values: [],
      attributes: {},
    };
    if (draft.signals.some((other) => other.name === name))
      throw new Unreadable(place, `${draft.name} has a signal ${name} already`);
    draft.signals.push(made);
  }

  private transmitters(): void {
    const draft = this.knownMessage();
    this.sign(':');
    const senders: string[] = [];
    while (this.peek().kind === 'word') {
      const sender = this.word('a node');
      if (sender !== nobody) senders.push(sender);
      if (this.peek().text === ',') this.at += 1;
    }
    this.sign(';');
    draft.senders = [...new Set([...draft.senders, ...senders])];
  }

  private values(token: Token): void {
    if (this.peek().kind === 'word') {
      this.remark(token, `values of the environment variable ${this.peek().text} are read over`);
      this.skipPastSemicolon();
      return;
    }
    const signal = this.knownSignal();
    signal.values = this.namedValues();
  }

  private namedValues(): NamedValue[] {
    const values: NamedValue[] = [];
    while (this.peek().kind === 'number') values.push([this.number('a value'), this.string()]);
    this.sign(';');
    return values;
  }

  private comment(token: Token): void {
    const word = this.peek();
    if (word.kind === 'string') this.builder.comment = this.string();
    else {
      const of = this.word('BU_, BO_ or SG_');
      if (of === 'BU_') this.knownNode().comment = this.string();
      else if (of === 'BO_') this.knownMessage().comment = this.string();
      else if (of === 'SG_') this.knownSignal().comment = this.string();
      else if (of === 'EV_') {
        this.word('the name of an environment variable');
        this.string();
        this.remark(token, 'the comment of an environment variable is read over');
      } else throw new Unreadable(word, `${of} where BU_, BO_ or SG_ belongs`);
    }
    this.sign(';');
  }

  private definition(token: Token): void {
    let of: AttributeDefinition['of'] | 'other' = 'database';
    if (this.peek().kind === 'word') {
      const word = this.word('BU_, BO_ or SG_');
      of = word === 'BU_' ? 'node' : word === 'BO_' ? 'message' : word === 'SG_' ? 'signal' : 'other';
    }
    const name = this.string();
    const type = this.word('INT, HEX, FLOAT, STRING or ENUM');
    if (of === 'other') {
      this.remark(token, `attribute ${name} of environment variables is read over`);
      this.skipPastSemicolon();
      return;
    }
    if (type === 'STRING') this.builder.definitions.push({ name, of, type });
    else if (type === 'ENUM') {
      const choices: string[] = [];
      while (this.peek().kind === 'string') {
        choices.push(this.string());
        if (this.peek().text === ',' && this.peek().kind === 'sign') this.at += 1;
      }
      this.builder.definitions.push({ name, of, type, choices });
    } else if (type === 'INT' || type === 'HEX' || type === 'FLOAT') {
      // Some files leave the range away.
      if (this.peek().kind !== 'number') this.builder.definitions.push({ name, of, type });
      else
        this.builder.definitions.push({
          name,
          of,
          type,
          least: this.number('the least'),
          most: this.number('the most'),
        });
    } else throw new Unreadable(this.before, `${type} where INT, HEX, FLOAT, STRING or ENUM belongs`);
    this.sign(';');
  }

  private attribute(token: Token): void {
    const name = this.string();
    if (this.peek().kind !== 'word') {
      this.builder.attributes[name] = this.value();
      this.sign(';');
      return;
    }
    const of = this.word('BU_, BO_ or SG_');
    if (of === 'BU_') {
      const node = this.knownNode();
      node.attributes[name] = this.value();
    } else if (of === 'BO_') {
      const draft = this.knownMessage();
      draft.attributes[name] = this.value();
    } else if (of === 'SG_') {
      const signal = this.knownSignal();
      signal.attributes[name] = this.value();
    } else if (of === 'EV_') {
      this.remark(token, `attribute ${name} of an environment variable is read over`);
      this.skipPastSemicolon();
      return;
    } else throw new Unreadable(this.before, `${of} where BU_, BO_ or SG_ belongs`);
    this.sign(';');
  }

  private valueType(): void {
    const signal = this.knownSignal();
    if (this.peek().text === ':') this.at += 1;
    const type = this.whole('the value type');
    const bits = type === 1 ? 32 : type === 2 ? 64 : 0;
    if (type > 2) throw new Unreadable(this.before, `value type ${type}, 0 (integer), 1 (float) or 2 (double)`);
    if (bits > 0 && signal.length !== bits)
      throw new Unreadable(this.before, `${signal.name} is a float of ${signal.length} bits, ${bits} bits`);
    signal.float = bits > 0;
    this.sign(';');
  }

  private multiplexing(): void {
    const signal = this.knownSignal();
    const selector = this.word('the selecting signal');
    const values: (readonly [number, number])[] = [];
    for (;;) {
      const from = this.whole('a value');
      this.sign('-');
      values.push([from, this.whole('a value')]);
      if (this.peek().text !== ',') break;
      this.at += 1;
    }
    this.sign(';');
    signal.selectedBy = { signal: selector, values };
  }

  private knownMessage(): MessageDraft {
    const place = this.peek();
    const identifier = this.identifier();
    const draft = this.builder.find(identifier);
    if (!draft) throw new Unreadable(place, `no message has the number ${place.text}`);
    return draft;
  }

  private knownSignal(): SignalDraft {
    const draft = this.knownMessage();
    const place = this.peek();
    const name = this.word('the name of a signal');
    const signal = draft.signals.find((one) => one.name === name);
    if (!signal) throw new Unreadable(place, `message ${draft.name} has no signal ${name}`);
    return signal;
  }

  private knownNode(): { comment: string; attributes: Record<string, number | string> } {
    const place = this.peek();
    const node = this.builder.findNode(this.word('the name of a node'));
    if (!node) throw new Unreadable(place, `no node ${place.text}`);
    return node;
  }

  private identifier(): number {
    const place = this.peek();
    const value = this.whole('the number of a message');
    const extended = value >= extendedBit;
    const bare = extended ? value - extendedBit : value;
    if (value !== unplaced && bare > (extended ? 0x1fffffff : 0x7ff))
      throw new Unreadable(place, `number ${place.text} fits neither 11 bits nor, with bit 31 set, 29 bits`);
    return value;
  }

  private value(): number | string {
    return this.peek().kind === 'string' ? this.string() : this.number('a value');
  }

  private get before(): Token {
    return this.tokens[this.at - 1];
  }

  private word(what: string): string {
    return this.take('word', what);
  }

  private string(): string {
    return this.take('string', 'a text in quotes');
  }

  private number(what: string): number {
    return Number(this.take('number', what));
  }

  private whole(what: string): number {
    const place = this.peek();
    const value = this.number(what);
    if (!Number.isInteger(value) || value < 0)
      throw new Unreadable(place, `${place.text} where ${what} belongs: a whole number, not negative`);
    return value;
  }

  private sign(text: string): void {
    if (this.peek().kind !== 'sign' || this.peek().text !== text)
      throw new Unreadable(this.peek(), `${shown(this.peek())} where ${text} belongs`);
    this.at += 1;
  }

  private oneOf(a: string, b: string): string {
    const { text, kind } = this.peek();
    if (kind !== 'sign' || (text !== a && text !== b))
      throw new Unreadable(this.peek(), `${shown(this.peek())} where ${a} or ${b} belongs`);
    this.at += 1;
    return text;
  }

  private take(kind: Token['kind'], what: string): string {
    const token = this.peek();
    if (token.kind !== kind) throw new Unreadable(token, `${shown(token)} where ${what} belongs`);
    this.at += 1;
    return token.text;
  }

  private fail(token: Token, what: string): never {
    throw new Unreadable(token, what);
  }

  private remark(token: Token, what: string): void {
    this.remarks.push({ line: token.line, column: token.column, what });
  }

  private skipPastSemicolon(): void {
    while (this.peek().kind !== 'end' && this.peek().text !== ';') this.at += 1;
    if (this.peek().kind !== 'end') this.at += 1;
  }

  /** On to the next word that begins a line and looks like a keyword. */
  private skipToStatement(): void {
    while (
      this.peek().kind !== 'end' &&
      !(
        this.peek().first &&
        this.peek().kind === 'word' &&
        /^(?:VERSION|[A-Z][A-Z_]*_|FILTER)$/.test(this.peek().text) &&
        this.peek().text !== 'SG_'
      )
    )
      this.at += 1;
  }
}

function shown(token: Token): string {
  return token.kind === 'string' ? `a text "${token.text.slice(0, 20)}"` : token.text;
}
