import { readdirSync, statSync } from 'node:fs';
import path from 'node:path';
import { endsWhole } from './ends-whole.js';
import { writersOf } from './writers.js';

/** The newest recording of a folder, when it has no end and no process is writing it. */
export function lastWithoutEnd(folder: string): string | undefined {
  let newest: { readonly file: string; readonly at: number } | undefined;
  let names: string[];
  try {
    names = readdirSync(folder);
  } catch {
    return undefined;
  }
  for (const name of names) {
    if (!name.endsWith('.osrec')) continue;
    const file = path.join(folder, name);
    const at = statSync(file, { throwIfNoEntry: false })?.mtimeMs ?? 0;
    if (newest === undefined || at > newest.at) newest = { file, at };
  }
  if (newest === undefined || endsWhole(newest.file) || writersOf([newest.file]).size > 0) return undefined;
  return newest.file;
}
