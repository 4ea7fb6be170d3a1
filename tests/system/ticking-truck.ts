import { CollectionMeter } from '../../runtime/realtime/collection-meter.js';
import { loadTruckController, makeTruck } from './truck.js';

/** A process of its own: the truck's duty over and over, no journal, and what the heap did meanwhile. */
const ticks = Number(process.argv[2] ?? 60_000);
const truck = makeTruck(await loadTruckController());
const { assembly, barrier } = truck;
let tick = assembly.firstTick;

function run(count: number): void {
  for (let i = 0; i < count; i += 1) {
    assembly.tick.run(tick);
    barrier.end(tick);
    tick += 1;
  }
}

/** What `count` ticks from the start did to the heap. */
function measured(count: number): { collections: number; allocated: number } {
  const meter = new CollectionMeter();
  assembly.reset();
  tick = assembly.firstTick;
  meter.start();
  run(count);
  return meter.stop();
}

// once through the duty: code that runs first in the middle of it is compiled there; on a computer that is busy with other
// work the compiler comes late, and its rounds are no measurement
run(10_000);
for (let round = 0; round < 3; round += 1) {
  const { allocated } = measured(truck.ticks - assembly.firstTick);
  if (allocated < 8 * truck.ticks) break;
}
const { collections, allocated } = measured(ticks);
console.log(JSON.stringify({ collections, allocated, tick, distance: truck.value('body.distance') }));
