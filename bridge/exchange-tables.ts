import type { Problem } from '../runtime/contract.js';
import { type Expression, eachSignal } from '../runtime/judge/formula.js';
import type { SignalTable } from '../runtime/signals.js';
import { CountReports } from './count-reports.js';
import type { ExchangeOptions } from './exchange.js';
import type { Link } from './link.js';
import { type Counts, countsOfLink, countsOfMessage, shownAs } from './link-counts.js';
import type { MapSignal } from './message-map.js';
import { SlotCopies } from './slot-copies.js';

/**
 * What stands between the block, the signals and the messages, as tables: made once when the bench is built. Declares
 * all signals of the exchange on the way.
 */
export class ExchangeTables {
  /** Block to signals, at the end of `take` and of `publish`. */
  readonly taken = new SlotCopies();
  readonly published = new SlotCopies();
  /** Received values to command slots, within the block. */
  readonly driven = new SlotCopies();
  /** Signals to the values of sent messages, one after the other, in units of the map. */
  readonly gathered = new SlotCopies();
  readonly shares: { readonly slots: Link['slots']; readonly signal: number }[] = [];
  readonly reports: CountReports;

  constructor(
    private readonly links: readonly Link[],
    options: ExchangeOptions,
    problems: Problem[],
  ) {
    this.reports = new CountReports(options.layout, options.events, Math.max(1, Math.round(1 / options.step)));
    for (const link of links) this.declare(link, options, problems);
    this.connect(options, problems);
  }

  /** Declares the signals of one link and of its messages, and what is reported of their counts. */
  private declare(link: Link, options: ExchangeOptions, problems: Problem[]): void {
    const { signals, step } = options;
    const show = (
      copies: SlotCopies,
      slot: number,
      path: string,
      unit: string,
      about: string,
      group: 'link' | 'received' | 'sent',
      scale = 1,
      offset = 0,
    ): void => {
      if (signals.find(path) >= 0) {
        problems.push({
          path: `messages.${path}`,
          what: 'the signal path is taken by an element or instrument',
          remedy: 'rename the message or the element',
        });
        return;
      }
      copies.add(slot, signals.add({ path, unit, about, group }), scale, offset);
    };
    const showCounts = (copies: SlotCopies, owner: string, counts: Counts, slots: Link['slots']): void => {
      for (const [name, info] of Object.entries(counts)) {
        const { about, event } = info;
        const { unit, scale } = shownAs(info, step);
        show(copies, slots[name], `${owner}.${name}`, unit, about, 'link', scale);
        if (event) this.reports.watch(slots[name], event, owner);
      }
    };
    const { name, kind } = link.spec;
    showCounts(this.taken, name, countsOfLink(kind), link.slots);
    if (kind === 'udp')
      this.shares.push({
        slots: link.slots,
        signal: signals.add({
          path: `${name}.oneStepShare`,
          unit: '1',
          about: 'share of the used messages that answer the tick just before',
          group: 'link',
          least: 0,
          most: 1,
        }),
      });
    for (const receiver of link.receivers) {
      const { message } = receiver;
      message.signals.forEach((signal, i) => {
        show(
          this.taken,
          receiver.values + i,
          `${message.name}.${signal.name}`,
          siUnit(signal, signals),
          signal.about,
          'received',
          signal.unitScale,
          signal.unitOffset,
        );
      });
      showCounts(this.taken, message.name, countsOfMessage(kind, 'received'), receiver.slots);
    }
    for (const sender of link.senders) {
      const { message } = sender;
      message.signals.forEach((signal, i) => {
        show(
          this.published,
          sender.carried + i,
          `${message.name}.${signal.name}`,
          siUnit(signal, signals),
          signal.about,
          'sent',
          signal.unitScale,
          signal.unitOffset,
        );
      });
      showCounts(this.published, message.name, countsOfMessage(kind, 'sent'), sender.slots);
    }
  }

  private requireSignals(expression: Expression, path: string, signals: SignalTable, problems: Problem[]): void {
    for (const said of signalsOf(expression))
      if (signals.find(said) < 0) problems.push(unknown(path, 'there is no such signal', said, signals.nearest(said)));
  }

  /** Finds what sent messages carry and what received ones drive. */
  private connect(options: ExchangeOptions, problems: Problem[]): void {
    const { signals, targets } = options;
    const drivers = new Map<number, string>();
    for (const link of this.links) {
      for (const sender of link.senders) {
        const condition = sender.message.while;
        if (condition !== undefined)
          eachSignal(condition, (said) => {
            if (signals.find(said) < 0)
              problems.push(
                unknown(
                  `messages.${sender.message.name}.while`,
                  'there is no such signal',
                  said,
                  signals.nearest(said),
                ),
              );
          });
        for (const signal of sender.message.signals) {
          const path = `messages.${sender.message.name}.${signal.name}`;
          if (signal.expression !== undefined) {
            this.requireSignals(signal.expression, path, signals, problems);
            this.gathered.add(0, this.gathered.length);
            continue;
          }
          const index = signals.find(signal.path);
          if (index < 0)
            problems.push(unknown(path, 'there is no such signal', signal.path, signals.nearest(signal.path)));
          this.gathered.add(index, this.gathered.length, 1 / signal.unitScale, -signal.unitOffset / signal.unitScale);
        }
      }
      for (const receiver of link.receivers)
        receiver.message.signals.forEach((signal, i) => {
          if (signal.path === '') return;
          const path = `messages.${receiver.message.name}.${signal.name}`;
          const slot = targets.find(signal.path);
          if (slot < 0)
            problems.push(unknown(path, 'there is no such command', signal.path, targets.nearest?.(signal.path) ?? []));
          const other = drivers.get(slot);
          if (slot >= 0 && other !== undefined)
            problems.push({
              path,
              what: 'the command has two masters',
              value: signal.path,
              bound: `driven by ${other} already`,
              remedy: 'drive it from one message',
            });
          drivers.set(slot, path);
          this.driven.add(receiver.values + i, slot, signal.unitScale, signal.unitOffset);
        });
    }
  }
}

/** Paths in an expression. */
function signalsOf(expression: Expression): string[] {
  const found: string[] = [];
  eachSignal({ is: 'compare', left: expression, relation: '<', right: expression, unit: '1' }, (path) => {
    if (!found.includes(path)) found.push(path);
  });
  return found;
}

function unknown(path: string, what: string, value: string, near: readonly string[]): Problem {
  return {
    path,
    what,
    value: value === '' ? 'no path' : value,
    remedy: near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see `oilspring list signals BENCH`',
  };
}

/** The SI unit of a signal: from the path it carries or drives, else as the map says it. */
function siUnit(signal: MapSignal, signals: SignalTable): string {
  const index = signals.find(signal.path);
  if (index >= 0) return signals.all[index].unit;
  if (signal.siUnit !== undefined) return signal.siUnit;
  return signal.unitScale === 1 && signal.unitOffset === 0 ? signal.unit : `SI of ${signal.unit}`;
}
