import { statSync } from 'node:fs';
import path from 'node:path';
import { Command } from 'commander';
import { BuildError } from '../../runtime/contract.js';
import { LivePage, readPageWish } from '../live/live-page.js';
import { recordedSource } from '../live/recorded-source.js';
import { recordingShelf } from '../live/recording-shelf.js';

interface ViewFlags {
  readonly page?: string | true;
  readonly liveName?: readonly string[];
}

export function viewCommand(): Command {
  return new Command('view')
    .description('serves the live page to look back at recordings')
    .argument('[RECORDING]', 'recording file, or a folder of recordings', 'recordings')
    .option('--page <ADDRESS:PORT>', 'where; default 127.0.0.1 and a free port')
    .option('--live-name <NAME...>', 'names by which other machines may call the page')
    .addHelpText('after', '\nExample:\n  oilspring view recordings/harbour-truck.osrec\n\nCtrl-C ends it.')
    .action(async (said: string, flags: ViewFlags) => {
      const wish = readPageWish(flags.page ?? true, false, flags.liveName)!;
      const stat = statSync(said, { throwIfNoEntry: false });
      if (stat === undefined) throw missing(said, 'there is no such file or folder');
      const folder = stat.isDirectory() ? said : path.dirname(said);
      const shelf = recordingShelf(folder, { ending: stat.isDirectory() ? '.osrec' : path.basename(said) });
      const [first] = await shelf.list();
      if (first === undefined)
        throw missing(said, stat.isDirectory() ? 'there is no recording in it' : 'not a recording');
      const source = await recordedSource(shelf, first.name);
      const page = await LivePage.reserve(wish);
      await page.serve(source, shelf, stat.isDirectory() ? undefined : first.name);
      process.stdout.write(
        `${stat.isDirectory() ? `${page.invitation.replace(/\/(?= |$)/, '/#/recordings')}` : page.invitation}\n`,
      );
      await new Promise<void>((resolve) => {
        process.once('SIGINT', () => resolve());
        process.once('SIGTERM', () => resolve());
      });
      await page.close();
    });
}

function missing(file: string, what: string): BuildError {
  return new BuildError([
    { path: 'view', what, value: file, remedy: 'name a file that a run has recorded (.osrec), or its folder' },
  ]);
}
