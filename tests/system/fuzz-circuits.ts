import { FuzzTally } from './fuzz-tally.js';

/**
 * The long version of circuit fuzzing: `npm run fuzz -- [circuits] [first seed]`. Prints what it meets and how far it is;
 * Ctrl-C ends it with its summary. Exit code 1 when a circuit was at fault.
 */
const count = Number(process.argv[2] ?? 10_000);
const first = Number(process.argv[3] ?? 1);
if (!(count > 0 && Number.isInteger(first))) {
  process.stderr.write('fuzz: how many circuits, and the first seed, as whole numbers: npm run fuzz -- 10000 1\n');
  process.exit(2);
}
const tally = new FuzzTally();
let stopped = false;
process.on('SIGINT', () => {
  stopped = true;
});
const began = Date.now();
let told = began;
let seed = first;
for (; tally.accepted < count && !stopped; seed += 1) {
  const said = tally.take(seed);
  if (said) process.stdout.write(`${said}\n`);
  if (Date.now() - told > 20_000) {
    told = Date.now();
    const left = ((told - began) / tally.accepted) * (count - tally.accepted);
    process.stdout.write(`${tally.accepted} of ${count}, ${(left / 60_000).toFixed(0)} min to go\n`);
    // lets a signal in
    await new Promise((go) => setImmediate(go));
  }
}
process.stdout.write(`seeds ${first} to ${seed - 1}: ${tally.summary()}\n`);
const missing = tally.missing();
if (missing.length > 0) process.stdout.write(`elements in no circuit: ${missing.join(', ')}\n`);
process.exitCode = tally.faults.length > 0 ? 1 : 0;
