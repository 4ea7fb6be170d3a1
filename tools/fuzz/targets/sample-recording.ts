import { Packr } from 'msgpackr';
import { crc32 } from '../../../runtime/recording/crc32.js';
import { FORMAT, FRAME, MAGIC } from '../../../runtime/recording/format.js';

const packr = new Packr({ useRecords: false, variableMapSize: true });

/** A small recording with a block of each kind. */
export function sampleRecording(): Uint8Array {
  const bin = (...values: number[]) => Buffer.from(values);
  const header = {
    format: FORMAT,
    run: 'sample',
    created: '2024-05-01T10:00:00.000Z',
    software: { version: '0', node: 'v20', v8: '11' },
    machine: {},
    bench: { name: 'sample', files: [{ path: 'bench.yaml', text: '' }] },
    scenario: null,
    seed: 7,
    step: 1e-3,
    pace: 'fast',
    options: {},
    signals: [{ path: 'line.pressure', unit: 'Pa', about: '', group: 'state' }],
    events: { kinds: [{ name: 'started', severity: 'note', text: '' }], subjects: ['line'] },
    links: ['powertrain'],
    block: ['line.mass'],
  };
  const blocks: object[] = [
    { k: 'header', ...header },
    { k: 'inputs', first: 0, links: bin(0, 0, 0, 0), lengths: bin(1, 0, 0, 0, 2, 0, 0, 0), bytes: bin(1, 2, 3) },
    { k: 'events', first: 1, codes: bin(0, 0, 0, 0), subjects: bin(0, 0, 0, 0), values: Buffer.alloc(24) },
    { k: 'rows', first: 0, hashes: Buffer.alloc(16), data: Buffer.alloc(8) },
    { k: 'rows', ticks: Buffer.from(Float64Array.of(2, 4).buffer), hashes: Buffer.alloc(16), data: Buffer.alloc(8) },
    { k: 'snapshot', tick: 4, block: Buffer.alloc(8) },
    { k: 'stamp', tick: 4, wall: 1e12 },
    { k: 'end', rows: 4, inputs: 2, events: 1, dropped: 0, overflows: 0, summary: { verdict: 'pass' } },
  ];
  return Uint8Array.from(Buffer.concat([Buffer.from(MAGIC), ...blocks.map((block, n) => framed({ n, ...block }))]));
}

function framed(fields: object): Buffer {
  const payload = packr.pack(fields);
  const head = Buffer.alloc(FRAME);
  head.writeUInt32LE(payload.length, 0);
  head.writeUInt32LE(crc32(payload, crc32(head.subarray(0, 4))), 4);
  return Buffer.concat([head, payload]);
}
