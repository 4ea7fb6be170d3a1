import type { ParameterDeclaration, Position, SignalInfo } from '../runtime/contract.js';
import type { InstrumentKind } from '../runtime/instrument.js';
import type { Ambient, Catalogue, InstrumentSpec } from './bench-spec.js';
import { kindOf, type Names } from './elements.js';
import { rangeKeys, readParameters } from './parameters.js';
import { type Placed, type Section, suggestion } from './section.js';
import type { SignalList } from './signal-list.js';

/** Who sets a command: found twice, it is a problem. */
export class Drivers {
  private readonly driven = new Map<string, { readonly by: string; readonly where: Position }>();

  take(section: Section, key: string, command: string, by: string, where: Position): boolean {
    const other = this.driven.get(command);
    if (other) {
      section.fail(
        key,
        `${command} is driven twice`,
        `let one of the two drive it (the other is ${other.by} at ${other.where.file}:${other.where.line})`,
        {},
        where,
      );
      return false;
    }
    this.driven.set(command, { by, where });
    return true;
  }
}

interface Pending {
  readonly name: string;
  readonly section: Section;
  readonly kind: InstrumentKind;
  /** Key and text of each input that the file gives. */
  readonly said: ReadonlyMap<string, Placed>;
}

/** First pass: kinds and outputs, so that instruments can refer to one another in any order. */
export function declareInstruments(top: Section, catalogue: Catalogue, names: Names, signals: SignalList): Pending[] {
  const pending: Pending[] = [];
  for (const [name, section] of top.sections('instruments')) {
    names.take(name, section.where, section.path);
    const kind = kindOf(section, catalogue.instruments, 'instrument');
    if (!kind) {
      signals.unread.add(name);
      continue;
    }
    section.skip('about');
    const said = new Map<string, Placed>();
    for (const [input, declaration] of Object.entries(kind.inputs)) {
      const given = section.placed(input, { required: !declaration.optional }, 'element.signal');
      if (given) said.set(input, given);
    }
    pending.push({ name, section, kind, said });
  }
  // An output may take the unit of an input, which may be another instrument's output: as many rounds as it takes.
  const waiting = new Set(pending.flatMap((one) => Object.keys(one.kind.outputs).map((output) => ({ one, output }))));
  for (let before = -1; before !== waiting.size; ) {
    before = waiting.size;
    for (const item of waiting) {
      const info = outputInfo(item.one, item.output, signals);
      if (!info) continue;
      signals.add(info);
      waiting.delete(item);
    }
  }
  for (const { one } of waiting) signals.unread.add(one.name);
  for (const one of pending) addCommands(one, signals);
  return pending;
}

function outputInfo(one: Pending, output: string, signals: SignalList): SignalInfo | undefined {
  const declaration = one.kind.outputs[output]!;
  let unit: string | undefined = declaration.unit;
  if (declaration.unitOf !== undefined) {
    const said = one.said.get(declaration.unitOf);
    unit = said && inputSignal(one, declaration.unitOf, said, signals)?.unit;
  }
  if (unit === undefined) return undefined;
  return {
    path: `${one.name}.${output}`,
    group: 'instrument',
    unit,
    about: declaration.about,
    ...(declaration.least === undefined ? {} : { least: declaration.least }),
    ...(declaration.most === undefined ? {} : { most: declaration.most }),
  };
}

/** Commands of an instrument are signals like those of an element; `input` as unit stands for that of its input. */
function addCommands(one: Pending, signals: SignalList): void {
  for (const [name, { unit, about, least, most, fault, rest, difference }] of Object.entries(one.kind.commands ?? {})) {
    const free = Object.entries(one.kind.inputs).find(([, declaration]) => declaration.anyUnit)?.[0];
    const said = free === undefined ? undefined : one.said.get(free);
    const ofInput = said && free !== undefined ? inputSignal(one, free, said, signals)?.unit : undefined;
    signals.add({
      path: `${one.name}.${name}`,
      group: 'command',
      unit: unit === 'input' ? (ofInput ?? '1') : unit,
      about,
      ...(least === undefined ? {} : { least }),
      ...(most === undefined ? {} : { most }),
      ...(difference === undefined ? {} : { difference }),
      ...(fault ? { withoutFault: rest } : {}),
    });
  }
}

