import { clean } from '../terminal/text.js';
import type { Remains } from './look.js';

/** What is left of one run, in lines; nothing in them that a terminal would act on. */
export function remainsText(remains: Remains): string {
  const { ending, step, ticks, planned } = remains;
  const how = ending.how === 'complete' ? 'whole' : `not valid: ${ending.how}`;
  const seconds = (count: number) => `${(count * step).toFixed(3)} s`;
  const lines = [
    `${remains.file}: ${how}`,
    `  ran          ${remains.bench}, ${remains.scenario}, ${remains.pace}, seed ${remains.seed}, ${remains.software}`,
    `  began        ${remains.created}${remains.lastSeen === undefined || Number.isNaN(remains.lastSeen) ? '' : `, last seen alive at ${new Date(remains.lastSeen).toISOString()}`}`,
    `  holds        ${ticks === 0 ? 'no counted tick' : seconds(ticks)}${Number.isNaN(planned) ? '' : ` of ${seconds(planned)}`}: ${remains.rows} rows, ${remains.inputs} inputs, ${remains.events} events, ${remains.snapshots} snapshots`,
    ...(remains.gaps > 0 ? [`  gaps         ${remains.gaps} ticks have no row`] : []),
    `  ends         ${ending.what}`,
    ...(remains.unreadable > 0 ? [`  unreadable   ${remains.unreadable} of ${remains.bytes} bytes`] : []),
    ...remains.lastEvents.map(
      ({ time, severity, text }, i) =>
        `  ${i === 0 ? 'last events ' : '            '} ${time.toFixed(3)} s ${severity}: ${text}`,
    ),
  ];
  return `${lines.map(clean).join('\n')}\n`;
}

/** What can be done with it. */
export function nextSteps(remains: Remains): string {
  const { file, ending, rows } = remains;
  const name = file.replace(/\.osrec$/, '');
  if (ending.how === 'complete') return '';
  if (rows === 0) return clean('  go on with   nothing: there is no row in it; it may be deleted') + '\n';
  const lines =
    ending.how === 'damaged'
      ? [`oilspring salvage ${file} --to ${name}-whole.osrec`, 'then report, export and rederive that copy']
      : [
          `oilspring report ${file} --to ${name}.html`,
          `oilspring export ${file} --to ${name}.csv`,
          `oilspring rederive ${file}`,
        ];
  return `${lines.map((line, i) => clean(`  ${i === 0 ? 'go on with  ' : '            '} ${line}`)).join('\n')}\n`;
}
