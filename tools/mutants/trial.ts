import path from 'node:path';
import { type Assembly, assemble } from '../../configs/assemble.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { diskFiles } from '../../configs/files.js';
import { readScenario } from '../../configs/scenario.js';
import { hashText } from '../../runtime/block.js';
import type { Circuit } from '../../runtime/circuit/build.js';
import type { RequirementVerdict } from '../../runtime/judge/result.js';
import { judgeSignal } from '../../runtime/judge/stage.js';
import { attachModule } from '../loop/attach-links.js';
import type { ControllerFactory } from '../loop/controller-module.js';
import type { SuiteEntry } from '../suite/entries.js';

/** What one run of a suite said of one controller. */
export interface Trial {
  readonly verdicts: Readonly<Record<string, RequirementVerdict>>;
  /** Requirements that a run may pass without exercising them. */
  readonly optional: readonly string[];
  /** Why the run would not be valid, or what the controller threw. */
  readonly trouble: readonly string[];
  /** Of the state at its end; with the controller's outputs in it. */
  readonly hash: string;
  /** Counted ticks; fewer than planned where it was broken off. */
  readonly ticks: number;
  /** Wall time, s. */
  readonly took: number;
}

const FAIL = 2;

/**
 * The runs of a suite in one process, as `run --pace fast` has them but without a recording: each is built once and then run
 * against any number of controllers. The generated functions do not depend on start values and are shared.
 */
export class TrialBench {
  private readonly built = new Map<string, { assembly: Assembly; ticks: number; watched: [string, number][] }>();
  private shared: Pick<Circuit, 'functions' | 'step'> | undefined;
  private readonly circuits = new Map<string, Circuit>();

  constructor(
    private readonly spec: BenchSpec,
    private readonly seed: number,
  ) {}

  /** Runs one entry; with `mayFail` it ends as soon as another requirement than those has failed. */
  run(entry: SuiteEntry, factory: ControllerFactory, mayFail?: ReadonlySet<string>): Trial {
    const began = performance.now();
    const { assembly, ticks, watched } = this.build(entry);
    const { signals, block, plant, table } = assembly;
    assembly.reset();
    const trouble: string[] = [];
    let tick = assembly.firstTick;
    try {
      const barrier = attachModule(this.spec, assembly.exchange, factory, this.spec.controller?.period ?? 1);
      for (; tick < ticks; tick += 1) {
        assembly.tick.run(tick);
        barrier.end(tick);
        if (plant.solver.failed) {
          trouble.push('the plant has no finite state any more');
          break;
        }
        if (mayFail === undefined || tick % 100 !== 0) continue;
        if (watched.some(([id, at]) => signals[at] === FAIL && !mayFail.has(id))) {
          tick += 1;
          break;
        }
      }
    } catch (error) {
      trouble.push(`thrown: ${error instanceof Error ? error.message : String(error)}`);
    }
    const counted = Math.max(0, tick);
    const results = assembly.judge.results(counted, block);
    if (counted >= ticks && trouble.length === 0) {
      const value = (name: string) => signals[table.find(name)]!;
      if (value('scenario.timeOuts') > 0) trouble.push('a step of the scenario did not come to pass in time');
      if (value('scenario.step') < assembly.script.steps.length)
        trouble.push('the scenario ended before its last step');
      const { energy } = assembly.ledger.shares(block, signals);
      if (!(energy <= this.spec.budgets.energyResidual)) trouble.push('energy residual past its bound');
    }
    return {
      verdicts: Object.fromEntries(results.map((one) => [one.requirement.id, one.verdict])),
      optional: results
        .filter(({ requirement }) => requirement.exercise === 'optional' || requirement.severity === 'observation')
        .map(({ requirement }) => requirement.id),
      trouble,
      hash: hashText(assembly.tick.hash[0]!, assembly.tick.hash[1]!),
      ticks: counted,
      took: (performance.now() - began) / 1000,
    };
  }

  private build(entry: SuiteEntry) {
    let found = this.built.get(entry.name);
    if (found) return found;
    const { script } = readScenario(entry.file, this.spec, diskFiles, { case: entry.case });
    const starts = JSON.stringify(script.start ?? {});
    const known = this.circuits.get(starts);
    let assembly = assemble(this.spec, { seed: this.seed, script, ...(known ? { circuit: known } : {}) });
    if (!known) {
      const { functions, step } = assembly.circuit;
      this.shared ??= { functions, step };
      const circuit = { ...assembly.circuit, ...this.shared };
      this.circuits.set(starts, circuit);
      assembly = assemble(this.spec, { seed: this.seed, script, circuit });
    }
    const watched = assembly.judge.judge.requirements
      .filter(({ severity }) => severity !== 'observation')
      .map(({ id }): [string, number] => [id, assembly.table.find(`${judgeSignal(id)}.verdict`)]);
    found = { assembly, ticks: script.ticks, watched };
    this.built.set(entry.name, found);
    return found;
  }
}

/** What a release gate would see of a trial beside that of the sound controller, in words; undefined: nothing. */
export function worse(before: Trial, now: Trial): string | undefined {
  const news = now.trouble.filter((what) => !before.trouble.includes(what));
  const failed = Object.keys(now.verdicts).filter(
    (id) => now.verdicts[id] === 'fail' && before.verdicts[id] !== 'fail',
  );
  if (failed.length > 0) return `${failed.join(', ')} failed`;
  if (news.length > 0) return news.join('; ');
  if (now.ticks < before.ticks) return undefined;
  const idle = Object.keys(now.verdicts).filter(
    (id) =>
      before.verdicts[id] === 'pass' &&
      (now.verdicts[id] === 'not exercised' || now.verdicts[id] === 'undecided') &&
      !now.optional.includes(id),
  );
  return idle.length > 0 ? `${idle.join(', ')} no longer exercised or decided` : undefined;
}

/** Name of a file for a mutant. */
export function moduleFile(folder: string, name: string): string {
  return path.join(folder, `${name.replace(/[^A-Za-z0-9.-]+/g, '_')}.mjs`);
}
