import type { RequirementResult } from '../../runtime/judge/result.js';
import type { RunRequirement, RunSummary } from '../../runtime/run-summary.js';
import { judgeRun, type Measured } from '../../runtime/verdict.js';
import { pressureSettings } from '../../runtime/watch-settings.js';
import { driveQuality } from '../report/drive-trace.js';
import { type RunOutcome, softwareVersion } from './host-run.js';

/** The summary of a run that has ended, with its verdict. */
export function summarise(outcome: RunOutcome): RunSummary {
  const { plan, done, failed, ready } = outcome;
  const { spec, wish } = plan;
  const { step, budgets } = spec;
  const { ticks } = outcome;
  const simulated = ticks * step;
  const live = wish.pace === 'live';
  const last = new Map((ready?.paths ?? []).map((path, i) => [path, done?.last[i] ?? Number.NaN]));
  const value = (path: string) => last.get(path) ?? 0;
  const timing = outcome.timing.summary();
  const links = spec.map.links.map((link) => linkOf(plan.spec, link, value));
  const expected = spec.map.messages
    .filter((message) => message.direction === 'received' && message.every > 0)
    .reduce((sum, message) => sum + ticks / message.every, 0);
  const troubled = links.reduce((sum, link) => sum + link.lost + link.late + link.malformed, 0);
  const broken = failed?.what ?? done?.failure;
  const judgement = judgeRun(
    {
      ticks,
      step,
      ending: broken !== undefined && broken !== null ? 'broken' : done?.stopped ? 'stopped' : 'complete',
      ...(broken ? { endingReason: broken } : done?.stopped ? { endingReason: 'by hand' } : {}),
      timing: live
        ? [
            measured('99th percentile of lateness', timing.lateness.p99 * 1e-6, budgets.lateness, 's'),
            measured('largest lateness', timing.lateness.max * 1e-6, budgets.worstLateness, 's'),
            measured('share of overruns', ticks > 0 ? timing.overruns / ticks : 0, budgets.overruns, '1'),
            measured('drift against wall time', timing.drift, budgets.drift, 's'),
          ]
        : [],
      frames:
        expected > 0 && plan.controller.kind !== 'none'
          ? [measured('share of lost, late and malformed messages', troubled / expected, budgets.lostFrames, '1')]
          : [],
      ledger: done
        ? [
            measured(
              'energy residual as a share of the turnover',
              done.ledger.energyResidual,
              budgets.energyResidual,
              '1',
            ),
            measured('oil residual as a share of the oil', done.ledger.oilResidual, budgets.oilResidual, '1'),
          ]
        : [],
      rowsLost: (done?.dropped ?? 0) + (done?.overflows ?? 0),
      hands: spec.life.hands ? [] : outcome.hands,
      otherwise: [
        ...scenarioTrouble(outcome, value),
        ...(outcome.recordingFailure === undefined ? [] : [outcome.recordingFailure]),
        ...(outcome.controllerEnded === undefined ? [] : [`the controller ${outcome.controllerEnded}`]),
      ],
    },
    done?.requirements ?? [],
  );
  const energies: { key: string; about: string; value: number }[] = [];
  for (const [path, energy] of last) {
    const match = /^ledger\.(\w+)\.(recovered|returned)$/.exec(path);
    if (match)
      energies.push({
        key: match[2]!,
        about: `${match[2] === 'recovered' ? 'taken up' : 'given back'} by ${match[1]}`,
        value: energy,
      });
  }
  for (const element of spec.circuit.elements) {
    if (element.kind.kind === 'service-brake')
      energies.push({
        key: 'braked',
        about: `turned to heat in ${element.name}`,
        value: value(`${element.name}.brakeEnergy`),
      });
  }
  const engine = spec.circuit.elements.find((element) => element.kind.kind === 'combustion-engine');
  return {
    bench: spec.name,
    scenario: plan.script.name,
    pace: wish.pace,
    seed: plan.seed,
    software: softwareVersion(),
    verdict: judgement.verdict,
    valid: judgement.valid,
    exitCode: failed?.code ?? judgement.exitCode,
    verdictText: judgement.summary,
    reasons: judgement.reasons,
    ending: broken !== undefined && broken !== null ? 'broken' : done?.stopped ? 'stopped' : 'complete',
    ...(outcome.hands.length > 0 ? { hands: outcome.hands } : {}),
    requirements: (done?.requirements ?? []).map((result) => runRequirement(result, step)),
    simulated,
    planned: plan.ticks * step,
    realTimeFactor: done && done.wall > 0 ? simulated / done.wall : 0,
    timing: {
      ...timing,
      measured: live,
      collections: done?.collections ?? 0,
      heapGrowth: done && ticks > 0 ? done.heapGrowth / ticks : 0,
    },
    startUp: { build: 0, warmUp: 0, ...ready?.startUp, total: outcome.startUp },
    ...(live && done ? { code: done.code } : {}),
    scheduling: { policy: ready?.policy ?? 'unknown', words: ready?.scheduling ?? [] },
    processor: { loop: done?.processor ?? 0, all: outcome.processor },
    stages: done?.stages ?? [],
    peaks: done?.peaks ?? {},
    settings: Object.fromEntries(
      spec.watched.filter((input) => input.unit === 'Pa').map((input) => [input.path, pressureSettings(input)]),
    ),
    warnings: done?.warnings ?? [],
    ledger: {
      energyResidual: done?.ledger.energyResidual ?? 0,
      oilResidual: done?.ledger.oilResidual ?? 0,
      turnover: done?.ledger.turnover ?? 0,
      energyBound: budgets.energyResidual,
      oilBound: budgets.oilResidual,
    },
    energies,
    energyParts: done?.energy ?? [],
    drive: done?.drive ? driveQuality(spec, done.drive.wanted, done.drive.had) : null,
    fuel:
      engine === undefined || !done
        ? null
        : {
            mass: value(`${engine.name}.fuelMass`),
            energy: value(`${engine.name}.fuelMass`) * (engine.parameters['heatingValue'] ?? 0),
          },
    solver: { refined: done?.refined ?? 0, replaced: done?.replaced ?? 0 },
    links,
    messages: spec.map.messages.map(({ link, name, direction, every }) => ({
      link,
      message: name,
      direction,
      count: value(`${name}.${direction}`),
      due: every > 0 && done ? Math.round(ticks / every) : null,
      lost: value(`${name}.lost`),
      late: value(`${name}.late`),
      malformed: value(`${name}.outOfRange`),
      timeOuts: value(`${name}.timeOuts`),
    })),
    waived: plan.script.waived ?? {},
    faults: plan.script.steps
      .slice(0, value('scenario.step'))
      .filter((one) => one.action === 'fault')
      .map((one) => ({
        path: one.target,
        value: one.value,
        unit: spec.signals.find((info) => info.path === one.target)?.unit ?? '1',
        step: one.name,
      })),
    stateHash: done?.hash ?? '',
    recording: outcome.recording ?? null,
    rowsLost: done?.dropped ?? 0,
  };
}

