import { fluidKinds } from '../plants/fluids.js';
import * as instruments from '../plants/instruments.js';
import * as elements from '../plants/library.js';
import { portKinds } from '../plants/ports.js';
import type { Catalogue } from './bench-spec.js';

/** Everything that the plant library offers to bench files. */
export const catalogue: Catalogue = {
  portKinds,
  elements: Object.values(elements),
  instruments: Object.values(instruments),
  fluids: Object.values(fluidKinds),
};
