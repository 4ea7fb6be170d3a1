import type {
  Acknowledgement,
  BenchFacts,
  EventNames,
  Hand,
  HandCommand,
  LiveEvent,
  LiveSink,
  LiveSource,
  LiveStatus,
} from '../../bridge/live/source.js';
import type { SignalInfo } from '../../runtime/contract.js';
import { handEventNames, quietHandEvents } from '../../runtime/hand-events.js';
import { HAND, scenarioActions } from '../../runtime/hand-wire.js';
import type { RunReady } from '../loop/run-order.js';
import type { HandChannel } from '../run/hand-channel.js';
import type { RunView } from '../run/host-run.js';
import { benchFacts } from './bench-facts.js';
import { RunState } from './run-state.js';

/** A run that goes on, as the live page sees it. Lives on the host thread; takes what the recorder hands over. */
export class RunSource implements LiveSource {
  readonly bench: BenchFacts;
  readonly signals: readonly SignalInfo[];
  readonly events: EventNames & { subjects: string[] };
  readonly command?: (command: HandCommand, hand: Hand) => Promise<Acknowledgement>;
  private readonly sinks = new Set<LiveSink>();
  private readonly state: RunState;
  private readonly held = new Set<string>();

  constructor(
    private readonly view: RunView,
    ready: RunReady,
  ) {
    const { spec, script } = view.plan;
    this.signals = ready.signals as readonly SignalInfo[];
    this.events = { kinds: ready.events.kinds, subjects: [...ready.events.subjects] };
    this.state = new RunState(view, ready);
    const channel = view.hands;
    this.bench = benchFacts({
      spec,
      script,
      recorded: this.signals,
      control: channel !== undefined,
      requirements: this.state.requirements,
    });
    if (channel !== undefined) this.command = (command, hand) => this.act(channel, command, hand);
  }

  attach(sink: LiveSink): () => void {
    this.sinks.add(sink);
    return () => this.sinks.delete(sink);
  }

  /** To be called with what the recorder read. */
  rows(ticks: Float64Array, values: Float32Array, count: number): void {
    for (const sink of this.sinks) sink.rows(ticks, values, count);
  }

  event(event: { tick: number; code: number; subject: number; a: number; b: number; c: number }): void {
    const { tick, code, a, b, c } = event;
    const kind = this.events.kinds[code];
    if (kind === undefined || quietHandEvents.includes(kind.name)) return;
    if (kind.name === handEventNames.lapses) this.held.delete(this.events.subjects[event.subject] ?? '');
    const told: LiveEvent = { tick, kind: code, subject: this.subjectOf(kind.name, event.subject, c), a, b, c };
    for (const sink of this.sinks) sink.event(told);
  }

  status(): LiveStatus {
    return this.state.status();
  }

  /** A note's text is no subject that the bench knew when it was built. */
  private subjectOf(kind: string, subject: number, request: number): number {
    const note = kind === handEventNames.notes ? this.view.hands?.textOf(request) : undefined;
    if (note === undefined) return subject;
    this.events.subjects.push(`${note.said} (${note.who})`);
    return this.events.subjects.length - 1;
  }

  private act(channel: HandChannel, command: HandCommand, hand: Hand): Promise<Acknowledgement> {
    switch (command.kind) {
      case 'set':
        return this.set(channel, command.path, command.value, hand);
      case 'release':
        this.held.delete(command.path);
        return channel.put(
          { kind: HAND.release, target: channel.target(command.path), said: command.reason, name: command.path },
          hand,
        );
      case 'scenario': {
        // the scenario starts by itself with tick 0; one that is held before it has begun can only be let go on
        const action = command.action === 'start' ? 'continue' : command.action;
        return channel.put({ kind: HAND.scenario, target: scenarioActions.indexOf(action), name: 'scenario' }, hand);
      }
      case 'acknowledge':
        return channel.put({ kind: HAND.acknowledge, target: command.warning, name: 'warning' }, hand);
      case 'note':
        return channel.put({ kind: HAND.note, target: 0, said: command.text, name: 'note' }, hand);
    }
  }

  private set(channel: HandChannel, path: string, value: number, hand: Hand): Promise<Acknowledgement> {
    const facts = this.bench.hands.find((candidate) => candidate.path === path);
    const target = channel.target(path);
    if (facts === undefined || target < 0)
      return Promise.resolve({ ok: false, tick: -1, text: `${path} is nothing that a hand may set on this bench` });
    // a fault taken away, a key turned back: the hand lets go, and what the script says counts again
    if (facts.deadMan === undefined && value === facts.rest && this.held.has(path)) {
      this.held.delete(path);
      return channel.put({ kind: HAND.release, target, said: 'put back', name: path }, hand);
    }
    this.held.add(path);
    const deadMan = facts.deadMan === undefined ? 0 : Math.max(1, Math.round(facts.deadMan / this.bench.step));
    return channel.put({ kind: HAND.set, target, value, deadMan, name: path }, hand);
  }
}
