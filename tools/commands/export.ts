import { Command } from 'commander';
import { parseQuantity } from '../../configs/quantity.js';
import { globTest } from '../../configs/signal-list.js';
import { exportCsv } from '../../runtime/recording/export-csv.js';
import { Recording } from '../../runtime/recording/reader.js';
import { nearest } from '../../runtime/signals.js';
import { CommandError, printable } from './failure.js';
import { Progress } from './progress.js';

export function exportCommand(): Command {
  return new Command('export')
    .description('writes recorded signals to a CSV file, with units in its heading')
    .argument('RECORDING', 'recording file')
    .requiredOption('--to <FILE.csv>', 'file to write')
    .option('--signals <a,b>', 'paths, with * for any run of letters; default: all that were recorded')
    .option('--every <10ms>', 'distance of the rows; default: every tick')
    .addHelpText(
      'after',
      "\nExample:\n  oilspring export recordings/harbour-truck.osrec --signals 'highLine.pressure,body.*' --every 10ms --to run.csv",
    )
    .action(async (file: string, options: { to: string; signals?: string; every?: string }) => {
      const recording = new Recording(file);
      const progress = new Progress('export');
      try {
        const known = recording.header.signals.map((signal) => signal.path);
        const wanted = options.signals === undefined ? undefined : match(options.signals.split(','), known);
        const result = await exportCsv(recording, {
          ...(wanted ? { signals: wanted } : {}),
          everyTicks: options.every === undefined ? 1 : ticks(options.every, recording.header.step),
          to: options.to,
          abort: progress.signal,
          onProgress: (share: number) => {
            progress.update(share);
          },
        });
        progress.done();
        if (result.ending.how !== 'complete')
          process.stderr.write(`note the recording ended early: ${printable(result.ending.what)}\n`);
        process.stderr.write(`${options.to}: ${result.rows} rows\n`);
      } finally {
        progress.done();
        recording.close();
      }
    });
}

function match(patterns: readonly string[], known: readonly string[]): string[] {
  const found = new Set<string>();
  for (const pattern of patterns) {
    const test = globTest(pattern.trim());
    const hits = known.filter(test);
    if (hits.length === 0) {
      const near = nearest(pattern.trim(), known, 3);
      throw new CommandError(
        `--signals: no recorded signal \`${pattern.trim()}\`${near.length > 0 ? `, did you mean ${near.join(' or ')}?` : ''}`,
      );
    }
    for (const hit of hits) found.add(hit);
  }
  return known.filter((path) => found.has(path));
}

function ticks(text: string, step: number): number {
  const seconds = parseQuantity(text.trim().replace(/^([\d.]+)\s*([a-z]+)$/i, '$1 $2'), { unit: 's' }).value;
  const count = Math.round(seconds / step);
  if (count < 1 || Math.abs(count * step - seconds) > 1e-6 * step)
    throw new CommandError(`--every ${text}: not a whole number of ticks of ${step * 1000} ms`);
  return count;
}
