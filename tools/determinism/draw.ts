import type { Assembly } from '../../configs/assemble.js';
import type { BenchSpec } from '../../configs/bench-spec.js';
import type { SignalInfo } from '../../runtime/contract.js';
import { HAND, type HandMessage } from '../../runtime/hand-wire.js';
import type { Formula } from '../../runtime/judge/formula.js';
import { emptyScript, type ScriptSpec, type ScriptStep, type ScriptTrace } from '../../runtime/script.js';

/** Whole numbers below a bound, from a seed: a 32-bit counter through the finaliser of MurmurHash3 (Appleby, public domain). */
export type Choose = (below: number) => number;

export function chooser(seed: number): Choose {
  let state = seed >>> 0;
  return (below) => {
    state = (state + 0x9e3779b9) >>> 0;
    let z = state;
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b);
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35);
    return ((z ^ (z >>> 16)) >>> 0) % below;
  };
}

/** Hands by tick, in the order in which they come. */
export type DrawnHands = ReadonlyMap<number, readonly HandMessage[]>;

/** Signals that a script may set: commands, supply and key, and what the instruments ahead of the plant say. */
function settable(spec: BenchSpec): readonly SignalInfo[] {
  const said = new Set(
    spec.instruments
      .filter((one) => one.kind.stage === 'before')
      .flatMap((one) => Object.keys(one.kind.outputs).map((output) => `${one.name}.${output}`)),
  );
  return spec.signals.filter(
    (info) =>
      info.group === 'command' || said.has(info.path) || info.path === 'life.key' || info.path === 'life.supply',
  );
}

/** Mostly within the declared range, with its ends; now and then far outside. */
function valueFor(info: SignalInfo, choose: Choose): number {
  if (choose(40) === 0) return [1e9, -1e9, 1e-12, -0][choose(4)]!;
  const least = info.least ?? -1;
  const most = info.most ?? (info.least === undefined ? 1 : info.least + 1);
  const share = [0, 1, choose(1001) / 1000, choose(1001) / 1000, choose(1001) / 1000][choose(5)]!;
  return least + share * (most - least);
}

/** A random scenario of `ticks` ticks over a bench: a drive, traces, steps with times, waits and conditions, faults. */
export function drawScript(spec: BenchSpec, choose: Choose, ticks: number): ScriptSpec {
  const targets = settable(spec);
  const faults = targets.filter((info) => info.withoutFault !== undefined);
  const plain = targets.filter((info) => info.withoutFault === undefined);
  const pick = <T>(list: readonly T[]): T => list[choose(list.length)]!;
  const drive: (readonly [number, number])[] = [];
  for (let at = 0; at < ticks; at += 1 + choose(Math.max(1, ticks >> 1))) drive.push([at, choose(2000) / 100]);
  const taken = new Set<string>();
  const traces: ScriptTrace[] = [];
  for (let i = choose(3); i > 0 && plain.length > 0; i -= 1) {
    const target = pick(plain);
    if (taken.has(target.path)) continue;
    taken.add(target.path);
    const points: (readonly [number, number])[] = [];
    for (let at = choose(50); at < ticks; at += 1 + choose(Math.max(1, ticks >> 2)))
      points.push([at, valueFor(target, choose)]);
    if (points.length > 0) traces.push({ target: target.path, points, between: choose(2) === 0 ? 'linear' : 'hold' });
  }
  const numbers = spec.signals.filter((info) => info.group === 'state' || info.group === 'reading');
  const conditions: Formula[] = [];
  const steps: ScriptStep[] = [];
  let at = 0;
  for (let i = 2 + choose(24); i > 0; i -= 1) {
    at += choose(Math.max(2, ticks >> 3));
    const timed = { at, name: `step ${steps.length + 1}` };
    const kind = choose(10);
    const trigger: Partial<ScriptStep> =
      kind < 2
        ? { at: 0, wait: choose(100) }
        : kind < 4 && numbers.length > 0
          ? { at: 0, condition: conditions.length, lasting: choose(20), timeOut: 1 + choose(200) }
          : {};
    if (trigger.condition !== undefined) {
      const info = pick(numbers);
      conditions.push({
        is: 'compare',
        left: { is: 'signal', path: info.path },
        relation: pick(['<', '<=', '>', '>='] as const),
        right: { is: 'number', value: valueFor(info, choose) },
        unit: info.unit,
      });
    }
    const fault = faults.length > 0 && choose(3) === 0;
    const info = fault ? pick(faults) : pick(plain.length > 0 ? plain : targets);
    const action = fault
      ? pick(['fault', 'fault', 'clear'] as const)
      : pick(['set', 'set', 'ramp', 'ramp', 'hold', 'release', 'note'] as const);
    steps.push({
      ...timed,
      ...trigger,
      action,
      target: action === 'note' ? '' : info.path,
      value: action === 'clear' ? info.withoutFault! : valueFor(info, choose),
      over: action === 'ramp' || (action === 'fault' && choose(2) === 0) ? 1 + choose(300) : 0,
    });
  }
  return {
    ...emptyScript,
    name: 'drawn',
    ticks,
    drive,
    preview: choose(500),
    traces,
    steps,
    ...(conditions.length === 0 ? {} : { conditions }),
  };
}

/** Hands on anything at random ticks of the pre-roll and the run: holding, letting go, dead men, the timeline, notes. */
export function drawHands(assembly: Assembly, choose: Choose, ticks: number): DrawnHands {
  const byTick = new Map<number, HandMessage[]>();
  if (choose(2) === 0) return byTick;
  const infos = new Map(assembly.spec.signals.map((info) => [info.path, info]));
  for (let i = 1 + choose(20); i > 0; i -= 1) {
    const target = choose(assembly.handTargets.length);
    const { path, unit } = assembly.handTargets[target]!;
    const kind = [HAND.set, HAND.set, HAND.set, HAND.release, HAND.scenario, HAND.acknowledge, HAND.note, 77][
      choose(8)
    ]!;
    const tick = assembly.firstTick + choose(ticks - assembly.firstTick);
    const hand: HandMessage = {
      kind,
      request: i,
      // holding the timeline makes a run longer; ending it shorter
      target: kind === HAND.scenario ? 1 + choose(2) : choose(20) === 0 ? -1 : target,
      deadMan: choose(2) * choose(300),
      value: valueFor(infos.get(path) ?? { path, unit, about: '', group: 'command' }, choose),
      text: { who: 'a drawn hand', address: '', said: `number ${i}` },
    };
    byTick.set(tick, [...(byTick.get(tick) ?? []), hand]);
  }
  return byTick;
}
