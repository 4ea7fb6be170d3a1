import { writeFileSync } from 'node:fs';
import { Command } from 'commander';
import { exitCode } from '../../runtime/verdict.js';
import { reportOfRecording } from '../report/from-recording.js';
import { reportHtml } from '../report/html.js';
import { reportJson } from '../report/json.js';
import { junitXml } from '../report/junit.js';
import { CommandError } from './failure.js';

export interface ReportFiles {
  readonly to?: string | undefined;
  readonly junit?: string | undefined;
  readonly json?: string | undefined;
}

export function reportCommand(): Command {
  return new Command('report')
    .description('makes the report of a recorded run: verdicts with margins, plots, events, timing, energy')
    .argument('RECORDING', 'recording file')
    .option('--to <FILE.html>', 'one page that needs nothing else; prints on A4')
    .option('--junit <FILE.xml>', 'JUnit XML')
    .option('--json <FILE.json>', 'JSON')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring report recordings/harbour-truck.osrec --to round.html --junit round.xml\n\nExit code: that of the run. A recording without an end is not valid: it ended early.',
    )
    .action((file: string, options: ReportFiles) => {
      if (options.to === undefined && options.junit === undefined && options.json === undefined)
        throw new CommandError('say what to write: --to FILE.html, --junit FILE.xml, --json FILE.json');
      process.exitCode = writeReports(file, options);
    });
}

/** Writes what is asked for of one recording; the exit code of its run. */
export function writeReports(file: string, options: ReportFiles): number {
  const { data, remarks } = reportOfRecording(file);
  const write = (to: string, text: string) => {
    writeFileSync(to, text);
    process.stderr.write(`${to} written\n`);
  };
  for (const remark of remarks) process.stderr.write(`note ${remark}\n`);
  if (options.to !== undefined) write(options.to, reportHtml(data));
  if (options.junit !== undefined) write(options.junit, junitXml([data]));
  if (options.json !== undefined) write(options.json, reportJson(data));
  // What is left of a run that broke can be reported: it does not count.
  return data.judgement.exitCode === exitCode.unfinished ? exitCode.notValid : data.judgement.exitCode;
}
