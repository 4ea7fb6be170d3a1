import fc from 'fast-check';
import type { Database, DatabaseMessage, DatabaseSignal } from '../../../bridge/dbc/database.js';
import { frameFormats, usualAttributes } from '../../../bridge/dbc/database.js';
import type { CanLayout } from '../../../bridge/message-map.js';

/** Bits in the order in which a big-endian signal runs: sawtooth number of a bit number, and back (the same map). */
const sawtooth = (bit: number): number => (bit >> 3) * 8 + 7 - (bit & 7);

interface Piece {
  readonly bits: number;
  readonly big: boolean;
  readonly signed: boolean;
  readonly gap: number;
  readonly scale: number;
  readonly offset: number;
  readonly unit: string;
  readonly named: boolean;
}

const anyPiece: fc.Arbitrary<Piece> = fc.record({
  bits: fc.oneof(fc.integer({ min: 1, max: 24 }), fc.constantFrom(32, 33, 48)),
  big: fc.boolean(),
  signed: fc.boolean(),
  gap: fc.nat(5),
  scale: fc.constantFrom(1, 0.1, 0.01, 0.125, 2, -0.5, 1e-7),
  offset: fc.constantFrom(0, -40, 273.15, 1e6),
  unit: fc.constantFrom('', 'bar(a)', 'N m', '°C', '%', 'say "when"'),
  named: fc.boolean(),
});

/** Signals side by side: little-endian ones from the first bit up, big-endian ones from the other end in their own order. */
function place(
  pieces: readonly Piece[],
  bytes: number,
  from: number,
  prefix: string,
  more: Partial<CanLayout> = {},
): DatabaseSignal[] {
  const placed: DatabaseSignal[] = [];
  const taken = new Set<number>(Array.from({ length: from }, (_, i) => i));
  pieces.forEach((piece, i) => {
    for (let start = piece.gap + from; start + piece.bits <= bytes * 8; start += 1) {
      const bits = Array.from({ length: piece.bits }, (_, k) => (piece.big ? sawtooth(start + k) : start + k));
      if (bits.some((bit) => taken.has(bit))) continue;
      for (const bit of bits) taken.add(bit);
      const float = piece.bits === 32 && piece.named;
      placed.push({
        name: `${prefix}${i}`,
        layout: {
          startBit: piece.big ? sawtooth(start) : start,
          length: piece.bits,
          byteOrder: piece.big ? 'big' : 'little',
          signed: piece.signed && !float,
          float,
          scale: piece.scale,
          offset: piece.offset,
          ...more,
        },
        least: -10,
        most: 1000.5,
        unit: piece.unit,
        receivers: i % 2 === 0 ? ['Bench', 'Spy'] : [],
        comment: i % 3 === 0 ? `a comment,\nof two lines; with "quotes"` : '',
        values:
          piece.named && !float
            ? [
                [0, 'off'],
                [1, 'on "now"'],
              ]
            : [],
        attributes: i % 4 === 1 ? { [usualAttributes.startValue]: 3 } : {},
      });
      return;
    }
  });
  return placed;
}

const anyMessage = (number: number): fc.Arbitrary<DatabaseMessage> =>
  fc
    .record({
      bytes: fc.constantFrom(1, 4, 8, 8, 12, 24, 64),
      extended: fc.boolean(),
      identifier: fc.nat(0x3f),
      pieces: fc.array(anyPiece, { minLength: 1, maxLength: 8 }),
      kind: fc.constantFrom('plain', 'plain', 'simple', 'extended'),
      other: fc.array(anyPiece, { minLength: 1, maxLength: 3 }),
      senders: fc.constantFrom([], ['Bench'], ['Controller'], ['Controller', 'Bench']),
    })
    .map(({ bytes, extended, identifier, pieces, kind, other, senders }) => {
      const flexible = bytes > 8;
      let signals: DatabaseSignal[];
      if (kind === 'plain' || bytes < 4) signals = place(pieces, bytes, 0, 'S');
      else {
        const [selector] = place(
          [{ bits: 8, big: false, signed: false, gap: 0, scale: 1, offset: 0, unit: '', named: false }],
          bytes,
          0,
          'Selector',
          { selector: true },
        );
        const values = (list: readonly (readonly [number, number])[]): Partial<CanLayout> => ({
          selectedBy: { signal: selector.name, values: list },
        });
        signals = [
          selector,
          ...place(
            pieces,
            bytes,
            8,
            'A',
            values(
              kind === 'simple'
                ? [[0, 0]]
                : [
                    [0, 3],
                    [7, 7],
                  ],
            ),
          ),
          ...place(other, bytes, 8, 'B', values(kind === 'simple' ? [[5, 5]] : [[4, 5]])),
        ];
      }
      const format = frameFormats.indexOf(`${extended ? 'Extended' : 'Standard'}CAN${flexible ? '_FD' : ''}`);
      return {
        name: `Message${number}`,
        identifier: extended ? 0x18ff0000 + 64 * number + identifier : 64 * (number % 20) + identifier,
        extended,
        bytes,
        flexibleDataRate: flexible,
        bitRateSwitch: flexible && number % 2 === 0,
        senders,
        comment: number % 2 === 0 ? 'what it is for' : '',
        attributes: {
          [usualAttributes.cycle]: 10 * (number + 1),
          ...(format > 0 ? { [usualAttributes.frameFormat]: format } : {}),
          ...(flexible && number % 2 === 0 ? { [usualAttributes.bitRateSwitch]: 1 } : {}),
        },
        signals,
      };
    });

/** Any database of up to six messages: both byte orders, floats, FD lengths, simple and extended multiplexing. */
export const anyDatabase: fc.Arbitrary<Database> = fc
  .integer({ min: 1, max: 6 })
  .chain((count) => fc.tuple(...Array.from({ length: count }, (_, i) => anyMessage(i))))
  .map((messages) => ({
    version: 'of the tests',
    comment: 'invented',
    nodes: [
      { name: 'Bench', comment: 'stands in for the vehicle', attributes: {} },
      { name: 'Controller', comment: '', attributes: { Variant: 2 } },
      { name: 'Spy', comment: '', attributes: {} },
    ],
    messages,
    valueTables: [
      {
        name: 'OffOn',
        values: [
          [0, 'off'],
          [1, 'on'],
        ] as [number, string][],
      },
    ],
    definitions: [
      { name: usualAttributes.cycle, of: 'message', type: 'INT', least: 0, most: 65535, usual: 0 },
      { name: usualAttributes.frameFormat, of: 'message', type: 'ENUM', choices: frameFormats, usual: 'StandardCAN' },
      { name: usualAttributes.bitRateSwitch, of: 'message', type: 'ENUM', choices: ['0', '1'], usual: '0' },
      { name: usualAttributes.startValue, of: 'signal', type: 'FLOAT', least: 0, most: 1e9, usual: 0 },
      { name: 'Variant', of: 'node', type: 'INT', least: 0, most: 9 },
      { name: 'BusType', of: 'database', type: 'STRING', usual: 'CAN' },
    ],
    attributes: { BusType: 'CAN FD' },
  }));
