import { readFileSync, writeFileSync } from 'node:fs';
import { Command } from 'commander';
import { benchText } from '../../bridge/dbc/bench-text.js';
import { decodeDatabase } from '../../bridge/dbc/encoding.js';
import { readDatabase } from '../../bridge/dbc/read.js';
import { messagesOf } from '../../bridge/dbc/to-map.js';
import { CommandError } from './failure.js';

export function importCommand(): Command {
  return new Command('import')
    .description('reads a CAN database (.dbc) and writes its messages for a bench file')
    .argument('DATABASE', 'the .dbc file')
    .requiredOption(
      '--controller <NODE>',
      'the node that is the control unit: the bench receives what it sends, and sends the rest',
    )
    .option('--link <NAME>', 'link of the bench', 'powertrain')
    .option('--step <MS>', 'tick of the bench, ms', Number, 1)
    .option('--to <FILE.yaml>', 'where to write; default: standard output')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring import vehicle.dbc --controller HybridControl --to my/messages.yaml\n\nWhat each sent signal carries is for you to fill in: the word fill.in stands in its place.',
    )
    .action((file: string, options: { controller: string; link: string; step: number; to?: string }) => {
      if (!(options.step > 0)) throw new CommandError(`--step ${options.step}: a tick in milliseconds, such as 1`);
      const { database, problems, remarks } = readDatabase(decodeDatabase(read(file)));
      for (const { line, column, what } of problems)
        process.stderr.write(`${file}:${line}:${column} not understood: ${what}\n`);
      for (const { line, column, what } of remarks) process.stderr.write(`${file}:${line}:${column} ${what}\n`);
      const imported = messagesOf(database, {
        link: options.link,
        controller: options.controller,
        step: options.step / 1000,
      });
      for (const remark of imported.remarks) process.stderr.write(`${file}: ${remark}\n`);
      if (imported.messages.length === 0) throw new CommandError(`${file} has no messages`);
      const text = benchText(imported.messages, options.step / 1000);
      if (options.to === undefined) process.stdout.write(text);
      else {
        writeFileSync(options.to, text);
        process.stderr.write(`${options.to} written: ${imported.messages.length} messages\n`);
      }
      if (problems.length > 0)
        throw new CommandError(
          `${problems.length} statements of ${file} were not understood, see above; the rest is written`,
        );
    });
}

function read(file: string): Uint8Array {
  try {
    return readFileSync(file);
  } catch (error) {
    throw new CommandError(`${file} cannot be read: ${(error as Error).message}`);
  }
}
