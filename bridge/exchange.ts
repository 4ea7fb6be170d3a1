import type { BlockLayout } from '../runtime/block.js';
import { BuildError, type Problem } from '../runtime/contract.js';
import { type EventCatalogue, type Journal, noJournal } from '../runtime/journal.js';
import type { SignalTable } from '../runtime/signals.js';
import { busFaults, linkFaults } from './bus-adversary.js';
import { CanLink } from './can-link.js';
import { controllerFaults } from './controller-faults.js';
import { requireSoundMap } from './examine-map.js';
import { ExchangeTables } from './exchange-tables.js';
import type { Link } from './link.js';
import { linkEvents } from './link-events.js';
import { frameFaults, messageFaults } from './message-faults.js';
import type { MessageMap } from './message-map.js';
import { StandIns, standIn } from './stand-ins.js';
import type { Transport } from './transport.js';
import { mapChecksum } from './udp-layout.js';
import { UdpLink } from './udp-link.js';

const nobody = () => {};
/** s */
const leastBoot = 0.01;

/** Where commands stand in the block. */
export interface Targets {
  /** Slot of the command with this path, or -1. */
  find(path: string): number;
  /** Paths like it, for the message about an unknown one. */
  nearest?(path: string): readonly string[];
}

export interface ExchangeOptions {
  readonly map: MessageMap;
  readonly layout: BlockLayout;
  /** Complete but for the exchange's own signals: what the messages carry is looked up here. */
  readonly signals: SignalTable;
  readonly events: EventCatalogue;
  readonly targets: Targets;
  /** Length of a tick, s. */
  readonly step: number;
  /** Seed of what faults of messages leave to chance. */
  readonly seed?: number;
  /** Control units that the bench does not stand in for from the start. */
  readonly without?: readonly string[];
  /** Ticks, from the first, in which time-outs put substitutes in place but are not counted. Default 0. */
  readonly bootWindowTicks?: number;
  /** Number of the first tick; negative with a pre-roll. Default 0. */
  readonly firstTick?: number;
  /** Most datagrams or frames that one tick takes from one link. Default: four times the messages it may bring, at least 64. */
  readonly datagramsPerTick?: number;
}

/**
 * The exchange of messages with controllers, on the loop thread: `take` at the start of a tick, `publish` near its
 * end. All that it remembers stands in the block, so that a run derived again from its inputs has the same bytes; it
 * allocates nothing after it is made.
 *
 * Signals: `message.signal` (SI; the value that counts, or the value sent last), `message.age` and the counts of each
 * message, the counts of each link, and `link.oneStepShare`.
 */
export class Exchange {
  readonly checksum: number;
  readonly links: readonly Link[];
  /** Faults of messages and of buses, and the stand-ins, as commands with their slots. */
  readonly faults: {
    readonly path: string;
    readonly unit: string;
    readonly about: string;
    readonly least: number;
    readonly most: number;
    readonly slot: number;
  }[];
  private readonly tables: ExchangeTables;
  private readonly standIns: StandIns;
  private readonly units: Float64Array;
  private readonly bootUntil: number;
  private readonly silent: number;
  /** Slots: 1 while a hello is due; above 0 while the controller has no power and until it has booted; what `life.supply` says, or -1. */
  private readonly helloDue: number;
  private readonly off: number;
  private readonly supply: number;
  private readonly controller: { readonly silent: number; readonly frozen: number; readonly restarting: number };
  private readonly deaf: number;
  /** Ticks after its supply has come in which what is still on its way is not believed. */
  private readonly boot: number;
  private readonly timedOutKind: number;
  private readonly cameBackKind: number;
  private readonly awakeKind: number;
  private readonly step: number;
  private readonly bootWindowTicks: number;
  private readonly subjects: Int32Array[];
  private readonly linkSubjects: Int32Array;
  private journal: Journal = noJournal;
  /** Told of each start of the controller: for one in the same thread on a link that has no word for it. */
  onHello: () => void = nobody;

