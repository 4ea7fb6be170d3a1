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

// once through the duty: code that runs first in the middle of it is compiled there
run(10_000);
assembly.reset();
tick = assembly.firstTick;
run(truck.ticks - assembly.firstTick);
const meter = new CollectionMeter();
assembly.reset();
tick = assembly.firstTick;
meter.start();
run(ticks);
const { collections, allocated } = meter.stop();
console.log(JSON.stringify({ collections, allocated, tick, distance: truck.value('body.distance') }));
