import type { MapSignal, MessageMap, MessageSpec, WireType } from '../../bridge/message-map.js';

/** A signal with everything at its plainest; the tests say what matters to them. */
export function signal(name: string, path: string, changes: Partial<MapSignal> = {}): MapSignal {
  return {
    name,
    path,
    about: `${name} of the tests`,
    unit: '1',
    unitScale: 1,
    unitOffset: 0,
    type: 'f32' as WireType,
    scale: 1,
    offset: 0,
    least: -1e6,
    most: 1e6,
    substitute: 0,
    ...changes,
  };
}

export function message(
  name: string,
  identifier: number,
  direction: 'sent' | 'received',
  signals: readonly MapSignal[],
  changes: Partial<MessageSpec> = {},
): MessageSpec {
  return {
    name,
    about: `${name} of the tests`,
    link: 'powertrain',
    direction,
    identifier,
    every: 1,
    phase: 0,
    startDelay: 0,
    timeout: direction === 'received' ? 5 : 0,
    trigger: 'cyclic',
    outOfRange: 'refuse',
    signals,
    ...changes,
  };
}

export function mapOf(...messages: MessageSpec[]): MessageMap {
  return { links: [{ name: 'powertrain', kind: 'udp' }], messages };
}

/** Pressures and a speed out; a torque request, a valve and a gear in. Invented. */
export function sampleMap(): MessageMap {
  const bar = { unit: 'bar(a)', unitScale: 1e5, unitOffset: 0, siUnit: 'Pa' };
  return mapOf(
    message('pressures', 16, 'sent', [
      signal('highPressure', 'highLine.pressure', { ...bar, type: 'u16', scale: 0.01, least: 0, most: 450 }),
      signal('lowPressure', 'lowLine.pressure', { ...bar, type: 'f32', least: 0, most: 50 }),
      signal('oilTemperature', 'tank.temperature', {
        unit: 'degC',
        unitOffset: 273.15,
        type: 'u8',
        offset: -40,
        least: -40,
        most: 150,
      }),
      signal('energy', 'ledger.energy', { unit: 'J', type: 'f64', least: -1e12, most: 1e12 }),
    ]),
    message(
      'speeds',
      17,
      'sent',
      [
        signal('shaftSpeed', 'propShaft.speed', {
          unit: '1/min',
          unitScale: Math.PI / 30,
          type: 'i16',
          least: -6000,
          most: 6000,
        }),
      ],
      {
        every: 10,
        phase: 3,
        startDelay: 20,
      },
    ),
    message('requests', 32, 'received', [
      signal('torque', 'pumpMotor.torqueRequest', { unit: 'N m', type: 'i16', scale: 0.1, least: -800, most: 800 }),
      signal('isolationValve', 'isolation.open', { type: 'u8', least: 0, most: 1, names: { shut: 0, open: 1 } }),
    ]),
    message(
      'gear',
      33,
      'received',
      [
        signal('request', 'gearbox.request', { type: 'i8', least: -1, most: 6 }),
        signal('note', '', { type: 'u32', least: 0, most: 4e9 }),
      ],
      {
        every: 10,
        phase: 2,
        timeout: 30,
        outOfRange: 'saturate',
      },
    ),
  );
}
