import { busFaults, linkFaults } from '../bridge/bus-adversary.js';
import { controllerFaults } from '../bridge/controller-faults.js';
import { countsOfLink, countsOfMessage, shownAs } from '../bridge/link-counts.js';
import { frameFaults, messageFaults } from '../bridge/message-faults.js';
import type { MessageMap } from '../bridge/message-map.js';
import { standIn, unitsStoodFor } from '../bridge/stand-ins.js';
import type { PortKinds, SignalGroup, SignalInfo } from '../runtime/contract.js';
import {
  ledgerSignals,
  lifeSignals,
  meterSignals,
  scenarioSignals,
  stuffSignals,
  timingSignals,
  watchSignals,
  watchSignalsOf,
} from '../runtime/own-signals.js';
import type { WatchedSignal } from './bench-spec.js';
import type { ReadElement } from './elements.js';
import { shown } from './quantity.js';
import { type Placed, type Section, suggestion } from './section.js';
import { fits, parseUnit } from './units.js';

/** The signals that a bench file gives rise to, in its order, for looking up what the file refers to. */
export class SignalList {
  readonly all: SignalInfo[] = [];
  private readonly byPath = new Map<string, SignalInfo>();
  /** Names of elements and the like that could not be read: what refers to them is not complained about. */
  readonly unread = new Set<string>();

  add(info: SignalInfo): void {
    if (this.byPath.has(info.path)) return;
    this.byPath.set(info.path, info);
    this.all.push(info);
  }

  find(path: string): SignalInfo | undefined {
    return this.byPath.get(path);
  }

  /** All signals of an element, message or instrument. */
  of(name: string): SignalInfo[] {
    return this.all.filter((info) => info.path.startsWith(`${name}.`));
  }

  /** What the runtime itself tells: life, scenario, ledger, timing. */
  addRuntime(): void {
    for (const own of [lifeSignals, scenarioSignals, ledgerSignals, timingSignals])
      for (const info of Object.values(own)) this.add(info);
  }

  /** Energy that machines took up while braking and gave back. */
  addMeters(elements: readonly ReadElement[]): void {
    for (const { name, kind } of elements)
      if (kind.kind === 'pump-motor') for (const info of Object.values(meterSignals(name))) this.add(info);
  }

  /** What the watch tells of itself. */
  addWatch(watched: readonly WatchedSignal[]): void {
    for (const info of Object.values(watchSignals)) this.add(info);
    for (const { path, unit, relief, limits } of watched) {
      const far = !relief && limits.every(({ side }) => side === 'below') ? 'least' : 'largest';
      const { level, peak, timeToRelief } = watchSignalsOf(path, unit, far);
      for (const info of relief ? [level, peak, timeToRelief] : [level, peak]) this.add(info);
    }
  }

  /** The counts that links and messages keep of themselves. */
  addCounts(map: MessageMap): void {
    if (map.messages.some((message) => message.direction === 'received'))
      for (const [name, { unit, about, least, most, rest }] of Object.entries(controllerFaults))
        this.add({ path: `controller.${name}`, unit, about, group: 'command', least, most, withoutFault: rest });
    for (const link of map.links) {
      for (const [count, { about }] of Object.entries(countsOfLink(link.kind)))
        this.add({ path: `${link.name}.${count}`, unit: '1', about, group: 'link' });
      if (link.kind !== 'udp') {
        for (const [name, { unit, about, most }] of Object.entries(linkFaults))
          this.add({ path: `${link.name}.${name}`, unit, about, group: 'command', least: 0, most, withoutFault: 0 });
        for (const way of ['received', 'sent'])
          for (const [name, { unit, about, most }] of Object.entries(busFaults))
            this.add({
              path: `${link.name}.${way}${name}`,
              unit,
              about: `${about}, ${way}`,
              group: 'command',
              least: 0,
              most,
              withoutFault: 0,
            });
        continue;
      }
      this.add({
        path: `${link.name}.oneStepShare`,
        unit: '1',
        about: 'share of the used messages that answer the tick just before',
        group: 'link',
      });
    }
    const { name, ...info } = standIn;
    for (const unit of unitsStoodFor(map.messages)) this.add({ ...info, path: `${unit}.${name}`, group: 'command' });
    for (const message of map.messages) {
      const kind = map.links.find((link) => link.name === message.link)?.kind ?? 'udp';
      const faults = { ...messageFaults, ...(kind === 'udp' ? {} : frameFaults) };
      for (const [name, { unit, about, least, most, rest }] of Object.entries(faults))
        this.add({ path: `${message.name}.${name}`, unit, about, group: 'command', least, most, withoutFault: rest });
      for (const [count, info] of Object.entries(countsOfMessage(kind, message.direction)))
        this.add({ path: `${message.name}.${count}`, unit: shownAs(info, 1).unit, about: info.about, group: 'link' });
    }
  }

