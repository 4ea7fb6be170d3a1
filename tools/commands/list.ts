import path from 'node:path';
import { Command } from 'commander';
import { assemble } from '../../configs/assemble.js';
import { catalogue } from '../../configs/catalogue.js';
import { faultCatalogue, faultPage } from '../../configs/faults.js';
import { formulaText } from '../../configs/requirement-text.js';
import { readScenario } from '../../configs/scenario.js';
import type { ElementKind } from '../../runtime/contract.js';
import { readBenchFile } from '../run/plan.js';
import { elementSheet } from './element-sheet.js';
import { CommandError } from './failure.js';
import { table } from './table.js';

export function listCommand(): Command {
  const command = new Command('list').description('the declarations: elements, or the signals of a bench').addHelpText(
    'after',
    `
Examples:
  oilspring list elements
  oilspring list elements pump-motor
  oilspring list signals configs/harbour-truck/bench.yaml --json
  oilspring list requirements configs/harbour-truck/bench.yaml
  oilspring list faults configs/harbour-truck/bench.yaml --markdown`,
  );
  command
    .command('elements [KIND]')
    .description('all elements, or one of them whole')
    .option('--json', 'as JSON')
    .option('--markdown', 'a sheet per element')
    .exitOverride()
    .action((kind: string | undefined, options: { json?: boolean; markdown?: boolean }) => {
      const kinds =
        kind === undefined ? [...catalogue.elements].sort((a, b) => (a.kind < b.kind ? -1 : 1)) : [find(kind)];
      if (options.json) process.stdout.write(`${JSON.stringify(kinds.map(plain), undefined, 2)}\n`);
      else if (options.markdown || kind !== undefined)
        process.stdout.write(`${kinds.map(elementSheet).join('\n\n')}\n`);
      else
        process.stdout.write(
          `${table(
            kinds.map((one) => [
              one.kind,
              one.role,
              Object.entries(one.ports)
                .map(([name, type]) => `${name}:${type}`)
                .join(' '),
              one.about,
            ]),
          )}\n`,
        );
    });
  command
    .command('signals BENCH')
    .description('all signals of a bench with their units')
    .option('--json', 'as JSON')
    .exitOverride()
    .action((bench: string, options: { json?: boolean }) => {
      const { spec, folder } = readBenchFile(bench);
      const script = spec.duty === undefined ? undefined : readScenario(path.join(folder, spec.duty), spec).script;
      const { all } = assemble(spec, { seed: spec.seed, ...(script ? { script } : {}) }).table;
      if (options.json) process.stdout.write(`${JSON.stringify(all, undefined, 2)}\n`);
      else process.stdout.write(`${table(all.map((info) => [info.path, info.unit, info.group, info.about]))}\n`);
    });
  command
    .command('faults BENCH')
    .description('all faults that a scenario on a bench can set')
    .option('--json', 'as JSON')
    .option('--markdown', 'a page of them')
    .exitOverride()
    .action((bench: string, options: { json?: boolean; markdown?: boolean }) => {
      const { spec } = readBenchFile(bench);
      const all = faultCatalogue(spec);
      if (options.json) process.stdout.write(`${JSON.stringify(all, undefined, 2)}\n`);
      else if (options.markdown) process.stdout.write(`${faultPage(spec)}\n`);
      else
        process.stdout.write(
          `${table(all.map((one) => [one.path, one.group, one.isSwitch ? 'switch' : one.unit, String(one.withoutFault), one.about]))}\n`,
        );
    });
  command
    .command('requirements BENCH')
    .description('what runs on a bench are judged by, with what its scenario asks besides')
    .option('--scenario <FILE>', "scenario; default: the bench's duty")
    .option('--json', 'as JSON')
    .exitOverride()
    .action((bench: string, options: { scenario?: string; json?: boolean }) => {
      const { spec, folder } = readBenchFile(bench);
      const file = options.scenario ?? (spec.duty === undefined ? undefined : path.join(folder, spec.duty));
      const script = file === undefined ? undefined : readScenario(file, spec).script;
      // Compiled, so that what is listed can be judged.
      const all = assemble(spec, { seed: spec.seed, ...(script ? { script } : {}) }).judge.judge.requirements;
      const own = new Set(spec.requirements);
      const rows = all.map((one) => ({
        ...one,
        formula: formulaText(one.formula, spec.step),
        from: own.has(one) ? 'bench' : (script?.name ?? ''),
      }));
      if (options.json) process.stdout.write(`${JSON.stringify(rows, undefined, 2)}\n`);
      else if (rows.length === 0) process.stdout.write('nothing is required of a run on this bench\n');
      else
        process.stdout.write(
          `${rows.map((one) => `${one.id}  ${one.severity}${one.exercise === 'optional' ? ', need not be exercised in every run' : ''}, from ${one.from}\n    ${one.text}\n    ${one.formula}${one.source === undefined ? '' : `\n    source: ${one.source}`}\n`).join('')}`,
        );
    });
  return command;
}

function find(kind: string): ElementKind {
  const found = catalogue.elements.find((one) => one.kind === kind);
  if (!found)
    throw new CommandError(
      `no element \`${kind}\`: there are ${catalogue.elements
        .map((one) => one.kind)
        .sort()
        .join(', ')}`,
    );
  return found;
}

/** What of a declaration is data. */
function plain(kind: ElementKind): object {
  const {
    about,
    source,
    valid,
    role,
    ports,
    states,
    memory,
    commands,
    readings,
    parameters,
    starts,
    limits,
    fluid,
    heat,
  } = kind;
  return {
    kind: kind.kind,
    role,
    about,
    source,
    valid,
    ports,
    fluid,
    heat,
    parameters,
    starts,
    states,
    memory,
    commands,
    readings,
    limits,
  };
}
