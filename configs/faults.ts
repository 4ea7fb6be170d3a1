import type { BenchSpec } from './bench-spec.js';
import { isPressure, parseUnit, tradeUnit } from './units.js';

/** One fault that a scenario can set: `fault: PATH`, with `to:` unless it is a switch. */
export interface FaultEntry {
  readonly path: string;
  /** `sensor`, `power stage`, `component`, `controller`, `message`, `bus` */
  readonly group: string;
  /** What it sits in: `pressure-sensor`, `relief-valve`, `message from the controller`. */
  readonly of: string;
  readonly about: string;
  /** In which people write it. */
  readonly unit: string;
  readonly withoutFault: number;
  readonly least?: number;
  readonly most?: number;
  /** Thrown by `fault: PATH` alone. */
  readonly isSwitch: boolean;
}

/** All faults of a bench, from the declarations of its elements, instruments and messages; in the order of the bench file. */
export function faultCatalogue(spec: BenchSpec): FaultEntry[] {
  const elements = new Map(spec.circuit.elements.map((one) => [one.name, one.kind.kind]));
  const instruments = new Map(spec.instruments.map((one) => [one.name, one.kind.kind]));
  const messages = new Map(spec.map.messages.map((one) => [one.name, one.direction]));
  const found: FaultEntry[] = [];
  for (const info of spec.signals) {
    if (info.withoutFault === undefined) continue;
    const owner = info.path.slice(0, info.path.indexOf('.'));
    const element = elements.get(owner);
    const instrument = instruments.get(owner);
    const direction = messages.get(owner);
    const [group, of] =
      element !== undefined
        ? ['component', element]
        : instrument !== undefined
          ? [
              instrument.includes('sensor') ? 'sensor' : /-(in|out)put$/.test(instrument) ? 'wire' : 'power stage',
              instrument,
            ]
          : owner === 'controller'
            ? ['controller', 'the controller as a whole']
            : direction === undefined
              ? ['bus', 'CAN link']
              : ['message', direction === 'sent' ? 'message to the controller' : 'message from the controller'];
    found.push({
      path: info.path,
      group,
      of,
      about: info.about,
      unit: isPressure(parseUnit(info.unit)) ? 'bar' : tradeUnit(info.unit, info.difference),
      withoutFault: info.withoutFault,
      ...(info.least === undefined ? {} : { least: info.least }),
      ...(info.most === undefined ? {} : { most: info.most }),
      isSwitch:
        info.unit === '1' &&
        info.withoutFault === 0 &&
        info.least === 0 &&
        info.most === 1 &&
        info.about.startsWith('1:'),
    });
  }
  return found;
}

/** The catalogue as a page of Markdown. */
export function faultPage(spec: BenchSpec): string {
  const lines = [
    `# Faults of ${spec.name}`,
    '',
    'Made from the declarations of the bench. A scenario sets one with `fault: PATH` (a switch) or `fault: PATH` and `to: VALUE`, over a',
    'time with `over:`, and takes it back with `clear: PATH`. Each is exact to the tick; what is left to chance follows from the seed.',
  ];
  const groups = [...new Set(faultCatalogue(spec).map((one) => one.group))];
  for (const group of groups) {
    lines.push(
      '',
      `## ${group[0]!.toUpperCase()}${group.slice(1)}`,
      '',
      '| fault | in | unit | without | range | what it does |',
      '|---|---|---|---|---|---|',
    );
    for (const one of faultCatalogue(spec).filter((entry) => entry.group === group)) {
      const range = one.least === undefined && one.most === undefined ? '' : `${one.least ?? ''} .. ${one.most ?? ''}`;
      lines.push(
        `| \`${one.path}\` | ${one.of} | ${one.isSwitch ? 'switch' : one.unit} | ${one.withoutFault} | ${range} | ${one.about.replaceAll('|', '\\|')} |`,
      );
    }
  }
  return lines.join('\n');
}
