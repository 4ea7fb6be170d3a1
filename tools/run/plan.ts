import { existsSync } from 'node:fs';
import path from 'node:path';
import { unitsStoodFor } from '../../bridge/stand-ins.js';
import { readBench } from '../../configs/bench.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import { catalogue } from '../../configs/catalogue.js';
import { diskFiles, type Files } from '../../configs/files.js';
import { parseQuantity } from '../../configs/quantity.js';
import { readScenario } from '../../configs/scenario.js';
import type { SourceText } from '../../configs/source.js';
import { BuildError } from '../../runtime/contract.js';
import { emptyScript, recordedForm, type ScriptSpec } from '../../runtime/script.js';
import { disturbancesOf } from './disturbances.js';

/** What the command line asks for. */
export interface RunWish {
  readonly bench: string;
  readonly scenario?: string | undefined;
  /** One of the scenario's cases, and its parameters by hand. */
  readonly case?: string | undefined;
  readonly set?: Readonly<Record<string, string>> | undefined;
  /** `20s`, `2 min` */
  readonly for?: string | undefined;
  readonly pace: 'live' | 'fast';
  readonly controller?: string | undefined;
  /** Control units that the bench does not stand in for. */
  readonly without?: readonly string[] | undefined;
  /** Disturbances by hand: `bus.sentDrop=0.3@5s..8s`. */
  readonly disturb?: readonly string[] | undefined;
  readonly record?: string | undefined;
  readonly seed?: number | undefined;
  readonly profile?: boolean | undefined;
  readonly core?: number | undefined;
}

/** A checked run, ready to start. */
export interface RunPlan {
  readonly wish: RunWish;
  readonly spec: BenchSpec;
  readonly script: ScriptSpec;
  /** Files of the bench, then of the scenario, names relative to the bench's folder. */
  readonly benchSources: readonly { readonly path: string; readonly text: string }[];
  readonly scenarioSources: readonly { readonly path: string; readonly text: string }[];
  readonly folder: string;
  readonly ticks: number;
  readonly seed: number;
  readonly controller:
    | { readonly kind: 'module'; readonly file: string }
    | { readonly kind: 'process'; readonly command: readonly string[] | undefined }
    | { readonly kind: 'none' };
  readonly recording: string | undefined;
}

/** Files below a folder, by names relative to it: what is read of a bench keeps the names that a recording carries. */
export function filesIn(folder: string): Files {
  return {
    read: (name) => diskFiles.read(path.join(folder, name)),
    list: (name) => diskFiles.list(path.join(folder, name)),
  };
}

export function readBenchFile(file: string): { spec: BenchSpec; folder: string; name: string } {
  return { spec: readBench(file, catalogue), folder: path.dirname(path.resolve(file)), name: path.basename(file) };
}

/** Reads bench and scenario and settles what runs. Throws BuildError for everything that is wrong with either. */
export function planRun(wish: RunWish): RunPlan {
  const { spec, folder } = readBenchFile(wish.bench);
  const scenarioFile = wish.scenario ?? (spec.duty === undefined ? undefined : path.join(folder, spec.duty));
  const scenario =
    scenarioFile === undefined
      ? undefined
      : readScenario(scenarioFile, spec, diskFiles, { case: wish.case, set: wish.set });
  const without = checkedUnits(wish.without ?? [], spec);
  const planned = scenario?.script ?? emptyScript;
  const script = recordedForm({
    ...planned,
    traces: [...planned.traces, ...disturbancesOf(wish.disturb ?? [], spec)],
    ...(without.length === 0 ? {} : { without }),
  });
  const ticks = wish.for === undefined ? script.ticks : ticksOf(wish.for, spec.step);
  if (ticks === 0)
    throw new BuildError([
      { path: 'run', what: 'nothing says how long it runs', remedy: 'give --for 20s, or a scenario' },
    ]);
  // before anything is built: a name that is taken costs no wait
  if (wish.record !== undefined && wish.record !== '' && existsSync(wish.record))
    throw new BuildError([
      { path: '--record', what: 'it exists already', value: wish.record, remedy: 'choose another name' },
    ]);
  return {
    wish,
    spec,
    script,
    benchSources: carried(spec.sources),
    scenarioSources: scenario === undefined ? [] : carried(scenario.sources),
    folder,
    ticks,
    seed: wish.seed ?? spec.seed,
    controller: chooseController(wish, spec),
    recording: wish.record === '' ? undefined : (wish.record ?? defaultRecording(spec.name)),
  };
}

function checkedUnits(without: readonly string[], spec: BenchSpec): readonly string[] {
  const units = unitsStoodFor(spec.map.messages);
  for (const unit of without)
    if (!units.includes(unit))
      throw new BuildError([
        {
          path: '--without',
          what: 'the bench does not stand in for this control unit',
          value: unit,
          remedy: units.length === 0 ? 'no message of the bench says standsFor:' : `it does for ${units.join(', ')}`,
        },
      ]);
  return without;
}

/** As the recording carries them: forward slashes, relative to the bench's folder. */
function carried(sources: readonly SourceText[], prefix = ''): { path: string; text: string }[] {
  return sources.map((source) => ({ path: prefix + source.name.split(path.sep).join('/'), text: source.text }));
}

function ticksOf(text: string, step: number): number {
  const spaced = text.trim().replace(/^([\d.]+)\s*([a-z]+)$/i, '$1 $2');
  try {
    const seconds = parseQuantity(spaced, { unit: 's' }).value;
    return Math.max(1, Math.round(seconds / step));
  } catch (error) {
    throw new BuildError([
      { path: '--for', what: (error as Error).message, value: text, remedy: 'write it as 20s or 2 min' },
    ]);
  }
}

function chooseController(wish: RunWish, spec: BenchSpec): RunPlan['controller'] {
  const said = wish.controller;
  const module = spec.controller?.module;
  if (spec.map.links.length === 0 || said === 'none') return { kind: 'none' };
  if (said === 'module') {
    if (module === undefined)
      throw new BuildError([
        {
          path: '--controller module',
          what: 'the bench names no controller module',
          remedy: 'add controller: { module: FILE } to the bench file',
        },
      ]);
    return { kind: 'module', file: module };
  }
  if (said === 'external') return { kind: 'process', command: undefined };
  if (said !== undefined && said !== 'process') return { kind: 'process', command: said.split(/\s+/) };
  if (said === undefined && wish.pace === 'fast' && module !== undefined) return { kind: 'module', file: module };
  if (module !== undefined) return { kind: 'process', command: [] };
  if (spec.controller?.command !== undefined) return { kind: 'process', command: spec.controller.command.split(/\s+/) };
  return { kind: 'process', command: undefined };
}

function defaultRecording(name: string): string {
  const stamp = new Date().toISOString().replace(/\..*/, '').replace(/[-:]/g, '').replace('T', '-');
  return path.join(
    'recordings',
    `${name.replace(/[^A-Za-z0-9]+/g, '-').replace(/^-|-$/g, '') || 'bench'}-${stamp}.osrec`,
  );
}
