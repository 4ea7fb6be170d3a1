import type { Problems } from './problems.js';
import { shown } from './quantity.js';
import { suggestion } from './section.js';
import type { Entry, Mapping, Tree } from './source.js';

/** Which of the runs that a scenario file describes. */
export interface ScenarioChoice {
  /** One of its `cases`. */
  readonly case?: string | undefined;
  /** Parameters by hand, over those of the case. */
  readonly set?: Readonly<Record<string, string>> | undefined;
}

export interface Parameterised {
  readonly root: Mapping;
  /** As chosen. */
  readonly values: Readonly<Record<string, string>>;
}

const name = /^[A-Za-z][A-Za-z0-9]*$/;

/**
 * Puts the parameters of a scenario in place: `parameters:` names them with what they usually are, `cases:` has other
 * values by case, `set` others still. Wherever a value of the file says `$name` or `${name}` the parameter's text stands
 * for it; positions stay those of the place where it is used.
 */
export function chooseParameters(root: Mapping, choice: ScenarioChoice, problems: Problems): Parameterised {
  const values: Record<string, string> = {};
  take(root.entries.get('parameters'), 'parameters', values, undefined, problems);
  const declared = new Set(Object.keys(values));
  const cases = caseEntries(root);
  for (const [key, entry] of cases) {
    const own: Record<string, string> = {};
    take(entry, `cases.${key}`, own, declared, problems);
    if (key === choice.case) Object.assign(values, own);
  }
  if (choice.case !== undefined && !cases.has(choice.case))
    problems.add(root.where, 'cases', 'no such case', suggestion(choice.case, cases.keys()), {
      value: shown(choice.case),
    });
  for (const [key, value] of Object.entries(choice.set ?? {})) {
    if (declared.has(key)) values[key] = value;
    else
      problems.add(root.where, `--set ${key}`, 'no such parameter', suggestion(key, declared), { value: shown(value) });
  }
  const used = new Set<string>();
  const entries = new Map<string, Entry>();
  for (const [key, entry] of root.entries) {
    if (key === 'parameters' || key === 'cases') continue;
    entries.set(key, { where: entry.where, value: replaced(entry.value, key, values, used, problems) });
  }
  for (const key of declared)
    if (!used.has(key))
      problems.add(
        root.entries.get('parameters')!.where,
        `parameters.${key}`,
        'nothing uses it',
        `write $${key} where it belongs, or leave it away`,
      );
  return { root: { ...root, entries }, values };
}

/** Names of the cases, in the order of the file; empty without any. */
export function caseNames(root: Mapping): string[] {
  return [...caseEntries(root).keys()];
}

function caseEntries(root: Mapping): Map<string, Entry> {
  const value = root.entries.get('cases')?.value;
  return value?.kind === 'mapping' ? value.entries : new Map();
}

function take(
  entry: Entry | undefined,
  path: string,
  into: Record<string, string>,
  declared: ReadonlySet<string> | undefined,
  problems: Problems,
): void {
  if (!entry) return;
  if (entry.value.kind !== 'mapping') {
    problems.add(entry.where, path, 'not a list of names and values', 'write name: value pairs below it');
    return;
  }
  for (const [key, { value, where }] of entry.value.entries) {
    if (value.kind !== 'scalar' || value.value === null)
      problems.add(where, `${path}.${key}`, 'no single value', 'write one value');
    else if (!name.test(key))
      problems.add(where, `${path}.${key}`, 'not a name', 'use letters and digits', { value: shown(key) });
    else if (declared && !declared.has(key))
      problems.add(where, `${path}.${key}`, 'no such parameter', suggestion(key, declared));
    else into[key] = value.text;
  }
}

function replaced(
  tree: Tree,
  path: string,
  values: Readonly<Record<string, string>>,
  used: Set<string>,
  problems: Problems,
): Tree {
  if (tree.kind === 'list')
    return { ...tree, items: tree.items.map((item, i) => replaced(item, `${path}[${i}]`, values, used, problems)) };
  if (tree.kind === 'mapping') {
    const entries = new Map<string, Entry>();
    for (const [key, entry] of tree.entries)
      entries.set(key, { where: entry.where, value: replaced(entry.value, `${path}.${key}`, values, used, problems) });
    return { ...tree, entries };
  }
  if (!tree.text.includes('$')) return tree;
  const text = tree.text.replace(
    /\$(?:\{([A-Za-z0-9]+)\}|([A-Za-z][A-Za-z0-9]*))/g,
    (whole, braced?: string, plain?: string) => {
      const key = braced ?? plain ?? '';
      if (!Object.hasOwn(values, key)) {
        problems.add(tree.where, path, 'no such parameter', suggestion(key, Object.keys(values)), {
          value: shown(whole),
        });
        return whole;
      }
      used.add(key);
      return values[key]!;
    },
  );
  return { kind: 'scalar', value: text, text, where: tree.where };
}
