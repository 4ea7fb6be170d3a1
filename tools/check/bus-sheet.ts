import pc from 'picocolors';
import { type BusLoad, busLoad, busRemarks } from '../../bridge/bus-load.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { table } from '../commands/table.js';

export interface BusSheet {
  readonly text: string;
  readonly loads: readonly BusLoad[];
  /** Buses that cannot carry their messages, in words. */
  readonly overloaded: readonly string[];
}

/** Load and worst waiting times of the CAN links of a bench, as text for people; empty where it has none. */
export function busSheet(spec: BenchSpec): BusSheet {
  const loads: BusLoad[] = [];
  const overloaded: string[] = [];
  const parts: string[] = [];
  for (const link of spec.map.links) {
    if (link.kind === 'udp') continue;
    const bus = busLoad(spec.map, link, spec.step);
    if (bus === undefined) {
      parts.push(`bus ${link.name}: no bitRate, so that its load is not known; add bitRate: 500 kbit/s to the link`);
      continue;
    }
    loads.push(bus);
    const remarks = busRemarks(bus, spec.map, spec.step);
    overloaded.push(...remarks.overloaded.map((remark) => `bus ${link.name}: ${remark}`));
    parts.push(
      [
        `${pc.bold(`bus ${link.name}`)}  ${bus.bitRate / 1000} kbit/s${bus.dataBitRate === undefined ? '' : `, data ${bus.dataBitRate / 1000} kbit/s`}: at most ${(bus.load * 100).toFixed(1)} % busy, at most ${milliseconds(bus.burst.time)} ms from the bench in one tick`,
        table(
          [
            [
              'message',
              'identifier',
              'way',
              'every',
              'frame',
              'waits',
              'arrives',
              'ms, at worst, if each node sends its most urgent frame first',
            ],
            ...bus.messages.map((message) => [
              message.name,
              `0x${message.identifier.toString(16)}${message.extended ? 'x' : ''}`,
              message.direction,
              milliseconds(message.period),
              milliseconds(message.time),
              milliseconds(message.queueing),
              milliseconds(message.response),
              '',
            ]),
          ],
          [3, 4, 5, 6],
        ),
        ...remarks.overloaded.map((remark) => `${pc.red('overloaded')} ${remark}`),
        ...remarks.warnings.map((remark) => `${pc.yellow('warning')} ${remark}`),
      ].join('\n'),
    );
  }
  return { text: parts.join('\n\n'), loads, overloaded };
}

function milliseconds(time: number): string {
  return Number.isFinite(time) ? `${Number((time * 1e3).toFixed(3))}` : 'for ever';
}
