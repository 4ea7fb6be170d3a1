import fs from 'node:fs';
import path from 'node:path';
import type { Place } from '../place.js';
import { demand, type Trial } from '../trial.js';

/** What a controller's module does to the loop thread at tick 300, and what the run must say. */
const ends: readonly (readonly [string, RegExp])[] = [
  ["throw new Error('tired')", /tired/],
  ['process.exit(0)', /loop thread ended without a word, with exit code 0/],
  ["Promise.reject(new Error('later'))", /later/],
  ['(function again() { again(); })()', /call stack/],
];

/** A copy of the truck's bench with a controller module of these words. */
function benchWith(place: Place, words: string): string {
  const from = path.dirname(place.bench('harbour-truck'));
  fs.cpSync(from, place.file('truck'), { recursive: true });
  fs.writeFileSync(
    place.file('truck/controller.js'),
    `export const createController = () => ({ step(tick) { if (tick === 300) { ${words}; } } });\n`,
  );
  return place.file('truck/bench.yaml');
}

export const loopEnds: Trial = {
  name: 'loop thread ends',
  about: 'the loop thread ends in an error: exit code 5, what was recorded can be read',
  rounds: 10,
  async round(place) {
    const [words, expected] = ends[place.choose(ends.length)]!;
    const run = place.run(benchWith(place, words), ['--pace', 'fast', '--for', '600ms']);
    const ended = await place.end(run);
    const { summary, remains } = await place.evidence(ended);
    demand(ended.code === 5, () => `${words}: exit code ${ended.code}`);
    demand(
      summary!.ending === 'broken' && expected.test(summary!.verdictText),
      () => `${words}: ${summary!.verdictText}`,
    );
    demand(remains.ticks >= 300, () => `${words}: ${remains.ticks} ticks`);
    return summary!.verdictText.slice(0, 90);
  },
};

export const hostEnds: Trial = {
  name: 'host thread ends',
  about:
    'an error that nobody foresaw in the thread that records: exit code 5, the recording is whole up to its last block',
  rounds: 5,
  async round(place) {
    const file = place.write(
      'later.mjs',
      "import { isMainThread } from 'node:worker_threads';\nimport fs from 'node:fs';\n" +
        `if (isMainThread) { const timer = setInterval(() => { if ((fs.statSync(${JSON.stringify(place.recording)}, { throwIfNoEntry: false })?.size ?? 0) < 5e5) return; clearInterval(timer); throw new Error('planted'); }, 20); }\n`,
    );
    const run = place.run(place.bench('hand-bench'), ['--for', '60s'], [], {}, ['--import', file]);
    const ended = await place.end(run);
    demand(ended.code === 5, () => `exit code ${ended.code}`);
    demand(/planted/.test(ended.errors) && /salvage/.test(ended.errors), () => ended.errors);
    const { remains } = await place.evidence();
    demand(
      remains.ending.how === 'ended early' && remains.rows > 0,
      () => `${remains.ending.how}, ${remains.rows} rows`,
    );
    return `readable to ${(remains.ticks * remains.step).toFixed(3)} s`;
  },
};
