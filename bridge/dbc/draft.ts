import type { CanLayout } from '../message-map.js';
import type { AttributeDefinition, Database, DatabaseMessage, DatabaseSignal, NamedValue } from './database.js';
import { isFlexible, usualAttributes } from './database.js';
import type { Token } from './tokens.js';

export interface SignalDraft {
  readonly place: Token;
  readonly name: string;
  readonly selector: boolean;
  /** Value of `m0`, `m1`, ... */
  readonly selected: number | undefined;
  readonly startBit: number;
  readonly length: number;
  readonly byteOrder: 'little' | 'big';
  readonly signed: boolean;
  readonly scale: number;
  readonly offset: number;
  readonly least: number;
  readonly most: number;
  readonly unit: string;
  readonly receivers: readonly string[];
  float: boolean;
  selectedBy: CanLayout['selectedBy'] | undefined;
  comment: string;
  values: readonly NamedValue[];
  readonly attributes: Record<string, number | string>;
}

export interface MessageDraft {
  readonly place: Token;
  readonly number: number;
  readonly name: string;
  readonly bytes: number;
  senders: readonly string[];
  comment: string;
  readonly signals: SignalDraft[];
  readonly attributes: Record<string, number | string>;
}

/** What a reader has gathered of a database, until all statements are read. */
export class DatabaseBuilder {
  version = '';
  comment = '';
  readonly valueTables: { name: string; values: NamedValue[] }[] = [];
  readonly definitions: AttributeDefinition[] = [];
  readonly attributes: Record<string, number | string> = {};
  private readonly nodes: { name: string; comment: string; attributes: Record<string, number | string> }[] = [];
  private readonly messages: MessageDraft[] = [];

  node(name: string): void {
    if (!this.findNode(name)) this.nodes.push({ name, comment: '', attributes: {} });
  }

  findNode(name: string) {
    return this.nodes.find((one) => one.name === name);
  }

  message(place: Token, number: number, name: string, bytes: number, senders: readonly string[]): MessageDraft {
    const draft: MessageDraft = { place, number, name, bytes, senders, comment: '', signals: [], attributes: {} };
    this.messages.push(draft);
    return draft;
  }

  find(number: number): MessageDraft | undefined {
    return this.messages.find((one) => one.number === number);
  }

  usual(name: string, value: number | string, missing: () => never): void {
    const index = this.definitions.findIndex((one) => one.name === name);
    if (index < 0) missing();
    this.definitions[index] = { ...this.definitions[index], usual: value };
  }

  finish(problem: (line: number, column: number, what: string) => void): Database {
    const seen = new Set<number>();
    const messages: DatabaseMessage[] = [];
    for (const draft of this.messages) {
      const { place } = draft;
      if (draft.number === 0xc0000000) continue;
      if (seen.has(draft.number)) {
        problem(place.line, place.column, `two messages have the number ${draft.number}`);
        continue;
      }
      seen.add(draft.number);
      const extended = draft.number >= 0x80000000;
      const flexible = isFlexible(draft, this.definitions);
      const said = draft.attributes[usualAttributes.bitRateSwitch];
      messages.push({
        name: draft.name,
        identifier: extended ? draft.number - 0x80000000 : draft.number,
        extended,
        bytes: draft.bytes,
        flexibleDataRate: flexible,
        bitRateSwitch: flexible && this.means(usualAttributes.bitRateSwitch, said),
        senders: draft.senders,
        comment: draft.comment,
        attributes: draft.attributes,
        signals: draft.signals.map((signal) => finishSignal(signal, draft, problem)),
      });
    }
    const { version, comment, valueTables, definitions, attributes, nodes } = this;
    return { version, comment, valueTables, definitions, attributes, nodes, messages };
  }

  /** Whether an attribute says yes: 1, or the choice `1`. */
  private means(name: string, said: number | string | undefined): boolean {
    const definition = this.definitions.find((one) => one.name === name);
    const value = said ?? definition?.usual;
    const chosen = typeof value === 'number' && definition?.choices ? definition.choices[value] : value;
    return chosen === 1 || chosen === '1';
  }
}

function finishSignal(
  draft: SignalDraft,
  message: MessageDraft,
  problem: (line: number, column: number, what: string) => void,
): DatabaseSignal {
  const { line, column } = draft.place;
  let selectedBy = draft.selectedBy;
  if (draft.selected !== undefined && !selectedBy) {
    const selectors = message.signals.filter((other) => other.selector && other.selected === undefined);
    const [selector] = selectors;
    if (selectors.length === 1 && selector)
      selectedBy = { signal: selector.name, values: [[draft.selected, draft.selected]] };
    else
      problem(
        line,
        column,
        `${draft.name} is multiplexed and message ${message.name} has ${selectors.length} selectors (M)`,
      );
  } else if (selectedBy && !message.signals.some((other) => other.name === selectedBy?.signal && other.selector)) {
    problem(
      line,
      column,
      `${draft.name} is selected by ${selectedBy.signal}, which is no selector (M) of message ${message.name}`,
    );
    selectedBy = undefined;
  }
  return {
    name: draft.name,
    layout: {
      startBit: draft.startBit,
      length: draft.length,
      byteOrder: draft.byteOrder,
      // The sign of a float says nothing.
      signed: draft.signed && !draft.float,
      float: draft.float,
      scale: draft.scale,
      offset: draft.offset,
      ...(draft.selector ? { selector: true } : {}),
      ...(selectedBy ? { selectedBy } : {}),
    },
    least: draft.least,
    most: draft.most,
    unit: draft.unit,
    receivers: draft.receivers,
    comment: draft.comment,
    values: draft.values,
    attributes: draft.attributes,
  };
}
