#!/usr/bin/env node
import path from 'node:path';
import { whyNotLive } from '../runtime/realtime/ffi.js';
import { complain } from './commands/failure.js';
import { runAndShow } from './commands/run.js';
import { packageRoot } from './loop/controller-module.js';
import { planRun } from './run/plan.js';

/**
 * `npm start`: the main job with what is in the box. The harbour truck drives its delivery round against the demo
 * controller, a process of its own, in real time; where a live run is not possible, as fast as it goes.
 */
const why = whyNotLive();
if (why !== '') process.stderr.write(`${why}\n`);
try {
  const bench = path.relative(process.cwd(), path.join(packageRoot(), 'configs', 'harbour-truck', 'bench.yaml'));
  process.exitCode = await runAndShow(planRun({ bench, pace: why === '' ? 'live' : 'fast', controller: 'process' }), {
    page: true,
  });
} catch (error) {
  process.exitCode = complain(error);
}