/** What the scenario wanted and did not come to pass: then the run shows something else than it says. */
function scenarioTrouble({ plan, done }: RunOutcome, value: (path: string) => number): string[] {
  const trouble: string[] = [];
  const left = value('scenario.timeOuts');
  if (left > 0) trouble.push(`${left} step${left === 1 ? '' : 's'} of the scenario did not come to pass in time`);
  const missing = plan.script.steps.length - value('scenario.step');
  const whole =
    done !== undefined &&
    !done.stopped &&
    done.failure === null &&
    done.ticks >= plan.script.ticks &&
    plan.script.ticks > 0;
  if (whole && missing > 0)
    trouble.push(`the scenario ended before ${missing === 1 ? 'its last step' : `its last ${missing} steps`} had come`);
  return trouble;
}

/** As the summary carries it: what JSON has no number for is null. */
export function runRequirement(result: RequirementResult, step: number): RunRequirement {
  const { requirement, verdict, margin, unit, tick, triggers, open } = result;
  return {
    id: requirement.id,
    text: requirement.text,
    severity: requirement.severity,
    verdict,
    margin: Number.isFinite(margin) ? margin : null,
    unit,
    at: tick < 0 ? null : Number((tick * step).toFixed(9)),
    triggers: triggers ?? null,
    open,
    optional: requirement.exercise === 'optional',
  };
}

function measured(name: string, value: number, bound: number, unit: string): Measured {
  return { name, value, bound, unit };
}

function linkOf(
  spec: RunOutcome['plan']['spec'],
  { name, kind }: RunOutcome['plan']['spec']['map']['links'][number],
  value: (path: string) => number,
): RunSummary['links'][number] {
  const own = spec.map.messages.filter((message) => message.link === name);
  const sum = (direction: string, count: string) =>
    own
      .filter((message) => message.direction === direction)
      .reduce((total, message) => total + value(`${message.name}.${count}`), 0);
  const replies = value(`${name}.replies`);
  return {
    name,
    received: sum('received', 'received'),
    sent: sum('sent', 'sent'),
    lost: sum('received', 'lost'),
    late: sum('received', 'late'),
    malformed: ['malformed', 'wrongChecksum', 'wrongMap', 'wrongLength'].reduce(
      (total, count) => total + value(`${name}.${count}`),
      0,
    ),
    timeOuts: sum('received', 'timeOuts'),
    // a CAN frame does not say which tick it answers
    oneStepShare: kind === 'udp' && replies > 0 ? value(`${name}.oneStepShare`) : null,
  };
}
