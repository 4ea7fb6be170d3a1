import type { Position, SignalInfo } from '../runtime/contract.js';
import { type Formula, horizon } from '../runtime/judge/formula.js';
import type { ScriptStep } from '../runtime/script.js';
import { parseFormula } from './requirement-parser.js';
import { lookup, positionIn } from './requirements.js';
import { type Placed, type Section, suggestion } from './section.js';
import type { Scalar, Tree } from './source.js';
import { checkedTicks } from './ticks.js';

const actions = ['set', 'ramp', 'hold', 'release', 'fault', 'clear'] as const;
const triggers = ['at', 'atDistance', 'when', 'wait'] as const;
/** Most steps after repetitions are written out. */
const most = 20_000;

/** What reading a step needs of the scenario's reader. */
export interface StepReaderContext {
  readonly step: number;
  readonly signals: readonly SignalInfo[];
  command(section: Section, key: string, said: Placed | undefined): SignalInfo | undefined;
  value(section: Section, value: Tree, target: SignalInfo, key: string): number | undefined;
  example(target: SignalInfo): string;
}

export interface ReadSteps {
  readonly steps: ScriptStep[];
  readonly conditions: Formula[];
}

/**
 * Reads the timeline, one step after another:
 *
 *   - { at: 12 s, set: body.payload, to: 900 kg }
 *   - { when: body.velocity > 40 km/h, for: 500 ms, within: 20 s, fault: highPressureSensor.stuck }
 *   - { wait: 2 s, clear: highPressureSensor.stuck }
 *   - { atDistance: 300 m, ramp: body.grade, to: 5 %, over: 2 s, note: the ramp begins }
 *   - { repeat: 3, steps: [ ... ] }
 *
 * A step is looked at when the one before it is done. A file in which all steps have a time may have them in any order.
 */
export class StepReader {
  private readonly conditions: Formula[] = [];
  private readonly known = new Map<string, number>();
  private count = 0;

  constructor(private readonly context: StepReaderContext) {}

  read(top: Section): ReadSteps {
    const steps = this.list(top, 'steps', 0);
    const timed = steps.every((step) => step.wait === undefined && step.condition === undefined);
    // Steps of the same time stay in the order of the file.
    if (timed) steps.sort((a, b) => a.at - b.at);
    else this.checkOrder(top, steps);
    return { steps, conditions: this.conditions };
  }

  private checkOrder(top: Section, steps: readonly ScriptStep[]): void {
    let latest = 0;
    for (const step of steps) {
      if (step.at > 0 && step.at < latest)
        top.fail(
          'steps',
          `step \`${step.name}\` stands behind a later one`,
          'steps that wait for something come one after another: put the times in order',
        );
      latest = Math.max(latest, step.at);
    }
  }

  private list(section: Section, key: string, depth: number): ScriptStep[] {
    const steps: ScriptStep[] = [];
    for (const [i, item] of (section.list(key)?.items ?? []).entries()) {
      const one = section.sectionIn(item, `${key}[${i}]`);
      if (!one) continue;
      if (one.has('repeat')) steps.push(...this.repeated(one, depth));
      else {
        const step = this.step(one);
        if (step) steps.push(step);
      }
      if ((this.count += 1) > most) {
        one.fail('', `more than ${most} steps`, 'repeat less often');
        break;
      }
    }
    return steps;
  }

  private repeated(section: Section, depth: number): ScriptStep[] {
    const times = section.whole('repeat', { least: 1, most: 1000 });
    if (depth >= 3) {
      section.fail('repeat', 'nested too deep', 'nest at most three repetitions');
      return [];
    }
    const steps = this.list(section, 'steps', depth + 1);
    if (!section.has('steps')) section.fail('steps', 'missing', 'add steps: and what to repeat', {}, section.where);
    section.finish();
    if ((times ?? 1) > 1 && steps.some((step) => step.at > 0)) {
      section.fail('steps', 'a time of its own inside a repetition', 'write wait: or when: instead of at:');
      return [];
    }
    this.count += ((times ?? 1) - 1) * steps.length;
    if (this.count > most) return steps;
    return Array.from({ length: times ?? 1 }, (_, round) =>
      steps.map((step) => ({ ...step, name: `${step.name} (${round + 1} of ${times})` })),
    ).flat();
  }

