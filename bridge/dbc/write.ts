import type {
  AttributeDefinition,
  Attributes,
  Database,
  DatabaseMessage,
  DatabaseSignal,
  NamedValue,
} from './database.js';
import { nobody } from './database.js';

/** Writes a database as CAN database text (`.dbc`); `encodeDatabase` makes the bytes of a file of it. */
export function writeDatabase(database: Database): string {
  const { messages } = database;
  const lines: string[] = [
    `VERSION ${quoted(database.version)}`,
    '',
    'NS_ :',
    ...newSymbols.map((symbol) => `\t${symbol}`),
    '',
    'BS_:',
    '',
    `BU_: ${database.nodes.map((node) => node.name).join(' ')}`.trimEnd(),
    ...database.valueTables.map((table) => `VAL_TABLE_ ${table.name} ${named(table.values)};`),
    '',
  ];
  for (const message of messages) {
    lines.push(`BO_ ${numberOf(message)} ${message.name}: ${message.bytes} ${message.senders[0] ?? nobody}`);
    for (const signal of message.signals) lines.push(signalLine(signal));
    lines.push('');
  }
  for (const message of messages)
    if (message.senders.length > 1) lines.push(`BO_TX_BU_ ${numberOf(message)} : ${message.senders.join(',')};`);
  lines.push(...comments(database));
  for (const definition of database.definitions) lines.push(definitionLine(definition));
  for (const { name, usual } of database.definitions)
    if (usual !== undefined) lines.push(`BA_DEF_DEF_ ${quoted(name)} ${valueText(usual)};`);
  lines.push(...attributeLines(database));
  for (const message of messages)
    for (const signal of message.signals)
      if (signal.values.length > 0) lines.push(`VAL_ ${numberOf(message)} ${signal.name} ${named(signal.values)};`);
  for (const message of messages)
    for (const { name, layout } of message.signals)
      if (layout.float) lines.push(`SIG_VALTYPE_ ${numberOf(message)} ${name} : ${layout.length === 32 ? 1 : 2};`);
  for (const message of messages)
    for (const { name, layout } of message.signals)
      if (layout.selectedBy && needsExtended(message)) {
        const ranges = layout.selectedBy.values.map(([from, to]) => `${from}-${to}`).join(', ');
        lines.push(`SG_MUL_VAL_ ${numberOf(message)} ${name} ${layout.selectedBy.signal} ${ranges};`);
      }
  return `${lines.join('\n')}\n`;
}

const newSymbols = [
  'NS_DESC_',
  'CM_',
  'BA_DEF_',
  'BA_',
  'VAL_',
  'BA_DEF_DEF_',
  'VAL_TABLE_',
  'SIG_VALTYPE_',
  'BO_TX_BU_',
  'SG_MUL_VAL_',
];

/** What `m0` and `M` alone cannot say: more than one selector, nested ones, or more than one value. */
function needsExtended(message: DatabaseMessage): boolean {
  const selectors = message.signals.filter((signal) => signal.layout.selector);
  return (
    selectors.length > 1 ||
    message.signals.some(
      ({ layout }) =>
        layout.selectedBy &&
        (layout.selector ||
          layout.selectedBy.values.length !== 1 ||
          layout.selectedBy.values[0]![0] !== layout.selectedBy.values[0]![1]),
    )
  );
}

function signalLine({ name, layout, least, most, unit, receivers }: DatabaseSignal): string {
  const selected = layout.selectedBy ? `m${layout.selectedBy.values[0]?.[0] ?? 0}` : '';
  const multiplexing = selected || layout.selector ? ` ${selected}${layout.selector ? 'M' : ''}` : '';
  const order = layout.byteOrder === 'little' ? 1 : 0;
  return ` SG_ ${name}${multiplexing} : ${layout.startBit}|${layout.length}@${order}${layout.signed || layout.float ? '-' : '+'} (${layout.scale},${layout.offset}) [${least}|${most}] ${quoted(unit)} ${receivers.length > 0 ? receivers.join(',') : nobody}`;
}

function comments({ comment, nodes, messages }: Database): string[] {
  const lines: string[] = [];
  if (comment !== '') lines.push(`CM_ ${quoted(comment)};`);
  for (const node of nodes) if (node.comment !== '') lines.push(`CM_ BU_ ${node.name} ${quoted(node.comment)};`);
  for (const message of messages) {
    if (message.comment !== '') lines.push(`CM_ BO_ ${numberOf(message)} ${quoted(message.comment)};`);
    for (const signal of message.signals)
      if (signal.comment !== '') lines.push(`CM_ SG_ ${numberOf(message)} ${signal.name} ${quoted(signal.comment)};`);
  }
  return lines;
}

const owners = { database: '', node: 'BU_ ', message: 'BO_ ', signal: 'SG_ ' } as const;

function definitionLine({ name, of, type, least, most, choices }: AttributeDefinition): string {
  const range =
    type === 'ENUM' ? ` ${(choices ?? []).map(quoted).join(',')}` : least === undefined ? '' : ` ${least} ${most}`;
  return `BA_DEF_ ${owners[of]}${quoted(name)} ${type}${range};`;
}

function attributeLines({ attributes, nodes, messages }: Database): string[] {
  const lines: string[] = [];
  const add = (owner: string, all: Attributes): void => {
    for (const [name, value] of Object.entries(all)) lines.push(`BA_ ${quoted(name)} ${owner}${valueText(value)};`);
  };
  add('', attributes);
  for (const node of nodes) add(`BU_ ${node.name} `, node.attributes);
  for (const message of messages) {
    add(`BO_ ${numberOf(message)} `, message.attributes);
    for (const signal of message.signals) add(`SG_ ${numberOf(message)} ${signal.name} `, signal.attributes);
  }
  return lines;
}

function numberOf(message: DatabaseMessage): number {
  return message.extended ? message.identifier + 0x80000000 : message.identifier;
}

function named(values: readonly NamedValue[]): string {
  return values.map(([value, name]) => `${value} ${quoted(name)} `).join('');
}

function valueText(value: number | string): string {
  return typeof value === 'number' ? `${value}` : quoted(value);
}

function quoted(text: string): string {
  return `"${text.replaceAll('"', '\\"')}"`;
}
