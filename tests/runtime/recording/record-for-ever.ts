import { isMainThread, Worker, workerData } from 'node:worker_threads';
import { Recorder } from '../../../runtime/recording/recorder.js';
import { RecordingWriter } from '../../../runtime/recording/writer.js';
import { createRing, type RingHandle } from '../../../runtime/ring.js';
import { RingJournal } from '../../../runtime/ring-journal.js';
import { sampleHeader, sampleTick } from './sample.js';

// A loop thread that journals as fast as the ring allows and a host thread that records, until somebody kills both.
if (isMainThread) {
  const handle = createRing({ capacity: 1 << 18, whenFull: 'wait' });
  const writer = new RecordingWriter(process.argv[2]!, sampleHeader());
  const recorder = new Recorder(handle, writer, { signals: 3, flushEvery: 20 });
  recorder.start();
  new Worker(new URL(import.meta.url), { execArgv: process.execArgv, workerData: handle });
  const wait = setInterval(() => {
    if (recorder.rows < 1000) return;
    clearInterval(wait);
    console.log('recording');
  }, 1);
} else {
  const journal = new RingJournal(workerData as RingHandle, Int32Array.of(0, 1, 2));
  const signals = new Float64Array(3);
  const hash = new Int32Array(2);
  for (let tick = 0; ; tick += 1) sampleTick(journal, tick, signals, hash);
}
