import { describe, expect, it } from 'vitest';
import { trials } from '../../../tools/trials/all.js';
import { Place } from '../../../tools/trials/place.js';

/** One round each of what `npm run trials` does many times; what is tested elsewhere, or needs strace, is left out. */
const short = [
  ['paused', 1],
  ['wall clock steps', 1],
  ['loop thread ends', 5],
  ['host thread ends', 1],
] as const;

describe('a run, and what is done to it', () => {
  for (const [name, seed] of short) {
    const trial = trials.find((one) => one.name === name)!;
    it(`${name}: ${trial.about}`, async () => {
      expect(trial.why?.() ?? '').toBe('');
      const place = new Place(seed);
      try {
        expect(await trial.round(place)).not.toBe('');
      } finally {
        await place.leave();
      }
    });
  }
});

it('finds a run that does not own up to what it lost', async () => {
  const place = new Place(1);
  try {
    const run = place.run(place.bench('hand-bench'), ['--pace', 'fast', '--for', '300ms']);
    const ended = await place.end(run);
    expect((await place.evidence(ended)).summary!.rowsLost).toBe(0);
    const lying = { ...ended, output: ended.output.replace('"rowsLost":0', '"rowsLost":3') };
    await expect(place.evidence(lying)).rejects.toThrow('0 ticks without a row, 3 owned up to');
    const wrong = { ...ended, code: 1 };
    await expect(place.evidence(wrong)).rejects.toThrow('exit code 1, the summary says 0');
  } finally {
    await place.leave();
  }
});