  constructor(options: ExchangeOptions) {
    const { map, layout, events, step } = options;
    requireSoundMap(map);
    const firstTick = options.firstTick ?? 0;
    const problems: Problem[] = [];
    this.checksum = mapChecksum(map);
    this.step = step;
    this.bootWindowTicks = options.bootWindowTicks ?? 0;
    this.bootUntil = layout.add('exchange.bootUntil', firstTick + this.bootWindowTicks);
    this.silent = layout.add('exchange.silent');
    this.helloDue = layout.add('exchange.helloDue', 1);
    this.off = layout.add('exchange.off');
    this.deaf = layout.add('exchange.deaf');
    this.boot = Math.max(2, Math.round(leastBoot / step));
    this.supply = options.targets.find('life.supply');
    this.controller = {
      silent: layout.add('controller.silent'),
      frozen: layout.add('controller.frozen'),
      restarting: layout.add('controller.restarting'),
    };
    this.timedOutKind = events.kind(linkEvents.timedOut);
    this.cameBackKind = events.kind(linkEvents.cameBack);
    this.awakeKind = events.kind(linkEvents.awake);

    const links: Link[] = map.links.map((spec, number) => {
      const messages = map.messages.filter((message) => message.link === spec.name);
      const most =
        options.datagramsPerTick ??
        Math.max(64, 4 * messages.filter((message) => message.direction === 'received').length);
      return spec.kind === 'udp'
        ? new UdpLink(spec, number, messages, this.checksum, layout, firstTick, most)
        : new CanLink(spec, number, messages, layout, firstTick, most, step, options.seed ?? 0);
    });
    this.links = links;
    const all = links.flatMap((link) => [...link.receivers, ...link.senders]);
    for (const [stream, one] of all.entries()) {
      const { kind } = map.links.find((link) => link.name === one.message.link)!;
      one.addFaults(layout, step, options.seed ?? 0, 1000 + stream, kind !== 'udp');
    }
    for (const { receivers } of links)
      for (const receiver of receivers) receiver.faults!.join({ silent: this.deaf, frozen: this.controller.frozen });
    this.faults = [
      ...(links.some((link) => link.receivers.length > 0)
        ? Object.entries(controllerFaults).map(([name, { unit, about, least, most }]) => ({
            path: `controller.${name}`,
            unit,
            about,
            least,
            most,
            slot: this.controller[name as keyof typeof controllerFaults],
          }))
        : []),
      ...all.flatMap(({ message, faults }) =>
        Object.entries({ ...messageFaults, ...(faults!.frames ? frameFaults : {}) }).map(
          ([name, { unit, about, least, most }]) => ({
            path: `${message.name}.${name}`,
            unit,
            about,
            least,
            most,
            slot: faults!.slots[name as keyof typeof messageFaults | keyof typeof frameFaults],
          }),
        ),
      ),
      ...links.flatMap(({ spec, faults }) =>
        faults === undefined
          ? []
          : Object.entries(linkFaults).map(([name, { unit, about, most }]) => ({
              path: `${spec.name}.${name}`,
              unit,
              about,
              least: 0,
              most,
              slot: faults[name as keyof typeof linkFaults],
            })),
      ),
      ...links.flatMap((link) =>
        (link.adversaries ?? []).flatMap(({ way, faults }) =>
          Object.entries(busFaults).map(([name, { unit, about, most }]) => ({
            path: `${link.spec.name}.${way}${name}`,
            unit,
            about: `${about}, ${way}`,
            least: 0,
            most,
            slot: faults[name as keyof typeof busFaults],
          })),
        ),
      ),
    ];
    this.tables = new ExchangeTables(links, options, problems);
    if (problems.length > 0) throw new BuildError(problems);
    this.standIns = new StandIns(
      links.flatMap((link) => link.senders),
      layout,
      options.signals,
      options.without ?? [],
    );
    for (const [unit, slot] of this.standIns.slots) {
      const { name, ...info } = standIn;
      this.faults.push({ ...info, path: `${unit}.${name}`, slot });
    }

    this.units = new Float64Array(this.tables.gathered.length);
    this.subjects = links.map((link) =>
      Int32Array.from(link.receivers, (receiver) => events.subject(receiver.message.name)),
    );
    this.linkSubjects = Int32Array.from(links, (link) => events.subject(link.spec.name));
  }

