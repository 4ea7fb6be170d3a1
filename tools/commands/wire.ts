import { writeFileSync } from 'node:fs';
import { Command } from 'commander';
import { cHeader } from '../../bridge/c-header.js';
import { encodeDatabase } from '../../bridge/dbc/encoding.js';
import { databaseOf } from '../../bridge/dbc/from-map.js';
import { writeDatabase } from '../../bridge/dbc/write.js';
import { mapTable } from '../../bridge/map-table.js';
import { readBenchFile } from '../run/plan.js';
import { CommandError } from './failure.js';

export function wireCommand(): Command {
  return new Command('wire')
    .description('writes the message map of a bench for the other side: a C header, a CAN database, a page for people')
    .argument('BENCH', 'bench file')
    .option('--c <FILE.h>', 'C header: packed structs, static asserts, checksums')
    .option('--table <FILE.html>', 'a page of all messages and signals')
    .option('--dbc <FILE.dbc>', 'CAN database of a link that is CAN')
    .option('--link <NAME>', 'the link of the database; default: the first that is CAN')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring wire configs/harbour-truck/bench.yaml --c truck.h --table truck.html',
    )
    .action((bench: string, options: { c?: string; table?: string; dbc?: string; link?: string }) => {
      const { spec } = readBenchFile(bench);
      if (options.c === undefined && options.table === undefined && options.dbc === undefined)
        throw new CommandError('say what to write: --c FILE.h, --table FILE.html, --dbc FILE.dbc');
      if (spec.map.messages.length === 0) throw new CommandError(`${bench} has no messages: there is nothing to write`);
      const write = (file: string, text: string | Uint8Array) => {
        writeFileSync(file, text);
        process.stderr.write(`${file} written\n`);
      };
      if (options.c !== undefined) write(options.c, cHeader(spec.map, spec.name));
      if (options.dbc !== undefined) {
        const link = options.link ?? spec.map.links.find((one) => one.kind !== 'udp')?.name;
        const found = spec.map.links.find((one) => one.name === link);
        if (!link || !found || found.kind === 'udp')
          throw new CommandError(
            `${link === undefined ? `${bench} has no link that is CAN` : `link ${link} is not CAN`}: a CAN database needs one`,
          );
        write(options.dbc, encodeDatabase(writeDatabase(databaseOf(spec.map, link, { step: spec.step }))));
      }
      if (options.table !== undefined) write(options.table, mapTable(spec.map, spec.name, spec.step));
    });
}
