import { type Dialect, javaScript } from './emit.js';

/**
 * Sparse LU of M = c I - J without pivoting, as straight-line code. The order of elimination is chosen once by least
 * fill (Markowitz 1957) on the diagonal; circuits are nearly trees, so there is almost no fill.
 */
export interface Elimination {
  /** Position in the order -> state. */
  readonly order: readonly number[];
  /** Number of values in the factor array. */
  readonly size: number;
  readonly multiplications: number;
  /** Too large for one function: values stay in arrays between the pieces. */
  readonly cut: boolean;
  /** Statements that fill A from J and c and factor it; A[size] gets the least pivot over c. */
  factorLines(dialect: Dialect): string[];
  /**
   * Statements that solve M x = right side into the array `into`. `right` and `after` get a state's index; `after` also
   * how its solution is called, and gives further statements.
   */
  solveLines(
    dialect: Dialect,
    into: string,
    right: (state: number) => string,
    after?: (state: number, solution: string) => readonly string[],
  ): string[];
}

export function eliminate(n: number, rows: readonly number[], columns: readonly number[]): Elimination {
  const slotOf = new Map<number, number>();
  rows.forEach((row, i) => {
    slotOf.set(row * n + columns[i]!, i);
  });
  const pattern: Set<number>[] = Array.from({ length: n }, (_, i) => new Set([i]));
  rows.forEach((row, i) => {
    pattern[row]!.add(columns[i]!);
  });

  const order = chooseOrder(n, pattern);
  const position = new Array<number>(n);
  order.forEach((state, k) => {
    position[state] = k;
  });
  // symbolic factorisation in permuted coordinates
  const entries: Set<number>[] = order.map((state) => new Set([...pattern[state]!].map((column) => position[column]!)));
  const filled = entries.map((row) => new Set(row));
  let multiplications = 0;
  for (let k = 0; k < n; k += 1) {
    for (let i = k + 1; i < n; i += 1) {
      if (!filled[i]!.has(k)) continue;
      for (const j of filled[k]!) if (j > k) filled[i]!.add(j);
    }
  }
  const index = new Map<number, number>();
  for (let i = 0; i < n; i += 1)
    for (const j of [...filled[i]!].sort((a, b) => a - b)) index.set(i * n + j, index.size);
  const size = index.size;
  const at = (i: number, j: number) => `A[${index.get(i * n + j)!}]`;
  // Small circuits keep values in locals; large ones in the array, so that the code can be cut into functions.
  const cut = size > largestInOnePiece;
  const name = cut ? at : (i: number, k: number) => `a${i}_${k}`;
  const pivot = cut ? (i: number) => at(i, i) : (i: number) => `r${i}`;
  for (let i = 0; i < n; i += 1) {
    for (const j of filled[i]!) {
      for (const k of filled[i]!) if (k < Math.min(i, j) && filled[k]!.has(j)) multiplications += 1;
      multiplications += 1;
    }
  }

  // values, row by row (Doolittle)
  const factorLines = (dialect: Dialect): string[] => {
    const lines = [`A[${size}] = ${dialect.infinity};`];
    const declare = cut ? '' : dialect.local;
    for (let i = 0; i < n; i += 1) {
      const columnsHere = [...filled[i]!].sort((a, b) => a - b);
      for (const j of columnsHere) {
        const slot = slotOf.get(order[i]! * n + order[j]!);
        const original = slot === undefined ? '' : `J[${slot}]`;
        const start = i === j ? (original ? `c - ${original}` : 'c') : original ? `-${original}` : '';
        const terms = columnsHere
          .filter((k) => k < Math.min(i, j) && filled[k]!.has(j))
          .map((k) => `${name(i, k)} * ${name(k, j)}`);
        const sum = terms.length === 0 ? start || '0' : `${start || '0'} - ${terms.join(' - ')}`;
        const store = cut ? '' : `${at(i, j)} = `;
        if (j < i) lines.push(`${declare}${name(i, j)} = ${store}(${sum}) * ${pivot(j)};`);
        else if (j === i) {
          lines.push(
            `{ ${dialect.local}d = ${sum}; A[${size}] = ${dialect.math('min')}(A[${size}], d); ${at(i, i)} = 1 / d; }`,
          );
          if (!cut) lines.push(`${dialect.local}r${i} = ${at(i, i)};`);
        } else lines.push(`${declare}${name(i, j)} = ${store}${sum};`);
      }
    }
    lines.push(`A[${size}] /= c;`);
    return lines;
  };

  const solveLines: Elimination['solveLines'] = (dialect, into, right, after) => {
    const lines: string[] = [];
    const z = cut ? (i: number) => `${into}[${order[i]!}]` : (i: number) => `${into}z${i}`;
    const x = cut ? (i: number) => `${into}[${order[i]!}]` : (i: number) => `${into}x${i}`;
    const declare = cut ? '' : dialect.local;
    for (let i = 0; i < n; i += 1) {
      const terms = [...filled[i]!]
        .filter((k) => k < i)
        .sort((a, b) => a - b)
        .map((k) => `${at(i, k)} * ${z(k)}`);
      lines.push(`${declare}${z(i)} = ${right(order[i]!)}${terms.map((term) => ` - ${term}`).join('')};`);
    }
    for (let i = n - 1; i >= 0; i -= 1) {
      const terms = [...filled[i]!]
        .filter((j) => j > i)
        .sort((a, b) => a - b)
        .map((j) => `${at(i, j)} * ${x(j)}`);
      const sum = terms.length === 0 ? z(i) : `(${z(i)}${terms.map((term) => ` - ${term}`).join('')})`;
      lines.push(`${declare}${x(i)} = ${sum} * ${at(i, i)};`);
      if (!cut) lines.push(`${into}[${order[i]!}] = ${into}x${i};`);
      if (after) lines.push(...after(order[i]!, x(i)));
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
    printPieces('factor', 'J, c, A', elimination.factorLines(javaScript), elimination.cut),
    printPieces(
      'solve',
      'A, b, x',
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