  /** Ties a link to what moves its datagrams; before that nothing comes on it and nothing leaves. */
  attach(linkName: string, transport: Transport): void {
    const link = this.links.find((one) => one.spec.name === linkName);
    if (!link) throw new Error(`no link ${linkName}; there are: ${this.links.map((one) => one.spec.name).join(', ')}`);
    link.transport = transport;
  }

  setJournal(journal: Journal): void {
    this.journal = journal;
    for (const link of this.links) link.journal = journal;
  }

  /** Stage `take`: drains the links, ages messages, puts substitutes in place, drives commands, shows all as signals. */
  take(block: Float64Array, signals: Float64Array, tick: number): void {
    this.power(block, tick);
    const counts = tick >= block[this.bootUntil];
    for (let l = 0; l < this.links.length; l += 1) {
      const link = this.links[l];
      const wasAwake = block[link.awake];
      link.take(block, tick);
      if (wasAwake === 0 && block[link.awake] === 1)
        this.journal.event(tick, this.awakeKind, this.linkSubjects[l], 0, 0, 0);
      const receivers = link.receivers;
      for (let i = 0; i < receivers.length; i += 1) {
        const change = receivers[i].settle(block, counts);
        if (change !== 0) {
          const ticks = change > 0 ? block[receivers[i].age] : block[receivers[i].gap];
          this.journal.event(
            tick,
            change > 0 ? this.timedOutKind : this.cameBackKind,
            this.subjects[l][i],
            ticks * this.step,
            0,
            0,
          );
        }
      }
    }
    this.tables.driven.copy(block, block);
    this.tables.taken.copy(block, signals);
    for (let i = 0; i < this.tables.shares.length; i += 1) {
      const { slots, signal } = this.tables.shares[i];
      signals[signal] = block[slots.replies] > 0 ? block[slots.oneStepReplies] / block[slots.replies] : 0;
    }
    this.tables.reports.report(block, tick, this.journal);
  }

  /** Stage `publish`: writes and sends, in map order, what is due in this tick. */
  publish(block: Float64Array, signals: Float64Array, tick: number): void {
    if (block[this.silent] === 0) {
      this.tables.gathered.copy(signals, this.units);
      this.standIns.prepare(block, signals, tick, this.units);
      let from = 0;
      for (let l = 0; l < this.links.length; l += 1) {
        const link = this.links[l];
        if (block[this.helloDue] !== 0) link.hello(tick);
        for (let i = 0; i < link.senders.length; i += 1) {
          link.send(block, tick, i, this.units, from);
          from += link.senders[i].count;
        }
        link.flush(block, tick);
      }
      if (block[this.helloDue] !== 0) this.onHello();
      block[this.helloDue] = 0;
    }
    this.tables.published.copy(block, signals);
  }

  /** Defined silence: with `silent` nothing is sent until it is called again with false. */
  setSilent(block: Float64Array, silent: boolean): void {
    block[this.silent] = silent ? 1 : 0;
  }

  /** Without power nothing of the controller is believed; when it comes back the controller boots anew. */
  private power(block: Float64Array, tick: number): void {
    const { controller } = this;
    const off = (this.supply >= 0 && block[this.supply] < 0.5) || block[controller.restarting] >= 0.5;
    if (off) block[this.off] = this.boot;
    else if (block[this.off] > 0) {
      if (block[this.off] === this.boot) {
        this.startBootWindow(block, tick);
        block[this.helloDue] = 1;
      }
      block[this.off] -= 1;
    }
    block[this.deaf] = block[this.off] > 0 || block[controller.silent] >= 0.5 ? 1 : 0;
  }

  /** The controller boots (again) at `tick`: time-outs do not count for the boot window. */
  startBootWindow(block: Float64Array, tick: number): void {
    block[this.bootUntil] = tick + this.bootWindowTicks;
  }

  /** All counts to zero, between the pre-roll and the first counted tick. Sequences, ages and values stay. */
  clearCounts(block: Float64Array): void {
    for (const link of this.links) link.clearCounts(block);
    this.tables.reports.clear(block);
  }
}
