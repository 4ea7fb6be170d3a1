import { Command } from 'commander';
import pc from 'picocolors';
import { exitCode } from '../../runtime/verdict.js';
import { rederive } from '../run/rederive.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';

export function rederiveCommand(): Command {
  return new Command('rederive')
    .description('computes a recorded run again from its bench and inputs alone and compares the state tick by tick')
    .argument('RECORDING', 'recording file')
    .option('--json', 'one object on standard output')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring rederive recordings/harbour-truck.osrec\n\nExit code 0: identical, 4: it differs, 2: the recording cannot be read, 5: stopped.',
    )
    .action(async (file: string, options: { json?: boolean }) => {
      const progress = new Progress('rederive', options.json);
      try {
        const found = await rederive(file, (share) => progress.update(share));
        progress.done();
        if (options.json) process.stdout.write(`${JSON.stringify(found, undefined, 2)}\n`);
        else {
          for (const remark of found.remarks) process.stdout.write(`${pc.yellow('note')} ${remark}\n`);
          if (found.identical) process.stdout.write(`identical: ${found.compared} ticks, state hash ${found.hash}\n`);
          else {
            process.stdout.write(
              `${pc.red('differs')} from tick ${found.firstTick} on (${(found.firstTick! * found.step).toFixed(3)} s)\n`,
            );
            if (found.states.length === 0)
              process.stdout.write('no snapshot lies behind that tick: which states differ cannot be said\n');
            else
              process.stdout.write(
                `in the snapshot after tick ${found.snapshotTick}: ${found.states.length} states differ\n`,
              );
            for (const state of found.states.slice(0, 20))
              process.stdout.write(`  ${state.path}  recorded ${state.recorded}  derived ${state.derived}\n`);
          }
        }
        if (found.stopped) throw new CommandError('stopped before the end of the recording', exitCode.unfinished);
        if (found.identical && found.ending === 'damaged')
          throw new CommandError('identical up to where the recording is damaged: what lies behind cannot be read');
        process.exitCode = found.identical ? exitCode.fine : exitCode.differs;
      } finally {
        progress.done();
      }
    });
}
