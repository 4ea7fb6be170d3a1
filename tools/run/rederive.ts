import { setImmediate } from 'node:timers/promises';
import type { Transport } from '../../bridge/transport.js';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { hashText } from '../../runtime/block.js';
import { RecordingError } from '../../runtime/recording/format.js';
import { Recording } from '../../runtime/recording/reader.js';
import { RecordedInputs } from '../../runtime/recording/recorded-inputs.js';
import { RecordedStates } from '../../runtime/recording/recorded-states.js';
import type { ScriptSpec } from '../../runtime/script.js';
import { softwareVersion } from './host-run.js';

export interface Rederivation {
  readonly identical: boolean;
  readonly compared: number;
  /** Ticks of which the recording has no row. */
  readonly missing: number;
  readonly hash: string;
  readonly step: number;
  readonly firstTick?: number;
  readonly snapshotTick?: number;
  readonly states: readonly { readonly path: string; readonly recorded: number; readonly derived: number }[];
  readonly ending: string;
  readonly remarks: readonly string[];
  readonly stopped: boolean;
}

/**
 * Computes a recorded run again from the bench, the scenario, the seed and the recorded inputs, and compares the hash of
 * the block after every tick. Throws RecordingError when the recording cannot be read, BuildError when its bench cannot
 * be built by this version. Stops when `onProgress` says false.
 */
export async function rederive(file: string, onProgress: (share: number) => boolean): Promise<Rederivation> {
  const recording = new Recording(file);
  try {
    return await derive(recording, onProgress);
  } finally {
    recording.close();
  }
}

async function derive(recording: Recording, onProgress: (share: number) => boolean): Promise<Rederivation> {
  const { header } = recording;
  const overview = recording.examine();
  if (overview.rows === 0) throw new RecordingError(`${recording.file}: there is no tick in it`);
  const texts = Object.fromEntries(header.bench.files.map((one) => [one.path, one.text]));
  const spec = readBench(header.bench.files[0]!.path, catalogue, memoryFiles(texts));
  const script = JSON.parse(String(header.options['script'])) as ScriptSpec;
  const assembly = assemble(spec, { seed: header.seed, script });
  const inputs = new RecordedInputs(recording);
  const states = new RecordedStates(recording);
  let tick = assembly.firstTick;
  spec.map.links.forEach((link, number) => {
    const transport: Transport = {
      poll: (into) => inputs.next(tick, number, into),
      send: (_bytes, length) => length,
    };
    assembly.exchange.attach(link.name, transport);
  });
  // what hands did came in behind the links
  const handLink = spec.map.links.length;
  if (header.links.length > handLink) assembly.hands.source = { poll: (into) => inputs.next(tick, handLink, into) };
  const lifeLink = handLink + 1;
  const word = new Uint8Array(16);
  const remarks: string[] = [];
  if (header.software.node !== process.version)
    remarks.push(
      `recorded with Node ${header.software.node}, derived with ${process.version}: exp, tanh and sin may differ in the last bit`,
    );
  if (header.software.version !== softwareVersion())
    remarks.push(`recorded with oilspring ${header.software.version}, derived with ${softwareVersion()}`);
  if (overview.ending.how !== 'complete')
    remarks.push(
      `the recording ${overview.ending.how === 'damaged' ? 'is damaged' : 'ended early'}: ${overview.ending.what}`,
    );

  const last = overview.lastTick;
  const total = last - assembly.firstTick + 1;
  let compared = 0;
  let missing = 0;
  let firstTick: number | undefined;
  let stopped = false;
  for (; tick <= last; tick += 1) {
    if (header.links.length > lifeLink && inputs.next(tick, lifeLink, word) >= 0) assembly.tick.beginAfterRun(tick);
    assembly.tick.run(tick);
    const same = states.compare(tick, assembly.tick.hash);
    if (same < 0) missing += 1;
    else compared += 1;
    if (same === 0 && firstTick === undefined) firstTick = tick;
    if (firstTick !== undefined) {
      // on to the next snapshot, to name the states
      const snapshot = states.snapshot(tick);
      if (snapshot !== undefined) {
        const different = Array.from(snapshot, (recorded, i) => ({
          path: assembly.layout.path(i),
          recorded,
          derived: assembly.block[i]!,
        })).filter((one) => !Object.is(one.recorded, one.derived));
        if (different.length > 0) {
          return {
            identical: false,
            compared,
            missing,
            hash: hashNow(),
            step: header.step,
            firstTick,
            snapshotTick: tick,
            states: different,
            ending: overview.ending.how,
            remarks,
            stopped,
          };
        }
      }
    }
    if ((tick & 511) !== 0) continue;
    // lets Ctrl-C be heard
    await setImmediate();
    if (!onProgress((tick - assembly.firstTick) / total)) {
      stopped = true;
      break;
    }
  }
  if (missing > 0) remarks.push(`${missing} ticks have no row in the recording and were not compared`);
  const hash = hashNow();
  return {
    identical: firstTick === undefined && compared > 0,
    compared,
    missing,
    hash,
    step: header.step,
    ...(firstTick === undefined ? {} : { firstTick }),
    states: [],
    ending: overview.ending.how,
    remarks,
    stopped,
  };

  function hashNow(): string {
    return hashText(assembly.tick.hash[0]!, assembly.tick.hash[1]!);
  }
}
