import { writeFileSync } from 'node:fs';
import { Command } from 'commander';
import { cHeader } from '../../bridge/c-header.js';
import { mapTable } from '../../bridge/map-table.js';
import { readBenchFile } from '../run/plan.js';
import { CommandError } from './failure.js';

export function wireCommand(): Command {
  return new Command('wire')
    .description('writes the message map of a bench for the other side: a C header, a page for people')
    .argument('BENCH', 'bench file')
    .option('--c <FILE.h>', 'C header: packed structs, static asserts, checksums')
    .option('--table <FILE.html>', 'a page of all messages and signals')
    .addHelpText('after', '\nExample:\n  oilspring wire configs/harbour-truck/bench.yaml --c truck.h --table truck.html')
    .action((bench: string, options: { c?: string; table?: string }) => {
      const { spec } = readBenchFile(bench);
      if (options.c === undefined && options.table === undefined) throw new CommandError('say what to write: --c FILE.h, --table FILE.html');
      if (spec.map.messages.length === 0) throw new CommandError(`${bench} has no messages: there is nothing to write`);
      const write = (file: string, text: string) => {
        writeFileSync(file, text);
        process.stderr.write(`${file} written\n`);
      };
      if (options.c !== undefined) write(options.c, cHeader(spec.map, spec.name));
      if (options.table !== undefined) write(options.table, mapTable(spec.map, spec.name, spec.step));
    });
}
