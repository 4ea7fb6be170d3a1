import fs from 'node:fs';
import path from 'node:path';

/**
 * Processes of this computer that have one of `files` open for writing, by real path: such a file has no end yet and
 * nothing is wrong with it. Linux alone says so, and only of processes that this user may look at.
 */
export function writersOf(files: readonly string[]): ReadonlyMap<string, number> {
  const wanted = new Set(files.map((file) => real(file)));
  const found = new Map<string, number>();
  for (const pid of list('/proc')) {
    if (!/^\d+$/.test(pid)) continue;
    for (const descriptor of list(`/proc/${pid}/fd`)) {
      try {
        const target = fs.readlinkSync(`/proc/${pid}/fd/${descriptor}`);
        if (!wanted.has(target)) continue;
        const flags = /^flags:\s*([0-7]+)/m.exec(fs.readFileSync(`/proc/${pid}/fdinfo/${descriptor}`, 'utf8'));
        if (flags && (Number.parseInt(flags[1]!, 8) & 3) !== fs.constants.O_RDONLY) found.set(target, Number(pid));
      } catch {
        // it has ended, or belongs to somebody else
      }
    }
  }
  return new Map(files.flatMap((file) => (found.has(real(file)) ? [[file, found.get(real(file))!]] : [])));
}

function list(folder: string): string[] {
  try {
    return fs.readdirSync(folder);
  } catch {
    return [];
  }
}

function real(file: string): string {
  try {
    return fs.realpathSync(file);
  } catch {
    return path.resolve(file);
  }
}
