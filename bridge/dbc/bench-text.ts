import { partsOf } from '../j1939/identifier.js';
import type { CanLayout, MapSignal, MessageSpec } from '../message-map.js';

/**
 * Messages as the `messages:` of a bench file. What a signal carries (`from`) or drives (`to`) no database says: the
 * place of the first is kept by a word that the bench reader stumbles over, and names what is like it.
 */
export function benchText(messages: readonly MessageSpec[], step: number): string {
  const lines = ['messages:'];
  for (const message of messages) {
    lines.push(`  ${message.name}:`);
    const add = (key: string, value: string | number): void => {
      lines.push(`    ${key}: ${value}`);
    };
    const time = (ticks: number): string => `${Number((ticks * step * 1000).toPrecision(12))} ms`;
    if (message.about !== '') add('about', quoted(message.about));
    add('direction', message.direction);
    add('link', message.link);
    if (message.j1939) add('j1939', groupText(message.identifier));
    else {
      add('id', `0x${message.identifier.toString(16)}`);
      if (message.extended) add('extended', 'on');
    }
    add('bytes', message.bytes ?? 8);
    if (message.flexibleDataRate) add('flexibleDataRate', 'on');
    if (message.bitRateSwitch) add('bitRateSwitch', 'on');
    if (message.trigger !== 'cyclic') add('trigger', message.trigger);
    if (message.every > 0) add('every', time(message.every));
    if (message.fastEvery !== undefined) add('fastEvery', time(message.fastEvery));
    if (message.startDelay > 0) add('startDelay', time(message.startDelay));
    if (message.direction === 'received') add('timeout', time(message.timeout));
    lines.push('    signals:');
    for (const signal of message.signals) lines.push(`      ${signal.name}: ${signalText(signal, message)}`);
  }
  return `${lines.join('\n')}\n`;
}

function groupText(identifier: number): string {
  const { pgn, source, priority, destination } = partsOf(identifier);
  const to = destination === undefined ? '' : `, destination: ${destination}`;
  return `{ pgn: ${pgn}, source: ${source}, priority: ${priority}${to} }`;
}

function signalText(signal: MapSignal, message: MessageSpec): string {
  const parts: string[] = [];
  if (message.direction === 'sent') parts.push('from: fill.in');
  parts.push(`unit: ${quoted(signal.unit)}`, `range: ${signal.least} .. ${signal.most}`);
  if (message.direction === 'received') parts.push(`substitute: ${signal.substitute}`);
  if (signal.names)
    parts.push(
      `names: { ${Object.entries(signal.names)
        .map(([name, value]) => `${name}: ${value}`)
        .join(', ')} }`,
    );
  if (signal.can) parts.push(`can: { ${layoutText(signal.can)} }`);
  if (signal.about !== signal.name) parts.push(`about: ${quoted(signal.about)}`);
  return `{ ${parts.join(', ')} }`;
}

function layoutText(layout: CanLayout): string {
  const parts = [`start: ${layout.startBit}`, `length: ${layout.length}`];
  if (layout.byteOrder === 'big') parts.push('order: big');
  if (layout.signed) parts.push('signed: on');
  if (layout.float) parts.push('float: on');
  if (layout.scale !== 1) parts.push(`scale: ${layout.scale}`);
  if (layout.offset !== 0) parts.push(`offset: ${layout.offset}`);
  if (layout.selector) parts.push('selector: on');
  if (layout.selectedBy) {
    const values = layout.selectedBy.values.map(([from, to]) => (from === to ? `${from}` : `${from} .. ${to}`));
    parts.push(`when: { ${layout.selectedBy.signal}: [${values.join(', ')}] }`);
  }
  return parts.join(', ');
}

/** A text that YAML takes for a text, on one line. */
function quoted(text: string): string {
  return JSON.stringify(text);
}
