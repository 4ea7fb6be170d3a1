import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import type { RunSummary } from '../../../runtime/run-summary.js';
import { demand, type Trial } from '../trial.js';
import { injected, whyNoStrace } from './disk.js';

export const busy: Trial = {
  name: 'busy cores',
  about: 'every core is kept busy by others; late ticks are owned up to',
  rounds: 10,
  async round(place) {
    for (let i = 0; i < os.availableParallelism(); i += 1)
      place.start([process.execPath, '-e', 'for (;;) Math.sqrt(Math.random());']);
    const run = place.run(place.bench('hand-bench'), ['--for', '3s']);
    const ended = await place.end(run);
    const { summary, remains } = await place.evidence(ended);
    demand(summary!.simulated === 3 && remains.ending.how === 'complete', () => `${summary!.simulated} s of 3 s`);
    demand([0, 3].includes(ended.code!), () => `exit code ${ended.code}`);
    return `${(summary!.timing.lateness.max / 1000).toFixed(1)} ms late at most, ${summary!.timing.overruns} overruns, ${summary!.verdict}`;
  },
};

/** The wall clock of one process, an hour to and fro twice a second; the monotonic clock stays as it is. */
const shim = `
#define _GNU_SOURCE
#include <dlfcn.h>
#include <time.h>
#include <sys/time.h>
static long off(void) {
  struct timespec t;
  static int (*real)(clockid_t, struct timespec *);
  if (!real) real = dlsym(RTLD_NEXT, "clock_gettime");
  real(CLOCK_MONOTONIC, &t);
  return (t.tv_nsec / 500000000 + t.tv_sec) % 2 ? 3600 : -3600;
}
int clock_gettime(clockid_t id, struct timespec *t) {
  static int (*real)(clockid_t, struct timespec *);
  if (!real) real = dlsym(RTLD_NEXT, "clock_gettime");
  int answer = real(id, t);
  if (id == CLOCK_REALTIME || id == CLOCK_REALTIME_COARSE) t->tv_sec += off();
  return answer;
}
int gettimeofday(struct timeval *t, void *zone) {
  static int (*real)(struct timeval *, void *);
  if (!real) real = dlsym(RTLD_NEXT, "gettimeofday");
  int answer = real(t, zone);
  if (t) t->tv_sec += off();
  return answer;
}
time_t time(time_t *t) {
  struct timespec now;
  clock_gettime(CLOCK_REALTIME, &now);
  if (t) *t = now.tv_sec;
  return now.tv_sec;
}
`;

export const clock: Trial = {
  name: 'wall clock steps',
  about: 'the wall clock jumps by two hours, to and fro, all the time',
  rounds: 10,
  why: () => {
    try {
      execFileSync('gcc', ['--version'], { stdio: 'ignore' });
      return '';
    } catch {
      return 'no C compiler';
    }
  },
  async round(place) {
    const source = place.write('shim.c', shim);
    execFileSync('gcc', ['-shared', '-fPIC', '-O1', '-o', place.file('shim.so'), source, '-ldl']);
    const run = place.run(place.bench('hand-bench'), ['--for', '3s'], [], { LD_PRELOAD: place.file('shim.so') });
    const ended = await place.end(run);
    const { summary, remains } = await place.evidence(ended);
    demand(summary!.simulated === 3 && remains.ending.how === 'complete', () => `${summary!.simulated} s of 3 s`);
    demand(summary!.timing.drift < 2, () => `a drift of ${summary!.timing.drift} s`);
    demand(summary!.timing.lateness.max < 2e6, () => `${summary!.timing.lateness.max} µs late`);
    demand(remains.rows === 3200, () => `${remains.rows} rows of 3200`);
    return `${(summary!.timing.lateness.max / 1000).toFixed(1)} ms late at most, ${summary!.verdict}`;
  },
};

interface Failure {
  readonly call: string;
  readonly effect: string;
  /** Of the run: it goes on, or ends with a word about the call. */
  readonly goesOn: boolean;
}
const failures: readonly Failure[] = [
  { call: 'clock_nanosleep', effect: 'error=EINTR:when=300+50', goesOn: true },
  { call: 'clock_nanosleep', effect: 'error=EINVAL:when=900+', goesOn: false },
  { call: 'mlock', effect: 'error=ENOMEM', goesOn: true },
  { call: 'sched_setscheduler', effect: 'error=EPERM', goesOn: true },
  { call: 'sched_setaffinity', effect: 'error=EINVAL', goesOn: true },
];

export const calls: Trial = {
  name: 'system calls fail',
  about: 'a call of the loop thread into the system fails: refused rights are said, a broken clock ends the run',
  rounds: 10,
  why: whyNoStrace,
  async round(place) {
    const { call, effect, goesOn } = failures[place.choose(failures.length)]!;
    const run = place.run(place.bench('hand-bench'), ['--for', '1500ms'], injected(call, effect));
    const ended = await place.end(run);
    // what fails while it warms up ends it before it records
    const early = !fs.existsSync(place.recording);
    const { summary } = early ? { summary: JSON.parse(ended.output) as RunSummary } : await place.evidence(ended);
    demand(!early || !goesOn, () => `${call}: nothing was recorded: ${ended.errors}`);
    if (goesOn) {
      demand(
        summary!.ending === 'complete' && summary!.simulated === 1.5,
        () => `${call}: ${summary!.verdictText} ${ended.errors}`,
      );
    } else {
      demand(ended.code === 5, () => `${call}: exit code ${ended.code}`);
      demand(summary!.verdictText.includes(call), () => `${call}: ${summary!.verdictText}`);
    }
    return `${call} ${effect}: ${summary!.ending}, exit code ${ended.code}`;
  },
};
