import type { Catalogue } from '../configs/bench-spec.js';
import * as fluids from '../plants/fluids.js';
import * as instruments from '../plants/instruments.js';
import * as elements from '../plants/library.js';
import { portKinds } from '../plants/ports.js';
import type { ElementKind } from '../runtime/contract.js';
import type { InstrumentKind } from '../runtime/instrument.js';

/** Everything that the project's own library offers to a bench file. */
export const library: Catalogue = {
  portKinds,
  elements: Object.values(elements) as ElementKind[],
  instruments: Object.values(instruments) as InstrumentKind[],
  fluids: (Object.values(fluids) as unknown[]).filter((one): one is Catalogue['fluids'][number] => typeof one === 'object' && one !== null && 'kind' in one && 'values' in one),
};
