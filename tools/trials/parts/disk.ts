import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import { demand, type Trial } from '../trial.js';

/** Whether strace can trace and put in errors here. */
export function whyNoStrace(): string {
  try {
    execFileSync('strace', ['-f', '--seccomp-bpf', '-e', 'trace=getppid', '-o', '/dev/null', 'true'], {
      stdio: 'ignore',
    });
    return '';
  } catch {
    return 'strace is not there or may not trace';
  }
}

function whyNoMount(): string {
  try {
    execFileSync('unshare', ['-rm', 'mount', '-t', 'tmpfs', 'tmpfs', '/mnt'], { stdio: 'ignore' });
    return '';
  } catch {
    return 'no mount in a name space of its own';
  }
}

/** Puts an effect into a system call of all threads: `pwrite64:error=ENOSPC:when=5+`. */
export function injected(call: string, effect: string): string[] {
  return ['strace', '-f', '--seccomp-bpf', '-o', '/dev/null', '-e', `trace=${call}`, '-e', `inject=${call}:${effect}`];
}

export const stalled: Trial = {
  name: 'disk stalls',
  about: 'each write of the recording takes long for a while; rows may be lost, owned up to, inputs never',
  rounds: 10,
  why: whyNoStrace,
  async round(place) {
    const delay = 200 + place.choose(1200);
    const from = 2 + place.choose(4);
    const run = place.run(
      place.bench('hand-bench'),
      ['--for', '3s'],
      injected('pwrite64', `delay_enter=${delay * 1000}:when=${from}..${from + 1}`),
    );
    const ended = await place.end(run);
    const { remains, summary } = await place.evidence(ended);
    demand(remains.ending.how === 'complete', () => `the recording is ${remains.ending.how}`);
    demand(summary!.simulated === 3, () => `${summary!.simulated} s of 3 s`);
    return `writes of ${delay} ms: ${summary!.rowsLost} rows lost, ${(summary!.timing.lateness.max / 1000).toFixed(1)} ms late at most`;
  },
};

export const full: Trial = {
  name: 'disk full',
  about: 'a file system of about a megabyte that fills up in the middle of the run',
  rounds: 10,
  why: whyNoMount,
  async round(place) {
    const kilobytes = 600 + place.choose(1000);
    fs.mkdirSync(place.file('small'));
    const program = `mount -t tmpfs -o size=${kilobytes}k tmpfs "$0" && "$@"; code=$?; cp "$0"/run.osrec "$0"/.. 2>/dev/null; exit $code`;
    const words = place.run(
      place.bench('hand-bench'),
      ['--pace', 'fast', '--for', '20s', '--record', place.file('small/run.osrec')],
      ['unshare', '-rm', 'bash', '-c', program, place.file('small')],
    );
    const ended = await place.end(words);
    demand(
      /disk is full/.test(ended.output + ended.errors),
      () => `nothing says that the disk was full: ${ended.errors}`,
    );
    demand(ended.code === 3, () => `exit code ${ended.code}`);
    const { remains } = await place.evidence();
    demand(remains.ending.how === 'ended early', () => `the recording is ${remains.ending.how}`);
    demand(remains.bytes > 0.9 * 1000 * kilobytes, () => `${remains.bytes} of ${kilobytes} kB were used`);
    return `${kilobytes} kB: readable to ${(remains.ticks * remains.step).toFixed(3)} s of 20 s`;
  },
};

export const failing: Trial = {
  name: 'disk fails',
  about: 'writing or forcing the recording to the disk ends in EIO',
  rounds: 10,
  why: whyNoStrace,
  async round(place) {
    const call = ['pwrite64', 'fdatasync', 'fsync'][place.choose(3)]!;
    const run = place.run(place.bench('hand-bench'), ['--for', '2500ms'], injected(call, 'error=EIO:when=1+'));
    const ended = await place.end(run);
    demand(/EIO/.test(ended.output + ended.errors), () => `${call}: nothing says so: ${ended.output} ${ended.errors}`);
    demand(ended.code === 3, () => `${call}: exit code ${ended.code}: ${ended.errors}`);
    demand(!/\n\s+at /.test(ended.errors), () => `a stack trace: ${ended.errors}`);
    return `${call} failed, not valid`;
  },
};
