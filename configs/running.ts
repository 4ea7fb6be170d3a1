import type { Frames, ResetStep } from '../runtime/life.js';
import { lifeSwitches } from '../runtime/own-signals.js';
import type { Ambient, Budgets, ControllerSpec, LifeSpec, RecordSpec } from './bench-spec.js';
import { commandValue } from './command-value.js';
import { inside } from './files.js';
import { shown } from './quantity.js';
import type { Section } from './section.js';
import type { SignalList } from './signal-list.js';
import { checkedTicks } from './ticks.js';
import { standardAtmosphere } from './units.js';

/** Reads the parts of a bench file that say how it runs: budgets, surroundings, life, controller, record. */

export function readAmbient(top: Section): Ambient {
  const section = top.section('ambient');
  const temperature = section?.quantity('temperature', { unit: 'K', least: 200, most: 350 }) ?? 293.15;
  const pressure = section?.quantity('pressure', { unit: 'Pa', least: 3e4, most: 1.2e5 }) ?? standardAtmosphere;
  section?.finish();
  return { temperature, pressure };
}

export function readBudgets(top: Section): Budgets {
  const section = top.section('budgets');
  const take = (key: string, unit: string, usual: number, most?: number) =>
    section?.quantity(key, { unit, least: 0, most }) ?? usual;
  const budgets = {
    lateness: take('lateness', 's', 200e-6),
    worstLateness: take('worstLateness', 's', 5e-3),
    overruns: take('overruns', '1', 1e-3, 1),
    drift: take('drift', 's', 0.1),
    lostFrames: take('lostFrames', '1', 1e-3, 1),
    energyResidual: take('energyResidual', '1', 1e-3, 1),
    oilResidual: take('oilResidual', '1', 1e-9, 1),
  };
  section?.finish();
  return budgets;
}

/** Longest after-run, s. */
const longestAfterRun = 60;

export function readLife(top: Section, step: number, signals: SignalList): LifeSpec {
  const section = top.section('life');
  const frames = section?.section('frames');
  const seen = (key: 'preRoll' | 'afterRun'): Frames =>
    frames?.choice(key, ['plant', 'silence'] as const) ?? (key === 'preRoll' ? 'plant' : 'silence');
  const ticks = (key: string, usual: number) =>
    (section && checkedTicks(section, key, step)) ?? Math.round(usual / step);
  const preRoll = ticks('preRoll', 0.2);
  section?.quantity('afterRun', { unit: 's', least: 0, most: longestAfterRun });
  const afterRun = ticks('afterRun', 0);
  const reset = section?.section('reset');
  const life = {
    supply: section?.flag('supply') ?? true,
    key: section?.flag('key') ?? true,
    preRoll,
    bootWindow: ticks('bootWindow', 0.5),
    frames: { preRoll: seen('preRoll'), afterRun: seen('afterRun') },
    afterRun,
    reset: {
      before: reset ? readProcedure(reset, 'before', step, signals, { within: preRoll, of: 'preRoll' }) : [],
      after: reset ? readProcedure(reset, 'after', step, signals, { within: afterRun, of: 'afterRun' }) : [],
    },
    hands: (section?.choice('hands', ['allowed', 'not allowed'] as const) ?? 'not allowed') === 'allowed',
  };
  reset?.finish();
  frames?.finish();
  section?.finish();
  return life;
}

/** `- { at: 200 ms, set: life.supply, to: on }`: commands and switches of the bench's life, over time. */
function readProcedure(
  reset: Section,
  key: 'before' | 'after',
  step: number,
  signals: SignalList,
  room: { readonly within: number; readonly of: string },
): ResetStep[] {
  const steps: ResetStep[] = [];
  for (const [i, item] of (reset.list(key)?.items ?? []).entries()) {
    const one = reset.sectionIn(item, `${key}[${i}]`);
    if (!one) continue;
    const at = checkedTicks(one, 'at', step, { required: true });
    const said = one.placed('set', { required: true }, 'life.supply');
    const found = said && signals.resolve(one, 'set', said, { groups: ['command', 'run'] });
    const target = found && (found.group === 'command' || isSwitch(found.path)) ? found : undefined;
    if (found && !target)
      one.fail('set', `${found.path} is nothing that can be set`, `name a command, or ${switchPaths.join(', ')}`);
    const to = one.entry('to');
    if (!to) one.fail('to', 'missing', 'add to: on, or a value', {}, one.where);
    const value = to && target ? commandValue(one, to.value, target, 'to') : undefined;
    one.finish();
    if (at === undefined || !target || value === undefined) continue;
    if (at >= room.within)
      one.fail('at', `behind the end of ${room.of}`, `make life.${room.of} longer, or do it earlier`, {
        value: `${Number((at * step).toPrecision(12))} s`,
        bound: `${Number((room.within * step).toPrecision(12))} s`,
      });
    steps.push({ at, target: target.path, value });
  }
  return steps;
}

const switchPaths = Object.values(lifeSwitches).map((info) => info.path);
/** Whether a signal of the runtime is one that scripts and procedures may set. */
export function isSwitch(path: string): boolean {
  return switchPaths.includes(path);
}

export function readController(top: Section, step: number, root: string, file: string): ControllerSpec | undefined {
  const section = top.section('controller');
  if (!section) return undefined;
  const module = readPath(section, 'module', root, file, 'controller.js');
  const command = section.text('command', {}, 'node controller.js');
  if (module !== undefined && section.has('command'))
    section.fail('command', 'a module and a command', 'keep one of the two: --controller takes the other');
  if (!section.has('module') && !section.has('command'))
    section.fail('command', 'missing', 'add command: or module:', {}, section.where);
  const period = checkedTicks(section, 'period', step, { least: 1 }) ?? Math.max(1, Math.round(0.01 / step));
  const patience = section.quantity('patience', { unit: 's', least: 0.01, most: 600 }) ?? 5;
  section.finish();
  return { module, command, period, patience };
}

/** A path that another file is named by; it stays inside the bench's folder. */
export function readPath(
  section: Section,
  key: string,
  root: string,
  file: string,
  example: string,
): string | undefined {
  const said = section.text(key, {}, example);
  if (said === undefined) return undefined;
  if (inside(root, file, said) === undefined)
    return section.fail(key, 'outside the folder of the bench', 'move the file into the folder', {
      value: shown(said),
    });
  return said;
}

export function readRecord(top: Section, signals: SignalList): RecordSpec {
  const section = top.section('record');
  const named = section?.texts('signals');
  const namedPeaks = section?.texts('peaks');
  const record = {
    patterns: named?.map((one) => one.text) ?? ['*'],
    signals: section && named ? signals.match(section, 'signals', named) : signals.all.map((info) => info.path),
    peaks: section && namedPeaks ? signals.match(section, 'peaks', namedPeaks) : usualPeaks(signals),
  };
  section?.finish();
  return record;
}

/** Peaks of every true pressure. */
function usualPeaks(signals: SignalList): string[] {
  return signals.all
    .filter((info) => info.unit === 'Pa' && (info.group === 'reading' || info.group === 'state'))
    .map((info) => info.path);
}
