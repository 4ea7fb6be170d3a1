#!/usr/bin/env node
import { Command, CommanderError } from 'commander';
import { exitCode } from '../runtime/verdict.js';
import { checkCommand } from './commands/check.js';
import { compareCommand } from './commands/compare.js';
import { exportCommand } from './commands/export.js';
import { complain } from './commands/failure.js';
import { fitMapCommand } from './commands/fit-map.js';
import { importCommand } from './commands/import.js';
import { listCommand } from './commands/list.js';
import { listenCommand, replayCommand } from './commands/listen.js';
import { readinessCommand } from './commands/readiness.js';
import { rederiveCommand } from './commands/rederive.js';
import { reportCommand } from './commands/report.js';
import { runCommand } from './commands/run.js';
import { salvageCommand } from './commands/salvage.js';
import { suiteCommand } from './commands/suite.js';
import { viewCommand } from './commands/view.js';
import { wireCommand } from './commands/wire.js';
import { softwareVersion } from './run/host-run.js';

const program = new Command('oilspring')
  .description('A hydraulic-hybrid vehicle for a controller to drive, in real time on a test bench.')
  .version(softwareVersion())
  .showHelpAfterError('(oilspring --help tells what there is)')
  .addHelpText(
    'after',
    `
Exit codes: 0 fine, 1 a requirement failed, 2 bad input, 3 the run is not valid, 4 a run derived again differs,
5 the run could not be finished.

oilspring is not a safety device. High-pressure oil and gas kill: a real bench has its own relief valves, interlocks
and emergency stop, and its hydraulic work follows local codes and licensed practice.`,
  );
for (const command of [
  checkCommand(),
  runCommand(),
  rederiveCommand(),
  exportCommand(),
  reportCommand(),
  suiteCommand(),
  compareCommand(),
  listCommand(),
  wireCommand(),
  importCommand(),
  fitMapCommand(),
  listenCommand(),
  replayCommand(),
  viewCommand(),
  salvageCommand(),
  readinessCommand(),
])
  program.addCommand(command);
program.exitOverride();
for (const command of program.commands) command.exitOverride();

// a closed pipe (`oilspring list ... | head`) is not an error
process.stdout.on('error', (error: NodeJS.ErrnoException) =>
  process.exit(error.code === 'EPIPE' ? 0 : exitCode.unfinished),
);

// never as an exit code that says something about a run
process.on('uncaughtException', (error) => {
  // the run's view may have hidden the cursor
  if (process.stdout.isTTY) process.stdout.write('\n\x1b[?25h');
  complain(error);
  process.stderr.write('error the program broke; a recording that it was writing can be read: oilspring salvage\n');
  process.exit(exitCode.unfinished);
});

try {
  await program.parseAsync();
} catch (error) {
  if (error instanceof CommanderError) process.exitCode = error.exitCode === 0 ? exitCode.fine : exitCode.badInput;
  else process.exitCode = complain(error);
}
