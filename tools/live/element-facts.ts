import type { ElementFacts, PortFacts } from '../../bridge/live/source.js';
import type { ElementInstance, Quantity, SignalInfo } from '../../runtime/contract.js';

/** Names of signals that tell most of an element at a glance, best first. */
const telling: readonly RegExp[] = [
  /^pressure$/,
  /^flow$/,
  /^torque$/,
  /^speed$/,
  /^velocity$/,
  /^displacement$/,
  /^gear$/,
  /^oilVolume$/,
  /^level$/,
  /^force$/,
  /^gasTemperature$/,
  /^temperature$/,
  /^oilTemperature$/,
  /^slip$/,
];
/** Signals from 0 to 1 that say whether something is open, with the words for both ends. */
const positions: readonly [RegExp, RegExp, string, string][] = [
  [/clutch/, /^application$/, 'open', 'engaged'],
  [/brake/, /^application$/, 'released', 'applied'],
  [/./, /^(opening|position)$/, 'closed', 'open'],
];

/** An element as the circuit's drawing needs it; names only signals among `recorded`. */
export function elementFacts(element: ElementInstance, recorded: ReadonlyMap<string, SignalInfo>): ElementFacts {
  const { name, kind } = element;
  const path = (signal: string) => (recorded.has(`${name}.${signal}`) ? `${name}.${signal}` : undefined);
  const signals = [...Object.keys(kind.states), ...Object.keys(kind.readings)];
  const shows = telling
    .flatMap((pattern) => signals.filter((signal) => pattern.test(signal)).map(path))
    .filter((one) => one !== undefined);
  const flow = kind.role === 'branch' ? (path('flow') ?? path('torque')) : undefined;
  const place = positions.find(
    ([kinds, pattern]) =>
      kinds.test(kind.kind) && signals.some((signal) => pattern.test(signal) && path(signal) !== undefined),
  );
  const position =
    place === undefined
      ? undefined
      : path(signals.find((signal) => place[1].test(signal) && path(signal) !== undefined) ?? '');
  return {
    name,
    kind: kind.kind,
    role: kind.role,
    about: kind.about,
    ports: ports(element),
    parameters: Object.entries(element.parameters).flatMap(([parameter, value]) => {
      const declared: Quantity | undefined = kind.parameters[parameter];
      return declared === undefined || !Number.isFinite(value)
        ? []
        : [{ name: parameter, value, unit: declared.unit, about: declared.about }];
    }),
    shows: [...new Set(shows)],
    ...(flow === undefined ? {} : { flow }),
    ...(place === undefined || position === undefined
      ? {}
      : { position: { path: position, zero: place[2], one: place[3] } }),
    faults: Object.entries(kind.commands).flatMap(([command, declared]) => {
      const at = path(command);
      return declared.fault && at !== undefined ? [{ path: at, rest: declared.rest, about: declared.about }] : [];
    }),
  };
}

/** Declared order, which is that in which a flow counts as positive: from the first to the second. */
function ports({ kind, connections }: ElementInstance): PortFacts[] {
  return Object.entries(kind.ports).map(([port, portKind]) => {
    const tie = connections[port];
    return tie === undefined
      ? { name: port, kind: portKind }
      : { name: port, kind: portKind, store: tie.store, storePort: tie.port, ratio: tie.ratio };
  });
}
