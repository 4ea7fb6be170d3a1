import { dirname, normalize } from 'node:path';
import type { BenchSpec, Catalogue } from './bench-spec.js';
import { Names, type ReadElement, readElements, readFluids } from './elements.js';
import { diskFiles, type Files } from './files.js';
import { Drivers, declareInstruments, readInstruments } from './instruments.js';
import { declareMessages, finishMessages, readWithout } from './messages.js';
import { Problems } from './problems.js';
import { lookup, readRequirements } from './requirements.js';
import { readAmbient, readBudgets, readController, readLife, readPath, readRecord } from './running.js';
import { Section } from './section.js';
import { SignalList } from './signal-list.js';
import { readSource } from './source.js';
import {
  checkReliefSettings,
  fillReliefSettings,
  readWatched,
  reliefOfSide,
  reliefValves,
  remarkReliefSettings,
} from './watched.js';

/** Longest and shortest tick, s. */
const steps = { least: 1e-4, most: 0.02 };

/**
 * Reads and checks a bench file and what it includes. Throws a BuildError with all that is wrong, each with file, line
 * and column; nothing else is thrown, whatever the file holds.
 */
export function readBench(path: string, catalogue: Catalogue, files: Files = diskFiles): BenchSpec {
  const problems = new Problems();
  const source = readSource(path, problems, files);
  if (!source.root) {
    problems.throwIfAny();
    throw new Error(`${path} gave neither a bench nor a problem`);
  }
  const file = normalize(path);
  const top = new Section(source.root, '', problems);
  const root = dirname(file);

  const name = top.text('bench', { required: true }, 'harbour truck') ?? '';
  const about = top.text('about') ?? '';
  const step = top.quantity('step', { unit: 's', ...steps }) ?? 1e-3;
  const substeps = top.whole('substeps', { least: 1, most: 64 }) ?? 4;
  const seed = top.whole('seed', { least: 0, most: 0xffffffff }) ?? 1;
  const ambient = readAmbient(top);
  const budgets = readBudgets(top);

  const names = new Names(problems);
  let elements = readElements(top, catalogue, names, readFluids(top, catalogue, ambient), ambient);
  checkCircuit(top, elements);

  const signals = new SignalList();
  signals.addRuntime();
  signals.addElements(elements, catalogue.portKinds);
  for (const key of ['stores', 'branches'] as const) {
    for (const unread of namesBelow(top, key))
      if (!elements.some((element) => element.name === unread)) signals.unread.add(unread);
  }
  const pendingMessages = declareMessages(top, names, signals);
  const pendingInstruments = declareInstruments(top, catalogue, names, signals);
  const drivers = new Drivers();
  const instruments = readInstruments(pendingInstruments, signals, drivers, ambient);
  const map = finishMessages(pendingMessages, top, step, signals, drivers);
  const without = readWithout(top, map);

  const valves = reliefValves(elements);
  const sides = reliefOfSide(elements, valves);
  checkReliefSettings(top, elements, valves, sides);
  remarkReliefSettings(top, elements, sides);
  elements = fillReliefSettings(elements, sides);
  const watched = readWatched(top, elements, signals, sides, ambient);
  signals.addMeters(elements);
  signals.addWatch(watched);
  const asked = top.section('requirements');
  // Where elements could not be read, what requirements say of them cannot be judged.
  const requirements =
    asked && signals.unread.size === 0 ? readRequirements(asked, { signals: lookup(signals.all), step }) : [];
  const life = readLife(top, step, signals);
  const duty = readPath(top, 'duty', root, file, 'scenarios/round.yaml');
  const controller = readController(top, step, root, file);
  const record = readRecord(top, signals);
  top.finish(['include']);
  problems.throwIfAny();
  return {
    name,
    about,
    step,
    substeps,
    seed,
    budgets,
    ambient,
    circuit: {
      name,
      portKinds: catalogue.portKinds,
      elements: elements.map(({ path: _path, places: _places, complete: _complete, ...element }) => element),
    },
    instruments,
    map,
    without,
    watched,
    requirements,
    life,
    duty,
    controller,
    record,
    signals: signals.all,
    remarks: problems.remarks,
    sources: source.texts,
  };
}

function namesBelow(top: Section, key: string): string[] {
  const value = top.tree.entries.get(key)?.value;
  return value?.kind === 'mapping' ? [...value.entries.keys()] : [];
}

/** What can only be seen of all elements together. */
function checkCircuit(top: Section, elements: readonly ReadElement[]): void {
  const joined = new Set(
    elements.flatMap((element) => Object.values(element.connections).map((connection) => connection.store)),
  );
  for (const element of elements) {
    if (element.kind.role !== 'store' || joined.has(element.name)) continue;
    top.problems.remark(
      element.where,
      element.path,
      'no branch is tied to this store',
      'tie one to it or leave it away',
    );
  }
}