  /** A trigger, and one action with or without a note; or a note alone. */
  private step(section: Section): ScriptStep | undefined {
    const trigger = this.trigger(section);
    const note = section.text('note');
    const named = actions.filter((action) => section.has(action));
    const idle = named.length === 0 && !section.has('note');
    if (named.length > 1 || (idle && !section.has('wait') && !section.has('when'))) {
      const known = [...triggers, 'for', 'within', 'to', 'over', 'note', ...actions];
      const odd = section.keys().find((key) => !known.includes(key));
      const remedy =
        odd === undefined ? `write one of ${actions.join(', ')} or note` : suggestion(odd, [...actions, 'note']);
      const what = named.length === 0 ? 'a step that does nothing' : `a step that does ${named.length} things`;
      return section.fail('', what, remedy, odd === undefined ? {} : { value: odd });
    }
    const action = named[0];
    if (action === undefined) {
      section.finish();
      const name = note ?? (section.has('when') ? `wait for ${section.peek('when')}` : `wait ${section.peek('wait')}`);
      return trigger && { ...trigger, name, action: 'note', target: '', value: 0, over: 0 };
    }
    const target = this.context.command(section, action, section.placed(action, { required: true }, 'element.command'));
    const takesValue = action === 'set' || action === 'ramp' || action === 'fault';
    const entry = takesValue ? section.entry('to') : undefined;
    const fault = target?.withoutFault;
    if (target && fault === undefined && (action === 'fault' || action === 'clear'))
      section.fail(action, `${target.path} is no fault`, 'see `oilspring list faults BENCH`, or write set:');
    // A switch is thrown without saying to what.
    const thrown =
      action === 'fault' &&
      target?.unit === '1' &&
      target.least === 0 &&
      target.most === 1 &&
      fault === 0 &&
      target.about.startsWith('1:');
    if (takesValue && !entry && !thrown)
      section.fail(
        'to',
        'missing',
        `add to: ${target ? this.context.example(target) : 'and a value'}`,
        {},
        section.where,
      );
    const value = entry && target ? this.context.value(section, entry.value, target, 'to') : thrown ? 1 : (fault ?? 0);
    const mayRamp = action === 'ramp' || action === 'fault';
    const over = mayRamp
      ? (checkedTicks(section, 'over', this.context.step, { required: action === 'ramp', least: 1 }) ??
        (action === 'ramp' ? undefined : 0))
      : 0;
    section.finish();
    if (!trigger || !target || value === undefined || over === undefined) return undefined;
    const written = entry ? ` to ${section.peek('to')}` : '';
    const plain = action === 'hold' || action === 'release' ? 0 : value;
    return {
      ...trigger,
      name: note ?? `${action} ${target.path}${written}`,
      action,
      target: target.path,
      value: plain,
      over,
    };
  }

  private trigger(section: Section): Pick<ScriptStep, 'at' | 'wait' | 'condition' | 'lasting' | 'timeOut'> | undefined {
    const { step } = this.context;
    const named = triggers.filter((one) => section.has(one));
    if (named.length > 1) for (const key of named) section.skip(key);
    if (named.length > 1)
      return section.fail(
        named[1]!,
        `a step that comes ${named.join(' and ')}`,
        'keep one of them',
        {},
        section.whereIs(named[1]!),
      );
    if (named.length === 0)
      return section.fail(
        'at',
        'missing',
        'add at: 12 s, wait: 2 s, atDistance: 300 m or when: and a condition',
        {},
        section.where,
      );
    const before = section.problems.count;
    const timeOut = section.has('within') ? checkedTicks(section, 'within', step, { least: 1 }) : undefined;
    const lasting = section.has('for') ? checkedTicks(section, 'for', step) : undefined;
    if (named[0] === 'at' || named[0] === 'wait') {
      for (const key of ['for', 'within'])
        if (section.has(key))
          section.fail(key, 'only a step that waits for something has it', 'leave it away', {}, section.whereIs(key));
      const ticks = checkedTicks(section, named[0], step, { required: true });
      if (ticks === undefined) return undefined;
      return named[0] === 'at' ? { at: ticks } : { at: 0, wait: ticks };
    }
    const condition = named[0] === 'when' ? this.when(section) : this.atDistance(section);
    if (condition === undefined || section.problems.count > before) return undefined;
    return {
      at: 0,
      condition,
      ...(lasting === undefined ? {} : { lasting }),
      ...(timeOut === undefined ? {} : { timeOut }),
    };
  }

  private when(section: Section): number | undefined {
    const said = section.placed('when', { required: true }, 'body.velocity > 40 km/h');
    if (!said) return undefined;
    const tree = section.tree.entries.get('when')!.value as Scalar;
    return this.condition(section, 'when', said.text, (offset) => positionIn(tree, offset));
  }

  private atDistance(section: Section): number | undefined {
    const wanted = section.quantity('atDistance', { unit: 'm' }, { required: true });
    if (wanted === undefined) return undefined;
    const ways = this.context.signals.filter(
      (info) => info.group === 'state' && info.path.endsWith('.distance') && info.unit === 'm',
    );
    if (ways.length !== 1)
      return section.fail(
        'atDistance',
        `the bench has ${ways.length === 0 ? 'no' : ways.length} vehicles`,
        'write when: VEHICLE.distance > 300 m',
      );
    const where = section.whereIs('atDistance');
    return this.condition(section, 'atDistance', `${ways[0]!.path} >= ${wanted} m`, () => where);
  }

  private condition(
    section: Section,
    key: string,
    text: string,
    place: (offset: number) => Position,
  ): number | undefined {
    const formula = parseFormula(
      text,
      { signals: lookup(this.context.signals), step: this.context.step, present: true },
      section.problems,
      section.inner(key),
      place,
    );
    if (!formula) return undefined;
    if (horizon(formula) > 0)
      return section.fail(key, 'a condition that looks ahead', 'say how long it has to hold with for:');
    const once = JSON.stringify(formula);
    let number = this.known.get(once);
    if (number === undefined) {
      number = this.conditions.length;
      this.conditions.push({ is: 'happens', of: formula });
      this.known.set(once, number);
    }
    return number;
  }
}
