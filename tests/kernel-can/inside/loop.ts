// The harbour truck on vcan0: the product as a user starts it, its controller in a process of its own with socketcan,
// candump as the witness. Words: the folder for the recording.
import { spawnSync } from 'node:child_process';
import path from 'node:path';
import { capture, report } from './tools.js';

const folder = process.argv[2]!;
const spy = await capture();
const run = spawnSync(
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
  { encoding: 'utf8', maxBuffer: 1 << 26 },
);
const frames = await spy.stop();
report({ status: run.status, errors: run.stderr, summary: JSON.parse(run.stdout || '{}') as object, frames });
