import path from 'node:path';
import { Command } from 'commander';
import pc from 'picocolors';
import { assemble } from '../../configs/assemble.js';
import { readScenario } from '../../configs/scenario.js';
import { printC } from '../../runtime/circuit/print-c.js';
import { problemText } from '../../runtime/contract.js';
import { exitCode } from '../../runtime/verdict.js';
import { type AccuracySheet, freeze, measureAccuracy } from '../check/accuracy.js';
import { busSheet } from '../check/bus-sheet.js';
import { modesAt } from '../check/modes.js';
import { accuracyLimits, scaleOf, sheetText, verdictOf } from '../check/sheet.js';
import { type Barrier, loadController, moduleBarrier } from '../loop/controller-module.js';
import { readBenchFile } from '../run/plan.js';
import { CommandError } from './failure.js';
import { Progress } from './progress.js';
import { table } from './table.js';

export function checkCommand(): Command {
  return new Command('check')
    .description('reads a bench file, builds its circuit, and says how fast and how accurate it is')
    .argument('BENCH', 'bench file')
    .option('--scenario <FILE>', "drive this instead of the bench's duty")
    .option('--quick', 'without the accuracy sheet')
    .option('--code [LANGUAGE]', 'print the generated code of the circuit, js or c, and stop')
    .option('--json', 'one object on standard output')
    .addHelpText(
      'after',
      '\nExample:\n  oilspring check configs/harbour-truck/bench.yaml\n\nExit code 0: fit to run live, 2: the file is wrong or the bench is not accurate enough at its step.',
    )
    .action(
      async (
        bench: string,
        options: { scenario?: string; quick?: boolean; code?: boolean | string; json?: boolean },
      ) => {
        const { spec, folder } = readBenchFile(bench);
        const scenarioFile = options.scenario ?? (spec.duty === undefined ? undefined : path.join(folder, spec.duty));
        const script = scenarioFile === undefined ? undefined : readScenario(scenarioFile, spec).script;
        const assembly = assemble(spec, { seed: spec.seed, ...(script ? { script } : {}) });
        const { circuit } = assembly;
        if (options.code) {
          if (options.code !== true && options.code !== 'js' && options.code !== 'c')
            throw new CommandError(`--code ${options.code}: the languages are js and c`, exitCode.badInput);
          process.stdout.write(`${options.code === 'c' ? printC(circuit) : circuit.code}\n`);
          return;
        }
        const say = (text: string) => {
          if (!options.json) process.stdout.write(`${text}\n`);
        };
        say(`${pc.bold(spec.name)}  ${spec.about}`);
        say(
          `${circuit.spec.elements.length} elements, ${circuit.states.length} states, ${circuit.jacobian.rows.length} Jacobian entries, ${assembly.table.length} signals, step ${spec.step * 1000} ms in ${spec.substeps} substeps\n`,
        );
        say(
          table(
            [
              ['element', 'kind', 'states', 'tied to'],
              ...circuit.spec.elements.map((element) => [
                element.name,
                element.kind.kind,
                String(Object.keys(element.kind.states).length),
                Object.entries(element.connections)
                  .map(([port, to]) => `${port}:${to.store}${to.ratio === 1 ? '' : ` x${to.ratio}`}`)
                  .join(' '),
              ]),
            ],
            [2],
          ),
        );
        for (const remark of spec.remarks) say(`${pc.yellow('remark')} ${problemText(remark)}`);
        const buses = busSheet(spec);
        if (buses.text !== '') say(`\n${buses.text}`);
        if (options.quick || script === undefined) {
          const modes = modesAt(circuit, assembly.plant.y, assembly.plant.u, assembly.plant.m).slice(0, 8);
          if (options.json)
            process.stdout.write(
              `${JSON.stringify({ bench: spec.name, states: circuit.states.length, modes, buses: buses.loads }, undefined, 2)}\n`,
            );
          else
            say(
              `\nno scenario to drive: accuracy is not measured; fastest time constant at the start ${modes[0] ? (modes[0].timeConstant * 1e6).toPrecision(3) : '-'} us`,
            );
          if (buses.overloaded.length > 0) throw new CommandError(buses.overloaded.join('\n'), exitCode.badInput);
          return;
        }
        const barriers: Barrier[] = [];
        if (spec.map.links[0] && spec.controller?.module !== undefined) {
          const { barrier, transports } = moduleBarrier(
            spec.map,
            assembly.exchange.checksum,
            await loadController(folder, spec.controller.module),
            spec.step,
            spec.controller.period,
          );
          for (const { link, transport } of transports) assembly.exchange.attach(link, transport);
          barriers.push(barrier);
        }
        const progress = new Progress('accuracy', options.json);
        let sheet: AccuracySheet;
        try {
          const drive = freeze(assembly, barriers, script.ticks, (tick) =>
            progress.update((0.1 * Math.max(0, tick)) / script.ticks),
          );
          sheet = measureAccuracy(assembly, drive, scaleOf(spec), (share) => progress.update(0.1 + 0.9 * share));
          if (progress.signal.aborted)
            throw new CommandError('stopped: the accuracy was not measured', exitCode.unfinished);
        } finally {
          progress.done();
        }
        const accuracy = verdictOf(sheet, accuracyLimits, spec);
        const verdict =
          buses.overloaded.length === 0
            ? accuracy
            : { fit: false, why: [...buses.overloaded, accuracy.why].join('; ') };
        if (options.json)
          process.stdout.write(
            `${JSON.stringify({ bench: spec.name, states: circuit.states.length, fit: verdict.fit, why: verdict.why, sheet, buses: buses.loads }, undefined, 2)}\n`,
          );
        else
          say(
            `\n${sheetText(sheet, spec)}\n${verdict.fit ? pc.green('fit to run live') : pc.red('not fit to run live')}: ${verdict.why}`,
          );
        process.exitCode = verdict.fit ? exitCode.fine : exitCode.badInput;
      },
    );
}
