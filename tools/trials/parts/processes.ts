import fs from 'node:fs';
import { sleep } from '../place.js';
import { demand, type Trial } from '../trial.js';

/** SIGKILL at a random moment, from the start of the process on; the last thing seen is told. */
export const killed: Trial = {
  name: 'killed',
  about: 'kill -9 at a random moment, live and fast',
  rounds: 200,
  async round(place) {
    const live = place.choose(2) === 0;
    const bench = place.bench(place.choose(4) === 0 ? 'harbour-truck' : 'hand-bench');
    const more = live
      ? ['--for', '60s', '--controller', 'none']
      : ['--for', '10min', '--pace', 'fast', '--controller', 'none'];
    const run = place.run(bench, more);
    // a third before anything is recorded, the rest in the middle of it
    if (place.choose(3) > 0) await place.beyond(run, -100);
    await sleep(place.choose(2500));
    const at = Date.now();
    run.process.kill('SIGKILL');
    await run.ended;
    if (!fs.existsSync(place.recording)) return 'nothing was recorded yet';
    const size = fs.statSync(place.recording).size;
    const { remains } = await place.evidence().catch((error: Error) => {
      if (/header is not whole|is not a recording/.test(error.message)) return { remains: undefined };
      throw error;
    });
    if (remains === undefined) return `killed in its header, at byte ${size}`;
    demand(remains.ending.how === 'ended early', () => `the recording is ${remains.ending.how}`);
    demand(remains.unreadable < 8 << 20, () => `${remains.unreadable} bytes cannot be read`);
    demand(remains.gaps === 0 || live, () => `${remains.gaps} ticks without a row at fast pace`);
    const lost =
      live && remains.lastSeen !== undefined
        ? `, ${Math.max(0, at - remains.lastSeen).toFixed(0)} ms before the kill`
        : '';
    return `${live ? 'live' : 'fast'}: readable to ${(remains.ticks * remains.step).toFixed(3)} s${lost}`;
  },
};

export const paused: Trial = {
  name: 'paused',
  about: 'the process is stopped and goes on later (SIGSTOP, SIGCONT)',
  rounds: 20,
  async round(place) {
    const run = place.run(place.bench('hand-bench'), ['--for', '2500ms']);
    await place.beyond(run, 200);
    const still = 300 + place.choose(500);
    run.process.kill('SIGSTOP');
    await sleep(still);
    run.process.kill('SIGCONT');
    const ended = await place.end(run);
    const { summary } = await place.evidence(ended);
    demand(summary!.verdict === 'not valid' && ended.code === 3, () => `${summary!.verdict}, exit code ${ended.code}`);
    demand(
      summary!.timing.lateness.max > (still - 100) * 1000,
      () => `stopped for ${still} ms, the run says at most ${summary!.timing.lateness.max} µs late`,
    );
    demand(
      summary!.reasons.some((one) => one.reason === 'timing budget'),
      () => 'no reason says so',
    );
    demand(summary!.simulated === 2.5, () => `${summary!.simulated} s of 2.5 s`);
    return `stopped for ${still} ms, owned up to ${(summary!.timing.lateness.max / 1000).toFixed(0)} ms`;
  },
};

export const terminated: Trial = {
  name: 'terminated',
  about: 'SIGTERM while it builds, warms up or waits to begin',
  rounds: 40,
  async round(place) {
    const run = place.run(place.bench('hand-bench'), ['--for', '60s']);
    await sleep(place.choose(3500));
    run.process.kill('SIGTERM');
    const ended = await place.end(run);
    // before the program has read itself there is nobody to hear it
    if (ended.signal === 'SIGTERM') {
      demand(!fs.existsSync(place.recording), () => 'ended by the signal with a recording open');
      return 'not yet begun';
    }
    demand(ended.code === 3, () => `exit code ${ended.code}: ${ended.errors}`);
    if (!fs.existsSync(place.recording)) return 'ended before it recorded';
    const { remains, summary } = await place.evidence(ended);
    demand(remains.ending.how === 'complete', () => `the recording is ${remains.ending.how}`);
    demand(summary!.ending === 'stopped', () => `the summary says ${summary!.ending}`);
    return `ended after ${summary!.simulated.toFixed(3)} s`;
  },
};
