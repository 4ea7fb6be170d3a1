import { pathToFileURL } from 'node:url';
import type { ControllerFactory } from '../loop/controller-module.js';
import { readBenchFile } from '../run/plan.js';
import { suiteEntries } from '../suite/entries.js';
import { type Trial, TrialBench, worse } from './trial.js';

/** What the parent sends: a controller's compiled module, and the runs of the suite in the order in which to try them. */
export interface TrialOrder {
  readonly module: string;
  readonly entries: readonly number[];
  /** What the sound controller does in every run, by number; absent: this is the sound controller. */
  readonly before?: Readonly<Record<number, Trial>>;
}
export type TrialReport =
  | { readonly kind: 'trial'; readonly entry: number; readonly trial: Trial }
  | {
      readonly kind: 'end';
      readonly caught: { readonly entry: number; readonly how: string } | null;
      readonly same: number;
    };

/** A process that tries controllers: told what suite by its arguments, one controller after another by messages. */
const [bench, folder, seed] = process.argv.slice(2);
const { spec } = readBenchFile(bench!);
const entries = suiteEntries(folder!, spec, Number(seed), '');
const rig = new TrialBench(spec, Number(seed));
const say = (report: TrialReport) => new Promise<void>((resolve) => process.send!(report, () => resolve()));

process.on('message', (order: TrialOrder) => void handle(order));
process.on('disconnect', () => process.exit(0));

async function handle({ module, entries: wanted, before }: TrialOrder): Promise<void> {
  const factory = (await import(pathToFileURL(module).href)) as ControllerFactory;
  let caught: { entry: number; how: string } | null = null;
  let same = 0;
  for (const number of wanted) {
    const sound = before?.[number];
    const mayFail = sound && new Set(Object.keys(sound.verdicts).filter((id) => sound.verdicts[id] === 'fail'));
    const trial = rig.run(entries[number]!, factory, mayFail);
    await say({ kind: 'trial', entry: number, trial });
    if (sound === undefined) continue;
    const how = worse(sound, trial);
    if (how !== undefined) {
      caught = { entry: number, how };
      break;
    }
    if (trial.hash === sound.hash) same += 1;
  }
  await say({ kind: 'end', caught, same });
}
