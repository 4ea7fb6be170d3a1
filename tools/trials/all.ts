import { dying, nonsense, restarting, stranger } from './parts/controllers.js';
import { failing, full, stalled } from './parts/disk.js';
import { hostEnds, loopEnds } from './parts/inside.js';
import { busy, calls, clock } from './parts/machine.js';
import { killed, paused, terminated } from './parts/processes.js';
import type { Trial } from './trial.js';

export const trials: readonly Trial[] = [
  killed,
  paused,
  terminated,
  stalled,
  full,
  failing,
  busy,
  clock,
  calls,
  loopEnds,
  hostEnds,
  dying,
  restarting,
  nonsense,
  stranger,
];
