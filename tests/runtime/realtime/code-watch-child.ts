import { CodeWatch, methodsOf } from '../../../runtime/realtime/code-watch.js';
import { CollectionMeter } from '../../../runtime/realtime/collection-meter.js';

class Sum {
  total = 0;
  of(values: ArrayLike<number>): void {
    for (let i = 0; i < values.length; i += 1) this.total += values[i]!;
  }
  late(values: ArrayLike<number>): void {
    for (let i = 0; i < values.length; i += 1) this.total -= values[i]!;
  }
  never(): void {
    this.total = 0;
  }
}

const sum = new Sum();
const values = new Float64Array(200).fill(0.5);
const watch = new CodeWatch(methodsOf([sum]));

/** Calls until the engine has compiled it; its compiler works beside this thread. */
async function heat(call: () => void, wanted: number): Promise<void> {
  for (let round = 0; round < 200 && watch.count() < wanted; round += 1) {
    for (let i = 0; i < 2000; i += 1) call();
    await new Promise((resolve) => setTimeout(resolve, 5));
  }
}

await heat(() => sum.of(values), 1);
watch.begin();
for (let tick = 0; tick < 9; tick += 1) watch.check(tick);
const quiet = watch.report();

const meter = new CollectionMeter();
let bytes = Number.POSITIVE_INFINITY;
for (let round = 0; round < 3; round += 1) {
  meter.start();
  for (let tick = 100; tick < 50_100; tick += 1) watch.check(0);
  bytes = Math.min(bytes, meter.stop().allocated / 50_000);
}

// an argument of another shape: the compiled code does not fit it
for (let i = 0; i < 20; i += 1) sum.of(['a', {}, 1] as unknown as number[]);
for (let tick = 1000; tick < 1006; tick += 1) watch.check(tick);
await heat(() => sum.late(values), 1);
for (let tick = 2000; tick < 2006; tick += 1) watch.check(tick);
const troubled = watch.report();
watch.finish(3000);
console.log(JSON.stringify({ quiet, troubled, bytes, finished: watch.report() }));