  addElements(elements: readonly ReadElement[], portKinds: PortKinds): void {
    for (const element of elements) {
      const { name, kind } = element;
      const groups: [SignalGroup, Readonly<Record<string, Omit<SignalInfo, 'path' | 'group'>>>][] = [
        ['state', kind.states],
        ['memory', kind.memory],
        ['reading', kind.readings],
        ['command', kind.commands],
      ];
      for (const [group, declared] of groups) {
        for (const [signal, { unit, about, least, most, difference }] of Object.entries(declared)) {
          const command = group === 'command' ? kind.commands[signal] : undefined;
          this.add({
            path: `${name}.${signal}`,
            group,
            unit,
            about,
            ...(least === undefined ? {} : { least }),
            ...(most === undefined ? {} : { most }),
            ...(difference === undefined ? {} : { difference }),
            ...(command?.fault ? { withoutFault: command.rest } : {}),
          });
        }
      }
      this.addLedgerOf(element, portKinds);
    }
    const stuffs = new Set(
      elements.flatMap(({ kind }) => [...Object.keys(kind.holds ?? {}), ...Object.keys(kind.brings ?? {})]),
    );
    for (const stuff of [...stuffs].sort()) for (const info of Object.values(stuffSignals(stuff))) this.add(info);
  }

  /** What the circuit builder tells of each element's energy. */
  private addLedgerOf({ name, kind, connections }: ReadElement, portKinds: PortKinds): void {
    const add = (signal: string, unit: string, about: string) =>
      this.add({ path: `${name}.${signal}`, unit, about, group: 'ledger' });
    if (kind.energy) add('energy', 'J', 'stored energy');
    if (kind.supply) add('supply', 'W', 'power that comes in from outside');
    if (kind.loss) add('loss', 'W', 'power that its law dissipates');
    const passes = Object.keys(connections).some((port) =>
      portKinds[kind.ports[port]!]?.power.some((factors) => factors.length === 2),
    );
    if (kind.role === 'branch' && passes) add('throughput', 'W', 'mechanical and hydraulic power passing through');
  }

  /** Resolves a text such as `a.b`, or the name of something with one signal of the unit. Reports what fails. */
  resolve(
    section: Section,
    key: string,
    said: Placed,
    wanted: { readonly unit?: string; readonly groups?: readonly SignalGroup[] },
  ): SignalInfo | undefined {
    const fail = (what: string, remedy: string) =>
      section.fail(key, what, remedy, { value: shown(said.text) }, said.where);
    const usable = (info: SignalInfo) => !wanted.groups || wanted.groups.includes(info.group);
    const unitFits = (info: SignalInfo) =>
      wanted.unit === undefined || fits(parseUnit(info.unit), parseUnit(wanted.unit));
    const owner = said.text.split('.')[0]!;
    if (this.unread.has(owner)) return undefined;
    let found = this.find(said.text);
    if (!found && !said.text.includes('.')) {
      const fitting = this.of(said.text).filter((info) => usable(info) && unitFits(info));
      // What a sensor or stage says is its `value`, whatever else it tells.
      const value = fitting.filter((info) => info.path === `${said.text}.value`);
      const candidates = value.length > 0 ? value : fitting;
      if (candidates.length > 1) {
        return fail(
          'names more than one signal',
          `write one of ${candidates
            .slice(0, 6)
            .map((info) => info.path)
            .join(', ')}`,
        );
      }
      found = candidates[0];
    }
    if (!found) {
      const own = this.of(owner)
        .filter(usable)
        .map((info) => info.path);
      const pool = own.length > 0 ? own : this.all.filter(usable).map((info) => info.path);
      return fail(`unknown ${wanted.groups?.length === 1 ? wanted.groups[0] : 'signal'}`, suggestion(said.text, pool));
    }
    if (!usable(found)) return fail(`${found.path} is a ${found.group}`, `name a ${wanted.groups!.join(' or ')}`);
    if (!unitFits(found))
      return fail(`signal in ${found.unit} where one in ${wanted.unit} belongs`, `name a signal in ${wanted.unit}`);
    return found;
  }

  /** Paths that match any of the patterns; `*` stands for any run of letters within or across the dot. */
  match(section: Section, key: string, patterns: readonly Placed[]): string[] {
    const found = new Set<string>();
    for (const pattern of patterns) {
      const test = globTest(pattern.text);
      const hits = this.all.filter((info) => test(info.path));
      const mayBeUnread = pattern.text.includes('*')
        ? this.unread.size > 0
        : this.unread.has(pattern.text.split('.')[0]!);
      if (hits.length === 0 && !mayBeUnread) {
        const remedy = pattern.text.includes('*')
          ? 'check the pattern against the list of signals'
          : suggestion(
              pattern.text,
              this.all.map((info) => info.path),
            );
        section.fail(key, 'no such signal', remedy, { value: shown(pattern.text) }, pattern.where);
      }
      for (const hit of hits) found.add(hit.path);
    }
    return this.all.filter((info) => found.has(info.path)).map((info) => info.path);
  }
}

/** A test for a path against a pattern with `*`. Linear in both, whatever the pattern. */
export function globTest(pattern: string): (path: string) => boolean {
  const parts = pattern.split('*');
  return (path) => {
    if (parts.length === 1) return path === pattern;
    const first = parts[0]!;
    const last = parts.at(-1)!;
    if (!path.startsWith(first) || path.length < first.length + last.length || !path.endsWith(last)) return false;
    let at = first.length;
    for (const part of parts.slice(1, -1)) {
      const next = path.indexOf(part, at);
      if (next < 0) return false;
      at = next + part.length;
    }
    return at <= path.length - last.length;
  };
}
