import { createHash } from 'node:crypto';
import { RecordingError } from './format.js';
import type { Recording } from './reader.js';

/**
 * SHA-256 over the names, ticks, hashes and all columns of a recording, as hexadecimal digits: the same for two
 * recordings of the same signal data, however they were cut into blocks. A file that ended early has the digest of what
 * is there; a damaged one throws `RecordingError`.
 */
export function signalDigest(recording: Recording): string {
  const signals = recording.header.signals;
  const ticks = createHash('sha256');
  const hashes = createHash('sha256');
  const columns = signals.map(() => createHash('sha256'));
  const walk = recording.blocks();
  for (let step = walk.next(); ; step = walk.next()) {
    if (step.done) {
      if (step.value.how === 'damaged') throw new RecordingError(`${recording.file} is damaged: ${step.value.what}`);
      break;
    }
    const block = step.value;
    if (block.kind !== 'rows') continue;
    ticks.update(block.ticks);
    hashes.update(block.hashes);
    for (let i = 0; i < columns.length; i += 1)
      columns[i]!.update(block.data.subarray(i * block.count, (i + 1) * block.count));
  }
  const whole = createHash('sha256');
  whole.update(JSON.stringify(signals.map((signal) => signal.path)));
  whole.update(ticks.digest()).update(hashes.digest());
  for (const column of columns) whole.update(column.digest());
  return whole.digest('hex');
}
