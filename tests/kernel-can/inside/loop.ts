// The harbour truck on vcan0: the product as a user starts it, its controller in a process of its own with socketcan,
// candump as the witness. Words: the folder for the recording.
import { spawn } from 'node:child_process';
import path from 'node:path';
import { text } from 'node:stream/consumers';
import { capture, report } from './tools.js';

const folder = process.argv[2]!;
const spy = await capture();
// Not the waiting kind of spawn: candump's pipe has to be read meanwhile, or it stops listening.
const run = spawn(
  process.execPath,
  [
    'dist/tools/oilspring.js',
    'run',
    'configs/harbour-truck/bench-can.yaml',
    '--pace',
    'live',
    '--for',
    '3s',
    '--record',
    path.join(folder, 'run.osrec'),
    '--json',
  ],
  { stdio: ['ignore', 'pipe', 'pipe'] },
);
const status = new Promise<number | null>((done) => run.once('close', done));
const [output, errors] = await Promise.all([text(run.stdout), text(run.stderr)]);
const frames = await spy.stop();
report({ status: await status, errors, summary: JSON.parse(output || '{}') as object, frames });
