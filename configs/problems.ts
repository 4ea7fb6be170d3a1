import { BuildError, type Position, type Problem } from '../runtime/contract.js';

/** Collects what is wrong with a file, so that a user sees all of it at once. */
export class Problems {
  readonly all: Problem[] = [];
  /** Not wrong, but worth a look: values outside what data sheets usually say. */
  readonly remarks: Problem[] = [];
  /** Files in the order in which they were read. */
  readonly files: string[] = [];

  add(
    where: Position | undefined,
    path: string,
    what: string,
    remedy: string,
    more: { value?: string; bound?: string } = {},
  ): void {
    this.all.push(problem(where, path, what, remedy, more));
  }

  remark(
    where: Position | undefined,
    path: string,
    what: string,
    remedy: string,
    more: { value?: string; bound?: string } = {},
  ): void {
    this.remarks.push(problem(where, path, what, remedy, more));
  }

  get count(): number {
    return this.all.length;
  }

  /** Throws a BuildError with all problems in the order of the file. */
  throwIfAny(): void {
    if (this.all.length > 0) throw new BuildError(sorted(this.all, this.files));
  }
}

function problem(
  where: Position | undefined,
  path: string,
  what: string,
  remedy: string,
  more: { value?: string; bound?: string },
): Problem {
  return {
    ...(where === undefined ? {} : { where }),
    path,
    what,
    ...(more.value === undefined ? {} : { value: more.value }),
    ...(more.bound === undefined ? {} : { bound: more.bound }),
    remedy,
  };
}

/** By file in the order given, others behind as they appear, then line and column; problems without a place last. */
export function sorted(problems: readonly Problem[], first: readonly string[] = []): Problem[] {
  const files: unknown[] = [...new Set([...first, ...problems.map((entry) => entry.where?.file)])];
  const rank = (entry: Problem) => (entry.where === undefined ? files.length : files.indexOf(entry.where.file));
  return [...problems].sort(
    (a, b) =>
      rank(a) - rank(b) ||
      (a.where?.line ?? 0) - (b.where?.line ?? 0) ||
      (a.where?.column ?? 0) - (b.where?.column ?? 0),
  );
}
