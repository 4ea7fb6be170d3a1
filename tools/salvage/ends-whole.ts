import fs from 'node:fs';
import { FRAME } from '../../runtime/recording/format.js';

/** An end carries the run's summary: tens of kilobytes. */
const LARGEST_END = 8 << 20;

/**
 * Whether a recording's last bytes are an end block, from its tail alone: quick, for folders of large files. It says
 * nothing about the blocks before, which `Recording.examine` reads. False for what cannot be read.
 */
export function endsWhole(file: string): boolean {
  let descriptor: number;
  try {
    descriptor = fs.openSync(file, 'r');
  } catch {
    return false;
  }
  try {
    const { size } = fs.fstatSync(descriptor);
    const tail = Buffer.alloc(Math.min(size, LARGEST_END));
    if (fs.readSync(descriptor, tail, 0, tail.length, size - tail.length) !== tail.length) return false;
    // its payload begins with a map, `n` and a number, `k` and `end`
    for (let at = tail.lastIndexOf('\xa1k\xa3end', undefined, 'latin1'); at >= 0; ) {
      for (let number = 1; number <= 9; number += 1) {
        const frame = at - number - 3 - FRAME;
        if (frame < 0 || tail.toString('latin1', frame + FRAME + 1, frame + FRAME + 3) !== '\xa1n') continue;
        if (tail.readUInt32LE(frame) === tail.length - frame - FRAME) return true;
      }
      if (at === 0) break;
      at = tail.lastIndexOf('\xa1k\xa3end', at - 1, 'latin1');
    }
    return false;
  } finally {
    fs.closeSync(descriptor);
  }
}
