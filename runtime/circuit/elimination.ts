import { type Dialect, javaScript } from './emit.js';

/**
 * Sparse LU of M = c I - J without pivoting, as straight-line code, in place: the factors stand where the Jacobian's
 * values stood, with places behind them for what fills in. A value that elimination leaves as it is needs no code. The
 * order of elimination is chosen once by least fill (Markowitz 1957) on the diagonal; circuits are nearly trees, so there
 * is almost no fill.
 *
 * With M = L U, the place of (i, j) holds -L for j < i, 1/U for j = i and -U for j > i.
 */
export interface Elimination {
  /** Position in the order -> state. */
  readonly order: readonly number[];
  /** Length of J with what fills in; behind it stands the least pivot over c. */
  readonly size: number;
  readonly multiplications: number;
  /** Too large for one function. */
  readonly cut: boolean;
  /** Statements that factor c I - J; `c` is a name. J[size] gets the least pivot over c. */
  factorLines(dialect: Dialect): string[];
  /**
   * Statements that solve M x = right side into the array `into`. `right` and `after` get a state's index; `after`
   * gives further statements once its solution is there.
   */
  solveLines(
    dialect: Dialect,
    into: string,
    right: (state: number) => string,
    after?: (state: number) => readonly string[],
  ): string[];
}

export function eliminate(n: number, rows: readonly number[], columns: readonly number[]): Elimination {
  const pattern: Set<number>[] = Array.from({ length: n }, (_, i) => new Set([i]));
  rows.forEach((row, i) => {
    pattern[row]!.add(columns[i]!);
  });
  const order = chooseOrder(n, pattern);
  const position = new Array<number>(n);
  order.forEach((state, k) => {
    position[state] = k;
  });
  // from here on rows and columns in the order of elimination
  const places = new Map<number, number>();
  rows.forEach((row, i) => {
    places.set(position[row]! * n + position[columns[i]!]!, i);
  });
  const given = places.size;
  const filled = order.map((state) => new Set([...pattern[state]!].map((column) => position[column]!)));
  for (let k = 0; k < n; k += 1) {
    for (let i = k + 1; i < n; i += 1) {
      if (!filled[i]!.has(k)) continue;
      for (const j of filled[k]!) if (j > k) filled[i]!.add(j);
    }
  }
  const entries = filled.map((set) => [...set].sort((a, b) => a - b));
  entries.forEach((row, i) => {
    for (const j of row) if (!places.has(i * n + j)) places.set(i * n + j, places.size);
  });
  const size = places.size;
  const at = (i: number, j: number) => `J[${places.get(i * n + j)!}]`;
  const isGiven = (i: number, j: number) => places.get(i * n + j)! < given;
  const terms = (i: number, j: number) => entries[i]!.filter((k) => k < Math.min(i, j) && filled[k]!.has(j));
  let multiplications = n;
  entries.forEach((row, i) => {
    for (const j of row) multiplications += terms(i, j).length + (j < i ? 2 : 1);
  });
  const cut = size > largestInOnePiece;

  // values, row by row (Doolittle); every value is stored at once: V8 would keep what it needs later on its stack
  const factorLines = (dialect: Dialect): string[] => {
    const lines = [];
    for (let i = 0; i < n; i += 1) {
      for (const j of entries[i]!) {
        const sums = terms(i, j).map((k) => `${at(i, k)} * ${at(k, j)}`);
        if (j === i) {
          const minus = [...(isGiven(i, i) ? [at(i, i)] : []), ...sums].map((term) => ` - ${term}`).join('');
          lines.push(`${dialect.local}d${i} = c${minus};`, `${at(i, i)} = ${dialect.number(1)} / d${i};`);
          // pieces of a cut function see only the array
          const before = `p${i}`;
          if (i === 0) lines.push(cut ? `J[${size}] = d0;` : `${dialect.local}least0 = d0;`);
          else if (cut)
            lines.push(
              `${dialect.local}${before} = J[${size}];`,
              `J[${size}] = d${i} < ${before} ? d${i} : ${before};`,
            );
          else lines.push(`${dialect.local}least${i} = d${i} < least${i - 1} ? d${i} : least${i - 1};`);
        } else {
          const all = [...(isGiven(i, j) ? [at(i, j)] : []), ...sums].join(' + ');
          if (j < i) lines.push(`${at(i, j)} = ${sums.length > 0 ? `(${all})` : all} * ${at(j, j)};`);
          else if (sums.length > 0) lines.push(`${at(i, j)} = ${all};`);
        }
      }
    }
    lines.push(`J[${size}] = ${cut ? `J[${size}]` : `least${n - 1}`} / c;`);
    return lines;
  };

  const solveLines: Elimination['solveLines'] = (_dialect, into, right, after) => {
    const lines: string[] = [];
    const value = (i: number) => `${into}[${order[i]!}]`;
    const sum = (i: number, columnsHere: readonly number[]) =>
      columnsHere.map((j) => ` + ${at(i, j)} * ${value(j)}`).join('');
    for (let i = 0; i < n; i += 1) {
      lines.push(
        `${value(i)} = ${right(order[i]!)}${sum(
          i,
          entries[i]!.filter((k) => k < i),
        )};`,
      );
    }
    for (let i = n - 1; i >= 0; i -= 1) {
      const known = sum(
        i,
        entries[i]!.filter((j) => j > i),
      );
      lines.push(`${value(i)} = ${known === '' ? value(i) : `(${value(i)}${known})`} * ${at(i, i)};`);
      if (after) lines.push(...after(order[i]!));
    }
    return lines;
  };
  return { order, size, multiplications, cut, factorLines, solveLines };
}

