import type {
  Histogram as HistogramFacts,
  LiveStatus,
  RequirementFacts,
  RequirementStatus,
  RunStatus,
  ScenarioStatus,
  TimingStatus,
  WarningStatus,
} from '../../bridge/live/source.js';
import type { Requirement } from '../../runtime/judge/formula.js';
import type { Histogram } from '../../runtime/realtime/histogram.js';
import { judgeRun, type Measured } from '../../runtime/verdict.js';
import { laddersOf } from '../../runtime/watch-ladders.js';
import { watchSeverity } from '../../runtime/watch-levels.js';
import { describeWarning } from '../../runtime/watch-log.js';
import { SLOT } from '../../runtime/watch-tables.js';
import type { RunReady } from '../loop/run-order.js';
import type { RunView } from '../run/host-run.js';
import { judgedPaths, judgedStatus, requirementFacts } from './judged.js';
import { MessageRates } from './message-rates.js';

/** Upper edges of the buckets that people see, s. */
const edges = [
  1e-6, 2e-6, 5e-6, 10e-6, 20e-6, 30e-6, 40e-6, 50e-6, 60e-6, 80e-6, 100e-6, 150e-6, 200e-6, 300e-6, 500e-6, 1e-3, 2e-3,
  5e-3, 10e-3, 20e-3,
];

/** Everything about a run that is no signal, from the board, the timing counts and what the host knows itself. */
export class RunState {
  readonly requirements: readonly RequirementFacts[];
  private readonly asked: readonly Requirement[];
  /** Margins as last seen, and when they came to be. */
  private readonly margins: number[] = [];
  private readonly since: number[] = [];
  private readonly messages: MessageRates;
  private readonly ladders;
  private readonly firstWarning: number;
  private stepSeen = -1;
  private stepSince = 0;

  constructor(
    private readonly view: RunView,
    ready: RunReady,
  ) {
    const { spec, script } = view.plan;
    this.asked = [...spec.requirements, ...script.requirements];
    this.requirements = requirementFacts(this.asked, ready.signals);
    this.messages = new MessageRates(spec);
    this.ladders = spec.watched.flatMap((watched) => laddersOf(watched, spec.ambient.pressure));
    const [first] = this.ladders;
    this.firstWarning =
      first === undefined ? -1 : (view.board?.place(`watch.${first.path}.${first.side}.present`) ?? -1);
  }

  status(): LiveStatus {
    this.view.board?.read();
    const tick = this.tick;
    return {
      run: this.run(tick),
      scenario: this.scenario(tick),
      warnings: this.warnings(),
      messages: this.messages.status(tick, (path) => this.view.board?.value(path)),
      timing: this.timing(),
      requirements: this.judged(tick),
    };
  }

  /** The last counted tick. */
  private get tick(): number {
    return Math.max(0, Number.isFinite(this.view.tick) ? this.view.tick : 0);
  }

  private value(name: string): number {
    return this.view.board?.value(name) ?? 0;
  }

  private run(tick: number): RunStatus {
    const { plan, hands } = this.view;
    return {
      phase: this.phase(tick),
      pace: plan.wish.pace,
      tick,
      wallClock: plan.wish.pace === 'live' ? Date.now() : 0,
      notValid: this.notValid(tick),
      hands: hands?.count ?? 0,
      droppedRows: this.view.droppedRows,
    };
  }

  private phase(tick: number): string {
    const { phase, plan, board } = this.view;
    if (phase === 'finished') return 'ended';
    if (phase !== 'running' || board === undefined) return phase;
    if (board.value('life.supply') === 0) return 'supply off';
    if (board.value('life.key') === 0) return 'key off';
    if (tick < plan.spec.life.bootWindow - plan.spec.life.preRoll) return 'boot window';
    return 'running';
  }

