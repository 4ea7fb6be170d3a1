import { Recorder } from '../../../runtime/recording/recorder.js';
import { RecordingWriter } from '../../../runtime/recording/writer.js';
import { createRing } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';
import { sampleHeader, sampleTick } from './sample.js';

// Records more than the file size limit of the process allows: the loop must not notice.
process.on('SIGXFSZ', () => {});
const handle = createRing({ capacity: 1 << 16, whenFull: 'wait', patience: 5000 });
const journal = new RingJournal(handle, Int32Array.of(0, 1, 2));
const recorder = new Recorder(handle, new RecordingWriter(process.argv[2]!, sampleHeader()), { signals: 3 });
const signals = new Float64Array(3);
const hash = new Int32Array(2);
for (let tick = 0; tick < 20_000; tick += 1) {
  sampleTick(journal, tick, signals, hash);
  if (tick % 100 === 99) {
    recorder.drain();
    await new Promise((resolve) => setImmediate(resolve));
  }
}
await recorder.finish({}).catch((error: Error) => console.log(`finish: ${error.message}`));
console.log(`rows read: ${recorder.rows}`);
