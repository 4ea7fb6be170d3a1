import { BuildError } from '../../runtime/contract.js';
import { RecordingError } from '../../runtime/recording/format.js';
import { inlineMore } from '../loop/engine-flags.js';
import { rederive } from '../run/rederive.js';
import { Runner, type RunWishes } from './one-run.js';

/** What a process of its own is told, as JSON in its first argument. Answers with one line of JSON a number. */
export interface ChildOrder extends RunWishes {
  /** `run` draws and runs; `derive` computes the recording of a number again, from that file alone. */
  readonly work: 'run' | 'derive';
  readonly numbers: readonly number[];
  /** Flags of the engine as in the loop thread. */
  readonly inline: boolean;
}

/** Of a recording that was derived again. */
export interface Derived {
  readonly number: number;
  readonly identical: boolean;
  readonly compared: number;
  readonly firstTick: number | null;
}

const order = JSON.parse(process.argv[2]!) as ChildOrder;
if (order.inline) inlineMore();
const runner = new Runner(order);
const say = (line: unknown) => process.stdout.write(`${JSON.stringify(line)}\n`);
for (const number of order.numbers) {
  try {
    if (order.work === 'run') say(await runner.run(number));
    else {
      const { identical, compared, missing, firstTick } = await rederive(
        Runner.fileOf(order.folder, number),
        () => true,
      );
      say({ number, identical: identical && missing === 0, compared, firstTick: firstTick ?? null } satisfies Derived);
    }
  } catch (error) {
    if (!(error instanceof BuildError) && !(error instanceof RecordingError)) throw error;
    say({ number, error: error.message });
  }
}
