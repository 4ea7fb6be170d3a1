import fs from 'node:fs';
import path from 'node:path';

export interface DiskSpeed {
  /** Bytes a second, forced to the disk. */
  readonly rate: number;
  /** The longest single write with its forcing, s. */
  readonly longest: number;
  /** Room left, bytes. */
  readonly free: number;
}

const PIECE = 1 << 20;
const PIECES = 32;

/** Writes 32 MiB into a folder the way a recording is written, and removes it. Throws what the file system says. */
export function measureDisk(folder: string): DiskSpeed {
  fs.mkdirSync(folder, { recursive: true });
  const file = path.join(folder, `.readiness-${process.pid}`);
  const piece = new Uint8Array(PIECE);
  for (let i = 0; i < PIECE; i += 1) piece[i] = (i * 2654435761) >>> 24;
  const descriptor = fs.openSync(file, 'wx');
  let longest = 0;
  const began = performance.now();
  try {
    for (let i = 0; i < PIECES; i += 1) {
      const start = performance.now();
      fs.writeSync(descriptor, piece);
      if (i % 4 === 3) fs.fdatasyncSync(descriptor);
      longest = Math.max(longest, performance.now() - start);
    }
    fs.fsyncSync(descriptor);
  } finally {
    fs.closeSync(descriptor);
    fs.rmSync(file, { force: true });
  }
  const rate = (PIECE * PIECES) / ((performance.now() - began) / 1000);
  const { bavail, bsize } = fs.statfsSync(folder);
  return { rate, longest: longest / 1000, free: bavail * bsize };
}