  /** What would make the run not valid if it ended now. */
  private notValid(tick: number): string[] {
    const { plan, timing, droppedRows } = this.view;
    const { budgets, step, life } = plan.spec;
    if (tick === 0) return [];
    const { lateness, overruns, drift } = timing.summary();
    const measured = (name: string, value: number, bound: number, unit: string): Measured => ({
      name,
      value,
      bound,
      unit,
    });
    const { reasons } = judgeRun(
      {
        ticks: tick,
        step,
        ending: 'complete',
        timing:
          plan.wish.pace === 'live'
            ? [
                measured('99th percentile of lateness', lateness.p99 * 1e-6, budgets.lateness, 's'),
                measured('largest lateness', lateness.max * 1e-6, budgets.worstLateness, 's'),
                measured('share of overruns', overruns / tick, budgets.overruns, '1'),
                measured('drift against wall time', drift, budgets.drift, 's'),
              ]
            : [],
        frames: [],
        ledger: [],
        rowsLost: droppedRows,
        hands: life.hands ? [] : (this.view.hands?.sentences() ?? []),
      },
      [],
    );
    return reasons.map(({ what }) => what);
  }

  private scenario(tick: number): ScenarioStatus {
    const { plan, phase } = this.view;
    const step = Math.round(this.value('scenario.next')) - 1;
    if (step !== this.stepSeen) {
      this.stepSeen = step;
      const at = plan.script.steps[step]?.at;
      this.stepSince = at === undefined ? 0 : at + this.value('scenario.delay');
    }
    const before = phase !== 'running' && phase !== 'finished';
    const over =
      phase === 'finished' || (plan.script.ticks > 0 && tick - this.value('scenario.delay') >= plan.script.ticks);
    let state: ScenarioStatus['state'] = 'running';
    if (before) state = 'not started';
    else if (over) state = 'ended';
    else if (this.value('scenario.held') !== 0) state = 'held';
    return { state, step, sinceTick: this.stepSince };
  }

  /** Open warnings. Their numbers are those by which a hand acknowledges them. */
  private warnings(): WarningStatus[] {
    const { board, plan } = this.view;
    const { step } = plan.spec;
    if (board === undefined || this.firstWarning < 0) return [];
    return this.ladders.flatMap((ladder, k) => {
      const slots = board.stretch(this.firstWarning + SLOT.count * k, SLOT.count);
      if (slots[SLOT.worst] === 0) return [];
      const { path, level, unit, setting, peak, acknowledged, meaning } = describeWarning(ladder, slots, step);
      return [
        {
          identifier: k,
          path,
          level,
          severity: watchSeverity(level),
          unit,
          setting,
          peak,
          sinceTick: slots[SLOT.since]!,
          active: slots[SLOT.present]! > 0,
          acknowledged,
          meaning,
        },
      ];
    });
  }

  private timing(): TimingStatus {
    const { timing, plan } = this.view;
    const { budgets, step } = plan.spec;
    return {
      lateness: bucketed(timing.lateness, budgets.lateness),
      stepTime: bucketed(timing.step, step),
      overruns: timing.counters[0]!,
      collections: Number.NaN,
      drift: timing.counters[1]! / 1e9,
    };
  }

  private judged(tick: number): RequirementStatus[] {
    const { board } = this.view;
    return this.asked.map((requirement, i) => {
      const [verdict, margin] = judgedPaths(requirement);
      const now = board?.value(margin) ?? Number.NaN;
      if (!Object.is(now, this.margins[i])) this.since[i] = tick;
      this.margins[i] = now;
      return judgedStatus(board?.value(verdict), now, this.since[i]!);
    });
  }
}

/** The fine buckets in few coarse ones. */
function bucketed(histogram: Histogram, budget: number): HistogramFacts {
  const counts = new Array<number>(edges.length + 1).fill(0);
  for (const [upper, count] of histogram.counts()) {
    let at = edges.findIndex((edge) => upper * 1e-6 <= edge * 1.016);
    if (at < 0) at = edges.length;
    counts[at]! += count;
  }
  return { edges, counts, most: histogram.max * 1e-6, budget };
}
