import { BuildError, type Position, type SignalInfo } from '../runtime/contract.js';
import { type Requirement, severities } from '../runtime/judge/formula.js';
import { nearest } from '../runtime/signals.js';
import { Problems } from './problems.js';
import { parseFormula, type RequirementContext } from './requirement-parser.js';
import { Section } from './section.js';
import { parseText, type Scalar } from './source.js';

const outcomes = ['undecided', 'pass', 'fail'] as const;
const exercises = ['required', 'optional'] as const;

/**
 * Reads the requirements of a bench or scenario, in the order of the file:
 *
 *   requirements:
 *     HP-1: always highLine.pressure < 345 bar(g)
 *     BR-2:
 *       text: The truck stops.
 *       holds: whenever driver.brakePedal > 50 % then vehicle.speed falls below 1 km/h within 8 s and stays for 2 s
 *       severity: critical            # critical, major (unless said otherwise), minor, observation
 *       source: braking specification 3.1
 *       link: https://example.org/spec#3.1
 *       openAtEnd: fail               # when the run ended before it was decided: undecided, pass, fail
 *       exercise: optional            # whether a run may pass in which its trigger never came: required, optional
 *
 * Adds what is wrong to the section's problems, and leaves out what could not be read.
 */
export function readRequirements(section: Section, context: RequirementContext): Requirement[] {
  const found: Requirement[] = [];
  for (const id of section.keys()) {
    const entry = section.entry(id)!;
    const path = section.inner(id);
    if (!/^[A-Za-z0-9][A-Za-z0-9 ._-]{0,60}$/.test(id)) {
      section.problems.add(
        entry.where,
        path,
        'not an id',
        'use letters, digits, points, dashes and spaces, at most 61',
        { value: id },
      );
      continue;
    }
    if (entry.value.kind === 'scalar' && entry.value.value !== null) {
      const said = entry.value;
      const formula = parseFormula(said.text, context, section.problems, path, (offset) => positionIn(said, offset));
      if (formula) found.push({ id, text: said.text.trim(), formula, severity: 'major' });
      continue;
    }
    const inner = section.section(id);
    if (!inner) continue;
    const requirement = readRequirement(id, inner, context);
    if (requirement) found.push(requirement);
  }
  return found;
}

function readRequirement(id: string, section: Section, context: RequirementContext): Requirement | undefined {
  const holds = section.placed('holds', { required: true }, 'always highLine.pressure < 345 bar(g)');
  const text = section.text('text');
  const severity = section.choice('severity', severities);
  const source = section.text('source');
  const link = section.text('link');
  const openAtEnd = section.choice('openAtEnd', outcomes);
  const exercise = section.choice('exercise', exercises);
  section.finish();
  if (!holds) return undefined;
  const tree = section.tree.entries.get('holds')!.value as Scalar;
  const formula = parseFormula(holds.text, context, section.problems, section.inner('holds'), (offset) =>
    positionIn(tree, offset),
  );
  if (!formula) return undefined;
  return {
    id,
    text: text ?? holds.text.trim(),
    formula,
    severity: severity ?? 'major',
    ...(source === undefined ? {} : { source }),
    ...(link === undefined ? {} : { link }),
    ...(openAtEnd === undefined ? {} : { openAtEnd }),
    ...(exercise === undefined ? {} : { exercise }),
  };
}

/**
 * Reads a text with `requirements:` at its top, for tools and tests. Throws BuildError with all that is wrong and nothing else.
 */
export function parseRequirements(
  text: string,
  file: string,
  signals: readonly SignalInfo[],
  step: number,
): Requirement[] {
  const problems = new Problems();
  const tree = parseText(text, file, problems);
  let found: Requirement[] = [];
  if (tree) {
    const top = new Section(tree, '', problems);
    const section = top.section('requirements', { required: true });
    top.finish();
    if (section) found = readRequirements(section, { signals: lookup(signals), step });
  }
  problems.throwIfAny();
  return found;
}

/** Reads one requirement's text. Throws BuildError. */
export function parseRequirement(id: string, text: string, signals: readonly SignalInfo[], step: number): Requirement {
  const problems = new Problems();
  const formula = parseFormula(text, { signals: lookup(signals), step }, problems, id);
  problems.throwIfAny();
  if (!formula) throw new BuildError([{ path: id, what: 'not a requirement', remedy: 'see the list of forms' }]);
  return { id, text, formula, severity: 'major' };
}

/** Signals by path for a requirement's text. */
export function lookup(signals: readonly SignalInfo[]): RequirementContext['signals'] {
  const byPath = new Map(signals.map((info) => [info.path, info]));
  return { find: (path) => byPath.get(path), nearest: (path) => nearest(path, byPath.keys(), 3) };
}

/** Where character `offset` of a value's text stands in the file: quotes, folds and escapes are walked over. */
export function positionIn(scalar: Scalar, offset: number): Position {
  const { where, text } = scalar;
  const raw = scalar.raw ?? text;
  let at = raw[0] === '|' || raw[0] === '>' ? raw.indexOf('\n') + 1 : raw[0] === text[0] ? 0 : 1;
  const end = Math.min(offset, text.length);
  for (let i = 0; i <= end; i += 1) {
    const character = text[i];
    if (character !== undefined && !/\s/.test(character)) {
      const next = raw.indexOf(character, at);
      if (next < 0) break;
      at = i < end ? next + 1 : next;
    } else if (i === end && character === undefined) {
      break;
    }
  }
  const before = raw.slice(0, at);
  const line = before.split('\n').length - 1;
  return {
    file: where.file,
    line: where.line + line,
    column: line === 0 ? where.column + at : before.length - before.lastIndexOf('\n'),
  };
}