const largestInOnePiece = 700;

/** A JavaScript function of these statements; cut into several where `cut`. */
export function printPieces(name: string, parameters: string, lines: readonly string[], cut: boolean): string {
  const body = (part: readonly string[]) => part.map((line) => `  ${line}`).join('\n');
  if (!cut) return `function ${name}(${parameters}) {\n${body(lines)}\n}`;
  const parts: string[] = [];
  for (let i = 0; i < lines.length; i += 400)
    parts.push(`function ${name}${parts.length}(${parameters}) {\n${body(lines.slice(i, i + 400))}\n}`);
  const calls = parts.map((_, i) => `  ${name}${i}(${parameters});`).join('\n');
  return `${parts.join('\n')}\nfunction ${name}(${parameters}) {\n${calls}\n}`;
}

export function printElimination(elimination: Elimination): string {
  return [
    printPieces('factor', 'J, c', elimination.factorLines(javaScript), elimination.cut),
    printPieces(
      'solve',
      'J, b, x',
      elimination.solveLines(javaScript, 'x', (state) => `b[${state}]`),
      elimination.cut,
    ),
  ].join('\n\n');
}

/** Least (row count - 1)(column count - 1) first; ties by index, so that the order is the same everywhere. */
function chooseOrder(n: number, pattern: readonly Set<number>[]): number[] {
  const row = pattern.map((set) => new Set(set));
  const column: Set<number>[] = Array.from({ length: n }, () => new Set<number>());
  row.forEach((set, i) => {
    for (const j of set) column[j]!.add(i);
  });
  const left = new Set<number>(Array.from({ length: n }, (_, i) => i));
  const order: number[] = [];
  while (left.size > 0) {
    let best = -1;
    let bestCost = Number.POSITIVE_INFINITY;
    for (const candidate of left) {
      const cost = (row[candidate]!.size - 1) * (column[candidate]!.size - 1);
      if (cost < bestCost) {
        best = candidate;
        bestCost = cost;
      }
    }
    order.push(best);
    left.delete(best);
    for (const i of column[best]!) {
      if (i === best) continue;
      for (const j of row[best]!) {
        if (j === best) continue;
        row[i]!.add(j);
        column[j]!.add(i);
      }
    }
    for (const i of column[best]!) row[i]!.delete(best);
    for (const j of row[best]!) column[j]!.delete(best);
  }
  return order;
}
