import type { ParameterDeclaration, Position } from '../runtime/contract.js';
import type { Ambient } from './bench-spec.js';
import { parseQuantity, shown, splitConditions } from './quantity.js';
import type { Section } from './section.js';
import type { Scalar } from './source.js';
import { formatQuantity, tradeUnit } from './units.js';

export type Declarations = Readonly<Record<string, ParameterDeclaration>>;

export interface ReadParameters {
  /** SI, complete but for those with a problem. */
  readonly values: Record<string, number>;
  /** False when one is missing or wrong: then nothing further can be said about the element. */
  readonly complete: boolean;
  /** Where each stands that the file gives. */
  readonly places: ReadonlyMap<string, Position>;
  /** Keys that may be written, for suggestions. */
  readonly keys: readonly string[];
}

/**
 * Reads the parameters that a declaration names. Three short forms: `precharge: 150 bar(g) at 20 degC` also gives the
 * parameter that says at what (`prechargeTemperature`); `range: 0 .. 400 bar(g)` gives `least` and `most` (and
 * `speedRange` gives `leastSpeed` and `mostSpeed`); a choice is given by its name. Ambient values stand in for
 * parameters named `ambientTemperature` and `ambientPressure` that the file leaves out.
 */
export function readParameters(section: Section, declared: Declarations, ambient?: Ambient): ReadParameters {
  const values: Record<string, number> = {};
  const places = new Map<string, Position>();
  const ranges = rangeKeys(declared);
  const attempted = new Set<string>();
  const before = section.problems.count;

  for (const [key, [least, most]] of ranges) {
    if (!section.has(key) || Object.hasOwn(declared, key)) continue;
    const declaration = declared[least]!;
    const range = section.range(key, { unit: declaration.unit, difference: declaration.difference });
    attempted.add(least).add(most);
    if (!range) continue;
    values[least] = range.least;
    values[most] = range.most;
    places.set(least, section.whereIs(key)).set(most, section.whereIs(key));
  }
  for (const [name, declaration] of Object.entries(declared)) {
    if (section.has(name)) {
      if (Object.hasOwn(values, name)) section.fail(name, 'said twice', 'keep the range or the single value');
      places.set(name, section.whereIs(name));
      readOne(section, name, declaration, declared, values, places);
    }
  }
  for (const [name, declaration] of Object.entries(declared)) {
    if (Object.hasOwn(values, name) || section.has(name) || attempted.has(name)) continue;
    const given = declaration.default ?? ambientValue(name, declaration, ambient);
    if (given !== undefined) values[name] = given;
    else
      section.fail(
        name,
        'missing',
        `add ${name}: ${example(name, declaration)} (${declaration.about})`,
        {},
        section.where,
      );
  }
  for (const key of ranges.keys()) section.skip(key);
  return {
    values,
    complete: section.problems.count === before,
    places,
    keys: [...Object.keys(declared), ...ranges.keys()],
  };
}

function readOne(
  section: Section,
  name: string,
  declaration: ParameterDeclaration,
  declared: Declarations,
  values: Record<string, number>,
  places: Map<string, Position>,
): void {
  if (declaration.choices) {
    const choice = section.choice(name, declaration.choices);
    if (choice !== undefined) values[name] = declaration.choices.indexOf(choice);
    return;
  }
  const entry = section.entry(name)!;
  if (entry.value.kind !== 'scalar' || entry.value.value === null) {
    section.quantity(name, declaration);
    return;
  }
  const scalar: Scalar = entry.value;
  const { main, conditions } = splitConditions(scalar.text);
  const parsed = section.quantityIn(scalar, declaration, name, main);
  if (parsed) {
    values[name] = parsed.value;
    remarkUnusual(section, name, declaration, parsed.value, main);
  }
  for (const condition of conditions) {
    const target = conditionTarget(name, condition, declared);
    if (target === undefined) {
      section.fail(name, 'a condition that this parameter does not take', `leave away: at ${condition}`, {
        value: shown(scalar.text),
      });
      continue;
    }
    if (section.has(target)) {
      section.fail(name, `${target} said twice`, `keep ${target}: or what stands behind at`, {
        value: shown(scalar.text),
      });
      continue;
    }
    const value = section.attempt(scalar, section.inner(name), () => parseQuantity(condition, declared[target]!));
    // Also when wrong: then it is not missing on top.
    values[target] = value?.value ?? Number.NaN;
    places.set(target, entry.where);
  }
}

/** The parameter that `at ...` behind `name` sets: the one whose name begins with `name` and whose unit fits. */
function conditionTarget(name: string, condition: string, declared: Declarations): string | undefined {
  const candidates = Object.keys(declared).filter((other) => other !== name && other.startsWith(name));
  if (candidates.length === 1) return candidates[0];
  return candidates.find((other) => {
    try {
      parseQuantity(condition, { unit: declared[other]!.unit, difference: declared[other]!.difference });
      return true;
    } catch {
      return false;
    }
  });
}

/** `range` for least and most, `speedRange` for leastSpeed and mostSpeed. */
export function rangeKeys(declared: Declarations): Map<string, readonly [string, string]> {
  const found = new Map<string, readonly [string, string]>();
  for (const name of Object.keys(declared)) {
    if (!name.startsWith('least')) continue;
    const rest = name.slice('least'.length);
    const most = `most${rest}`;
    if (!Object.hasOwn(declared, most)) continue;
    if (declared[name]!.unit !== declared[most]!.unit) continue;
    found.set(rest === '' ? 'range' : `${rest.charAt(0).toLowerCase()}${rest.slice(1)}Range`, [name, most]);
  }
  return found;
}

function ambientValue(
  name: string,
  declaration: ParameterDeclaration,
  ambient: Ambient | undefined,
): number | undefined {
  if (!ambient) return undefined;
  if (name === 'ambientPressure') return ambient.pressure;
  if (name === 'ambientTemperature') return ambient.temperature;
  // A start temperature that nobody states is that of the surroundings.
  if (declaration.unit === 'K' && !declaration.difference && /[tT]emperature$/.test(name)) return ambient.temperature;
  return undefined;
}

function remarkUnusual(
  section: Section,
  name: string,
  declaration: ParameterDeclaration,
  value: number,
  text: string,
): void {
  const usual = declaration.usual;
  if (!usual || (value >= usual[0] && value <= usual[1])) return;
  const unit = tradeUnit(declaration.unit, declaration.difference);
  section.problems.remark(
    section.whereIs(name),
    section.inner(name),
    'unusual value',
    'check it against the data sheet',
    {
      value: shown(text),
      bound: `usually ${formatQuantity(usual[0], unit)} .. ${formatQuantity(usual[1], unit)}`,
    },
  );
}

/** How a value of this parameter could look, for messages. */
export function example(_name: string, declaration: ParameterDeclaration): string {
  if (declaration.choices) return declaration.choices[0] ?? '';
  const unit = tradeUnit(declaration.unit, declaration.difference);
  const usual = declaration.usual
    ? Math.sqrt(Math.max(0, declaration.usual[0]) * Math.max(0, declaration.usual[1])) || declaration.usual[1]
    : undefined;
  if (usual !== undefined) return formatQuantity(usual, unit, 2);
  return `a number${unit === '1' ? '' : ` in ${unit}`}`;
}
