/** Rows as aligned text; numbers to the right when `right` names their column. */
export function table(rows: readonly (readonly string[])[], right: readonly number[] = [], gap = '  '): string {
  const widths: number[] = [];
  for (const row of rows)
    row.forEach((cell, i) => {
      widths[i] = Math.max(widths[i] ?? 0, cell.length);
    });
  return rows
    .map((row) =>
      row
        .map((cell, i) =>
          right.includes(i) ? cell.padStart(widths[i]!) : i === row.length - 1 ? cell : cell.padEnd(widths[i]!),
        )
        .join(gap)
        .trimEnd(),
    )
    .join('\n');
}