/** As `resolve`, without complaints. */
function inputSignal(
  one: Pick<Pending, 'name' | 'kind'>,
  input: string,
  said: Placed,
  signals: SignalList,
): SignalInfo | undefined {
  const exact = signals.find(said.text);
  if (exact || said.text.includes('.')) return exact;
  const declaration = one.kind.inputs[input];
  const fitting = signals.of(said.text).filter((info) => declaration?.anyUnit || info.unit === declaration?.unit);
  const value = fitting.filter((info) => info.path === `${said.text}.value`);
  const candidates = value.length > 0 ? value : fitting;
  return candidates.length === 1 ? candidates[0] : undefined;
}

/** Second pass: inputs, parameters and what the outputs drive. */
export function readInstruments(
  pending: readonly Pending[],
  signals: SignalList,
  drivers: Drivers,
  ambient: Ambient,
): InstrumentSpec[] {
  const instruments: InstrumentSpec[] = [];
  for (const { name, section, kind, said } of pending) {
    const inputs: Record<string, string> = {};
    let inputUnit: string | undefined;
    for (const [input, place] of said) {
      const declaration = kind.inputs[input]!;
      const info = signals.resolve(section, input, place, declaration.anyUnit ? {} : { unit: declaration.unit });
      if (!info) continue;
      inputs[input] = info.path;
      if (declaration.anyUnit) inputUnit ??= info.unit;
    }
    // With the unit of its input unknown, the parameters in that unit cannot be judged.
    const read = readParameters(section, inUnitOfInput(kind, inputUnit), ambient);
    const drives = readDrives(section, name, kind, signals, drivers);
    for (const key of [...Object.keys(kind.parameters), ...rangeKeys(kind.parameters).keys()]) section.skip(key);
    section.finish([...read.keys, ...Object.keys(kind.inputs), 'drives']);
    instruments.push({ name, kind, parameters: read.values, inputs, drives, where: section.where });
  }
  return instruments;
}

/** Parameters declared in the unit `input` take the unit of the signal that the instrument is tied to. */
function inUnitOfInput(kind: InstrumentKind, unit: string | undefined): InstrumentKind['parameters'] {
  const declared: Record<string, ParameterDeclaration> = {};
  for (const [name, declaration] of Object.entries(kind.parameters)) {
    if (declaration.unit !== 'input') declared[name] = declaration;
    else if (unit !== undefined) declared[name] = { ...declaration, unit };
  }
  return declared;
}

function readDrives(
  section: Section,
  name: string,
  kind: InstrumentKind,
  signals: SignalList,
  drivers: Drivers,
): Record<string, string> {
  const drives: Record<string, string> = {};
  const outputs = Object.keys(kind.outputs);
  const tie = (of: Section, key: string, output: string, said: Placed) => {
    const info = signals.resolve(of, key, said, {
      unit: signals.find(`${name}.${output}`)?.unit ?? kind.outputs[output]!.unit,
      groups: ['command'],
    });
    if (info && drivers.take(of, key, info.path, `${section.path}.drives`, said.where)) drives[output] = info.path;
  };
  const entry = section.entry('drives');
  if (!entry) return drives;
  if (entry.value.kind === 'scalar') {
    const said = section.placed('drives', {}, 'element.command');
    if (said && outputs.length !== 1)
      section.fail(
        'drives',
        `${kind.kind} has ${outputs.length} outputs`,
        `write drives: { ${outputs[0] ?? 'output'}: element.command }`,
      );
    else if (said) tie(section, 'drives', outputs[0]!, said);
    return drives;
  }
  const inner = section.section('drives');
  if (!inner) return drives;
  for (const output of inner.keys()) {
    if (!Object.hasOwn(kind.outputs, output)) {
      inner.skip(output);
      inner.fail(output, `${kind.kind} has no such output`, suggestion(output, outputs), {}, inner.whereIs(output));
      continue;
    }
    const said = inner.placed(output, {}, 'element.command');
    if (said) tie(inner, output, output, said);
  }
  return drives;
}
