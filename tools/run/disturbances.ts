import type { BenchSpec } from '../../configs/bench-spec.js';
import { parseQuantity } from '../../configs/quantity.js';
import { toTicks } from '../../configs/ticks.js';
import { BuildError } from '../../runtime/contract.js';
import type { ScriptTrace } from '../../runtime/script.js';
import { nearest } from '../../runtime/signals.js';

const form = /^([A-Za-z][\w.]*)=(.+)@([^@]+?)(?:\.\.([^@]+))?$/;

/**
 * `bus.sentDrop=0.3@5s..8s` of the command line as traces of the script: the command has the value from the first time to
 * the second, or to the end, and before and after it what it has without a fault. Throws BuildError.
 */
export function disturbancesOf(texts: readonly string[], spec: BenchSpec): ScriptTrace[] {
  const commands = spec.signals.filter(({ group }) => group === 'command');
  const byTarget = new Map<
    string,
    { rest: number; spans: { from: number; to: number; value: number; said: string }[] }
  >();
  for (const said of texts) {
    const refuse = (what: string, remedy: string): BuildError =>
      new BuildError([{ path: '--disturb', what, value: said, remedy }]);
    const match = form.exec(said.trim());
    if (!match) throw refuse('not a disturbance', "write it as in 'bus.sentDrop=0.3@5s..8s', with or without an end");
    const [, target, text, from, to] = match as unknown as [string, string, string, string, string?];
    const info = commands.find(({ path }) => path === target);
    if (!info) {
      const near = nearest(
        target,
        commands.map(({ path }) => path),
        3,
      );
      throw refuse(`no command ${target}`, near.length > 0 ? `did you mean ${near.join(' or ')}?` : 'see list signals');
    }
    const read = (words: string, unit: string, difference = false): number => {
      try {
        const spaced = words
          .trim()
          .replace(/^([-+.\deE]+)\s*([A-Za-z%].*)?$/, (_all, number, name) =>
            name === undefined ? number : `${number} ${name}`,
          );
        return parseQuantity(spaced, { unit, difference }).value;
      } catch (error) {
        throw refuse((error as Error).message, 'give a number with its unit');
      }
    };
    const value = read(text, info.unit, info.difference ?? false);
    if (!(value >= (info.least ?? -Infinity) && value <= (info.most ?? Infinity)))
      throw refuse(`${value} is outside ${info.least} .. ${info.most} ${info.unit}`, 'give a value inside');
    const ticks = (words: string): number => {
      const found = toTicks(read(words, 's'), spec.step);
      if (found === undefined || found < 0)
        throw refuse('a time that is no whole number of ticks', 'round it to the step');
      return found;
    };
    const span = { from: ticks(from), to: to === undefined ? Infinity : ticks(to), value, said };
    if (span.to <= span.from) throw refuse('it ends before it begins', 'turn the times round');
    const known = byTarget.get(target) ?? { rest: info.withoutFault ?? 0, spans: [] };
    if (known.spans.some((other) => other.from < span.to && span.from < other.to))
      throw refuse('two disturbances of one command at the same time', 'let one end before the other begins');
    known.spans.push(span);
    byTarget.set(target, known);
  }
  return [...byTarget].map(([target, { rest, spans }]) => {
    spans.sort((a, b) => a.from - b.from);
    const points: [number, number][] = spans[0]!.from > 0 ? [[0, rest]] : [];
    spans.forEach(({ from, to, value }, i) => {
      points.push([from, value]);
      if (to !== Infinity && spans[i + 1]?.from !== to) points.push([to, rest]);
    });
    return { target, points, between: 'hold' };
  });
}
