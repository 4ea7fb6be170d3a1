import { readdirSync, statSync } from 'node:fs';
import path from 'node:path';
import { Command } from 'commander';
import { RecordingError } from '../../runtime/recording/format.js';
import { exitCode } from '../../runtime/verdict.js';
import { endsWhole } from '../salvage/ends-whole.js';
import { copyWhole, lookInto, type Remains } from '../salvage/look.js';
import { nextSteps, remainsText } from '../salvage/words.js';
import { writersOf } from '../salvage/writers.js';
import { clean } from '../terminal/text.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';

interface SalvageFlags {
  readonly to?: string;
  readonly json?: boolean;
}

interface Found {
  readonly remains: Remains[];
  /** Recordings that cannot be opened, with why. */
  readonly unreadable: { readonly file: string; readonly why: string }[];
  /** Being written now, with the process that writes. */
  readonly writing: { readonly file: string; readonly process: number }[];
  readonly whole: number;
}

export function salvageCommand(): Command {
  return new Command('salvage')
    .description('finds recordings without their end, after a crash or a power cut, and says what is in them')
    .argument('[RECORDING]', 'recording file, or a folder of recordings', 'recordings')
    .option('--to <FILE.osrec>', 'write the whole blocks of one recording into a new file')
    .option('--json', 'one object on standard output')
    .addHelpText(
      'after',
      `
Examples:
  oilspring salvage
  oilspring salvage recordings/harbour-truck.osrec
  oilspring salvage damaged.osrec --to readable.osrec

A recording is whole up to its last whole block, whatever ended the run. Report, export and rederive read it up to there;
its report says \`not valid: ended early\`. Nothing is changed in the file itself.

Exit code 0: nothing without an end, 3: something, 2: a file that is no recording.`,
    )
    .action(async (said: string, flags: SalvageFlags) => {
      const stat = statSync(said, { throwIfNoEntry: false });
      if (stat === undefined)
        throw new CommandError(`${said}: there is no such file or folder; name a recording (.osrec), or its folder`);
      if (stat.isDirectory() && flags.to !== undefined)
        throw new CommandError('--to takes the blocks of one recording: name the file instead of the folder');
      const progress = new Progress('salvage', flags.json);
      let found: Found;
      try {
        found = await search(said, stat.isDirectory(), progress);
      } finally {
        progress.done();
      }
      const [only] = found.remains;
      if (flags.to !== undefined && only !== undefined) copyWhole(only, flags.to);
      if (flags.json) process.stdout.write(`${JSON.stringify(found, undefined, 2)}\n`);
      else process.stdout.write(text(found, flags.to));
      const broken = found.remains.filter(({ ending }) => ending.how !== 'complete').length + found.unreadable.length;
      process.exitCode = broken > 0 ? exitCode.notValid : exitCode.fine;
    });
}

async function search(said: string, folder: boolean, progress: Progress): Promise<Found> {
  const files = folder
    ? readdirSync(said)
        .filter((name) => name.endsWith('.osrec'))
        .sort()
        .map((name) => path.join(said, name))
    : [said];
  const suspects = folder ? files.filter((file) => !endsWhole(file)) : files;
  const writers = writersOf(suspects);
  const found: Found = { remains: [], unreadable: [], writing: [], whole: files.length - suspects.length };
  for (const [number, file] of suspects.entries()) {
    const process = writers.get(file);
    if (process !== undefined) {
      found.writing.push({ file, process });
      continue;
    }
    try {
      const remains = await lookInto(file, (share) => progress.update((number + share) / suspects.length));
      if (remains === undefined) throw new CommandError('stopped', exitCode.unfinished);
      found.remains.push(remains);
    } catch (error) {
      if (!(error instanceof RecordingError) || !folder) throw error;
      found.unreadable.push({ file, why: error.message });
    }
  }
  return found;
}

function text({ remains, unreadable, writing, whole }: Found, copy: string | undefined): string {
  const parts = remains.map((one) => remainsText(one) + (copy === undefined ? nextSteps(one) : ''));
  for (const { file, why } of unreadable) parts.push(`${clean(file)}: nothing of it can be read\n  ${clean(why)}\n`);
  for (const one of writing) parts.push(`${clean(one.file)}: is being written, by process ${one.process}\n`);
  if (copy !== undefined) parts.push(`${clean(copy)} written: it ends early, and all that is in it can be read\n`);
  if (remains.length + unreadable.length + writing.length === 0)
    parts.push(whole === 0 ? 'no recording there\n' : `${whole} recordings, all of them with their end\n`);
  else if (whole > 0) parts.push(`${whole} other recordings have their end\n`);
  return parts.join('\n');
}
