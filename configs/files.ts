import { readdirSync, readFileSync, realpathSync, statSync } from 'node:fs';
import { dirname, isAbsolute, join, normalize, relative, sep } from 'node:path';

/** Where bench and scenario files come from: the disk, or a recording that carries them. */
export interface Files {
  /** Text of a file; undefined when there is none. Throws an Error with a plain message when it may not be read. */
  read(path: string): string | undefined;
  /** Names in a folder, sorted; undefined when it is no folder. */
  list(path: string): readonly string[] | undefined;
}

/** Files larger than this are refused: a bench is written by people. */
export const largestFile = 2_000_000;

export const diskFiles: Files = {
  read(path) {
    const size = statSync(path, { throwIfNoEntry: false });
    if (!size?.isFile()) return undefined;
    if (size.size > largestFile) throw new Error(`larger than ${largestFile} bytes`);
    return readFileSync(path, 'utf8');
  },
  list(path) {
    if (!statSync(path, { throwIfNoEntry: false })?.isDirectory()) return undefined;
    return readdirSync(path).sort();
  },
};

/** Files from memory, by path with forward slashes: for tests and for benches carried by a recording. */
export function memoryFiles(texts: Readonly<Record<string, string>>): Files {
  return {
    read(path) {
      const key = normalize(path);
      return Object.hasOwn(texts, key) ? texts[key] : undefined;
    },
    list(path) {
      const folder = normalize(path).replace(/\/$/, '');
      const start = folder === '.' ? '' : `${folder}/`;
      const names = Object.keys(texts)
        .filter((key) => key.startsWith(start) && !key.slice(start.length).includes('/'))
        .map((key) => key.slice(start.length));
      return names.length > 0 ? names.sort() : undefined;
    },
  };
}

/**
 * Path of a file that another names, or undefined when it lies outside `root`, the folder of the first file: a bench is
 * a folder that can be copied whole.
 */
export function inside(root: string, from: string, named: string): string | undefined {
  if (isAbsolute(named) || named.includes('\0')) return undefined;
  const path = normalize(join(dirname(from), named));
  if (outside(relative(root, path))) return undefined;
  try {
    if (outside(relative(realpathSync(root), realpathSync(path)))) return undefined;
  } catch {
    // Not on the disk: either in memory or missing, which reading will say.
  }
  return path;
}

function outside(path: string): boolean {
  return path === '..' || path.startsWith(`..${sep}`) || isAbsolute(path);
}
