import { requireSoundMap } from './examine-map.js';
import type { MapSignal, MessageMap, MessageSpec } from './message-map.js';
import { goesByChange, goesByCycle } from './schedule.js';
import { mapChecksum, type UdpLayout, udpLayout } from './udp-layout.js';

/**
 * The message map as one HTML page for people, without scripts and without anything to fetch: per message its link,
 * number, direction, cycle and protection, and a table of its signals. `step` is the length of a tick, s.
 */
export function mapTable(map: MessageMap, bench: string, step: number): string {
  requireSoundMap(map);
  const links = map.links.map(
    (link) => `<li><a href="#link-${text(link.name)}">${text(link.name)}</a>, ${text(link.kind)}</li>`,
  );
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>Messages of ${text(bench)}</title>
<style>
body { font: 1rem/1.5 system-ui, sans-serif; margin: 2rem auto; max-width: 80rem; padding: 0 1rem; color: #1a1a1a; background: #fff }
table { border-collapse: collapse; width: 100%; margin: 0.5rem 0 2rem }
th, td { text-align: left; padding: 0.25rem 0.75rem 0.25rem 0; border-bottom: 1px solid #767676; vertical-align: top }
td.number, th.number { text-align: right; font-variant-numeric: tabular-nums }
caption { text-align: left; padding: 0.25rem 0 }
.wide { overflow-x: auto }
@media (prefers-color-scheme: dark) { body { color: #e8e8e8; background: #1a1a1a } a { color: #9cc4ff } }
</style>
</head>
<body>
<main>
<h1>Messages of ${text(bench)}</h1>
<p>Map checksum <code>${(mapChecksum(map) >>> 0).toString(16).padStart(8, '0')}</code>. A tick is ${time(1, step)}. Directions are seen from the bench. oilspring is not a safety device.</p>
<ul>
${links.join('\n')}
</ul>
${map.links.map((link) => linkText(map, link.name, step)).join('\n')}
</main>
</body>
</html>
`;
}

function linkText(map: MessageMap, name: string, step: number): string {
  const link = map.links.find((one) => one.name === name)!;
  const own = map.messages.filter((message) => message.link === name);
  return `<section aria-labelledby="link-${text(name)}">
<h2 id="link-${text(name)}">Link ${text(name)}</h2>
${own.map((message) => messageText(message, link.kind === 'udp' ? udpLayout(message) : undefined, step)).join('\n')}
</section>`;
}

function messageText(message: MessageSpec, layout: UdpLayout | undefined, step: number): string {
  const received = message.direction === 'received';
  const place = layout ? ['Offset', 'Type'] : ['Start bit', 'Length', 'Order'];
  const columns = [
    'Signal',
    ...place,
    'Scale',
    'Offset of value',
    'Unit',
    'Range',
    ...(received ? ['Substitute', 'Drives'] : ['Carries']),
    'About',
  ];
  const rows = message.signals.map((signal, i) => row(signal, layout?.fields[i]?.offset, received));
  return `<h3>${text(message.name)}</h3>
<p>${text(message.about)}</p>
<div class="wide" tabindex="0" role="region" aria-label="Signals of ${text(message.name)}">
<table>
<caption>${facts(message, layout, step).map(text).join('; ')}.</caption>
<thead><tr>${columns.map((name) => `<th scope="col">${name}</th>`).join('')}</tr></thead>
<tbody>
${rows.join('\n')}
</tbody>
</table>
</div>`;
}

function row(signal: MapSignal, offset: number | undefined, received: boolean): string {
  const can = signal.can;
  const place =
    offset !== undefined
      ? [`${offset}`, signal.type]
      : can
        ? [`${can.startBit}`, `${can.length}${can.float ? ' float' : can.signed ? ' signed' : ''}`, can.byteOrder]
        : ['', '', ''];
  const scaling = offset === undefined && can ? can : signal;
  const names = Object.entries(signal.names ?? {}).map(([name, value]) => `${value} = ${name}`);
  const about = names.length > 0 ? `${signal.about} (${names.join(', ')})` : signal.about;
  const cells = [...place, `${scaling.scale}`, `${scaling.offset}`, signal.unit, `${signal.least} .. ${signal.most}`];
  if (received) cells.push(`${signal.substitute}`);
  cells.push(signal.said ?? (signal.path === '' ? 'shown only' : signal.path), about);
  return `<tr><th scope="row">${text(signal.name)}</th>${cells.map((cell) => `<td>${text(cell)}</td>`).join('')}</tr>`;
}

function facts(message: MessageSpec, layout: UdpLayout | undefined, step: number): string[] {
  const parts = [
    message.direction,
    layout
      ? `number ${message.identifier}`
      : `identifier 0x${message.identifier.toString(16)}${message.extended ? ' (29 bit)' : ''}`,
  ];
  const length = layout ? layout.length : message.bytes;
  if (length !== undefined) parts.push(`${length} bytes`);
  if (goesByCycle(message)) parts.push(`every ${time(message.every, step)}`, `phase ${time(message.phase, step)}`);
  if (goesByChange(message)) parts.push(`on change, at most every ${time(message.fastEvery ?? 1, step)}`);
  if (message.trigger === 'on-request') parts.push('when it is asked for');
  if (message.standsFor !== undefined) parts.push(`the bench stands in for ${message.standsFor}`);
  if (message.whileText !== undefined) parts.push(`only while ${message.whileText}`);
  if (message.startDelay > 0) parts.push(`starts after ${time(message.startDelay, step)}`);
  if (message.direction === 'received') {
    parts.push(message.timeout > 0 ? `time-out ${time(message.timeout, step)}` : 'no time-out');
    parts.push(message.outOfRange === 'refuse' ? 'out of range: message refused' : 'out of range: brought into range');
  }
  if (layout) parts.push('protected by sequence and CRC-32');
  else if (message.protection)
    parts.push(
      `protection ${message.protection.kind} ${Object.entries(message.protection.settings)
        .map(([name, value]) => `${name} ${value}`)
        .join(', ')}`.trim(),
    );
  else parts.push('no protection');
  return parts;
}

function time(ticks: number, step: number): string {
  return `${Number((ticks * step * 1e3).toPrecision(9))} ms`;
}

function text(value: string): string {
  return value.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;').replace(/"/g, '&quot;');
}
