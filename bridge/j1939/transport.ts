import type { BlockLayout } from '../../runtime/block.js';
import { identifierFlags, payloadAt, writeFrameHead } from '../can-frame.js';
import { identifierOf, isDirected, partsOf } from './identifier.js';

/**
 * Transport protocol of SAE J1939-21 (section 5.10): messages of 9 to 1785 bytes in packets of 7, announced to everybody
 * (BAM) or agreed on with one destination (RTS, CTS, end of message acknowledgement). What both ends remember stands in
 * the block; nothing is allocated in a call.
 */
export const longestMessage = 1785;
export const parameterGroups = {
  connection: 0xec00,
  data: 0xeb00,
  request: 0xea00,
  acknowledgement: 0xe800,
  addressClaim: 0xee00,
} as const;
export const controls = { request: 16, clear: 17, done: 19, announce: 32, abort: 255 } as const;
/** Reasons of a connection abort: already busy, no room for it, time is over. */
export const abortReasons = { busy: 1, resources: 2, timeout: 3 } as const;
/** Time-outs, s: T1 between packets, T2 after a CTS, T3 after the last packet, T4 after a CTS that says wait. */
export const timeOuts = { t1: 0.75, t2: 1.25, t3: 1.25, t4: 1.05 } as const;
/** Least time between two packets of an announced message, s (50 to 200 ms). */
export const announcedSpacing = 0.05;
/** Packets that the receiving end asks for at a time. */
const window = 16;

const phases = { idle: 0, announced: 1, waiting: 2, sending: 3, held: 4 } as const;

/** Writes a classic frame of 8 bytes with a 29 bit identifier, payload filled with `0xff`. */
export function protocolFrame(
  frame: Uint8Array,
  priority: number,
  pgn: number,
  destination: number,
  source: number,
): void {
  const word = (priority << 26) | ((pgn | destination) << 8) | source | identifierFlags.extended | 0;
  writeFrameHead(frame, word, 8, 0);
  for (let i = 0; i < 8; i += 1) frame[payloadAt + i] = 0xff;
}

function writeControl(frame: Uint8Array, pgn: number, source: number, destination: number, control: number): void {
  protocolFrame(frame, 7, parameterGroups.connection, destination, source);
  frame[payloadAt] = control;
  frame[payloadAt + 5] = pgn;
  frame[payloadAt + 6] = pgn >> 8;
  frame[payloadAt + 7] = pgn >> 16;
}

/** The sending end of one message. */
export class TransportSender {
  readonly pgn: number;
  readonly source: number;
  readonly destination: number;
  private readonly phase: number;
  private readonly length: number;
  /** Next packet, from 1, and the last that may go now. */
  private readonly packet: number;
  private readonly last: number;
  /** Tick in which the next packet may go, and in which patience ends. */
  private readonly due: number;
  private readonly deadline: number;
  /** Control byte that is to go. */
  private readonly control: number;
  private readonly data: number;

  constructor(
    identifier: number,
    path: string,
    private readonly capacity: number,
    layout: BlockLayout,
    private readonly step: number,
  ) {
    const parts = partsOf(identifier);
    this.pgn = parts.pgn;
    this.source = parts.source;
    this.destination = isDirected(parts.pgn) ? (parts.destination ?? 255) : 255;
    const add = (name: string): number => layout.add(`${path}.transport${name}`);
    this.phase = add('Phase');
    this.length = add('Length');
    this.packet = add('Packet');
    this.last = add('Last');
    this.due = add('Due');
    this.deadline = add('Deadline');
    this.control = add('Control');
    this.data = layout.addMany(`${path}.transportData`, capacity);
  }

  /** Begins to send; false when the message before it is still on its way. */
  begin(block: Float64Array, tick: number, bytes: Uint8Array, length: number): boolean {
    if (block[this.phase] !== phases.idle || length > this.capacity) return false;
    for (let i = 0; i < length; i += 1) block[this.data + i] = bytes[i];
    block[this.length] = length;
    block[this.packet] = 1;
    block[this.last] = 0;
    block[this.due] = tick;
    const announced = this.destination === 255;
    block[this.phase] = announced ? phases.announced : phases.waiting;
    block[this.control] = announced ? controls.announce : controls.request;
    block[this.deadline] = tick + Math.ceil(timeOuts.t3 / this.step);
    return true;
  }

  /** A CTS, an acknowledgement or an abort from the destination. */
  hear(block: Float64Array, tick: number, payload: Uint8Array): void {
    if (block[this.phase] <= phases.announced) return;
    const control = payload[0];
    if (control === controls.done || control === controls.abort) block[this.phase] = phases.idle;
    else if (control === controls.clear) {
      const packets = Math.ceil(block[this.length] / 7);
      const first = payload[2];
      if (payload[1] === 0) {
        block[this.phase] = phases.held;
        block[this.deadline] = tick + Math.ceil(timeOuts.t4 / this.step);
      } else if (first >= 1 && first <= packets) {
        block[this.phase] = phases.sending;
        block[this.packet] = first;
        block[this.last] = Math.min(packets, first + payload[1] - 1);
        block[this.due] = tick;
      }
    }
  }

  /** Writes the next frame that may go in this tick; false when there is none. */
  write(block: Float64Array, tick: number, frame: Uint8Array): boolean {
    const phase = block[this.phase];
    if (phase === phases.idle) return false;
    if (block[this.control] !== 0) {
      const control = block[this.control] | 0;
      writeControl(frame, this.pgn, this.source, this.destination, control);
      block[this.control] = 0;
      if (control === controls.abort) {
        frame[payloadAt + 1] = abortReasons.timeout;
        block[this.phase] = phases.idle;
        return true;
      }
      const length = block[this.length] | 0;
      frame[payloadAt + 1] = length;
      frame[payloadAt + 2] = length >> 8;
      frame[payloadAt + 3] = Math.ceil(length / 7);
      if (control === controls.announce) {
        block[this.last] = Math.ceil(length / 7);
        block[this.due] = tick + Math.ceil(announcedSpacing / this.step);
      }
      return true;
    }
    if (phase === phases.waiting || phase === phases.held) {
      if (tick < block[this.deadline]) return false;
      block[this.control] = controls.abort;
      return this.write(block, tick, frame);
    }
    if (tick < block[this.due]) return false;
    this.writePacket(block, tick, frame, phase === phases.announced);
    return true;
  }

  /** True while a message is on its way. */
  busy(block: Float64Array): boolean {
    return block[this.phase] !== phases.idle;
  }

  private writePacket(block: Float64Array, tick: number, frame: Uint8Array, announced: boolean): void {
    const packet = block[this.packet] | 0;
    protocolFrame(frame, 7, parameterGroups.data, this.destination, this.source);
    frame[payloadAt] = packet;
    const from = 7 * (packet - 1);
    const count = Math.min(7, block[this.length] - from);
    for (let i = 0; i < count; i += 1) frame[payloadAt + 1 + i] = block[this.data + from + i];
    block[this.packet] = packet + 1;
    block[this.due] = tick + (announced ? Math.ceil(announcedSpacing / this.step) : 1);
    if (packet < block[this.last]) return;
    if (announced) block[this.phase] = phases.idle;
    else {
      block[this.phase] = phases.waiting;
      block[this.deadline] = tick + Math.ceil(timeOuts.t3 / this.step);
    }
  }
}

/** What the receiving end makes of a frame. */
export const transportVerdicts = { nothing: 0, complete: 1, failed: 2 } as const;

/** The receiving end of one message. */
export class TransportReceiver {
  readonly pgn: number;
  readonly source: number;
  /** Slot: bytes of the message that is being received, or that was. */
  readonly length: number;
  private readonly phase: number;
  private readonly packet: number;
  private readonly last: number;
  private readonly deadline: number;
  private readonly control: number;
  private readonly reason: number;
  /** Address that it came to. */
  private readonly own: number;
  private readonly data: number;

  constructor(
    identifier: number,
    path: string,
    private readonly capacity: number,
    layout: BlockLayout,
    private readonly step: number,
  ) {
    const parts = partsOf(identifier);
    this.pgn = parts.pgn;
    this.source = parts.source;
    const add = (name: string): number => layout.add(`${path}.transport${name}`);
    this.length = add('Length');
    this.phase = add('Phase');
    this.packet = add('Packet');
    this.last = add('Last');
    this.deadline = add('Deadline');
    this.control = add('Control');
    this.reason = add('Reason');
    this.own = add('Own');
    this.data = layout.addMany(`${path}.transportData`, capacity);
  }

  /** An announcement or a request to send, to `own` (255: everybody). */
  open(block: Float64Array, tick: number, payload: Uint8Array, own: number, fits: boolean): number {
    const length = payload[1] | (payload[2] << 8);
    const announced = payload[0] === controls.announce;
    block[this.own] = own;
    if (!fits || length > this.capacity || payload[3] !== Math.ceil(length / 7)) {
      block[this.phase] = phases.idle;
      if (!announced) this.abort(block, abortReasons.resources);
      return transportVerdicts.failed;
    }
    const broken = block[this.phase] !== phases.idle;
    block[this.length] = length;
    block[this.packet] = 1;
    block[this.phase] = announced ? phases.announced : phases.waiting;
    block[this.control] = announced ? 0 : controls.clear;
    block[this.last] = announced ? payload[3] : Math.min(window, payload[3]);
    block[this.deadline] = tick + Math.ceil((announced ? timeOuts.t1 : timeOuts.t2) / this.step);
    return broken ? transportVerdicts.failed : transportVerdicts.nothing;
  }

  /** A packet, sent to `own`. */
  take(block: Float64Array, tick: number, payload: Uint8Array, own: number): number {
    if (block[this.phase] === phases.idle || block[this.own] !== own) return transportVerdicts.nothing;
    const packet = block[this.packet] | 0;
    if (payload[0] !== packet) {
      // An announced message cannot be asked for again; of an agreed one the window is asked for from here on.
      if (block[this.phase] === phases.announced) {
        block[this.phase] = phases.idle;
        return transportVerdicts.failed;
      }
      block[this.control] = controls.clear;
      return transportVerdicts.nothing;
    }
    const length = block[this.length] | 0;
    const from = 7 * (packet - 1);
    for (let i = 0; i < 7 && from + i < length; i += 1) block[this.data + from + i] = payload[1 + i];
    block[this.packet] = packet + 1;
    block[this.deadline] = tick + Math.ceil(timeOuts.t1 / this.step);
    if (7 * packet >= length) {
      if (block[this.phase] !== phases.announced) block[this.control] = controls.done;
      block[this.phase] = phases.idle;
      return transportVerdicts.complete;
    }
    if (packet === block[this.last] && block[this.phase] !== phases.announced) {
      block[this.last] = Math.min(Math.ceil(length / 7), packet + window);
      block[this.control] = controls.clear;
      block[this.deadline] = tick + Math.ceil(timeOuts.t2 / this.step);
    }
    return transportVerdicts.nothing;
  }

  /** The sending end gave up. */
  aborted(block: Float64Array): number {
    if (block[this.phase] === phases.idle) return transportVerdicts.nothing;
    block[this.phase] = phases.idle;
    return transportVerdicts.failed;
  }

  /** Time passes: `failed` when patience ends in this tick. */
  grow(block: Float64Array, tick: number): number {
    if (block[this.phase] === phases.idle || tick < block[this.deadline]) return transportVerdicts.nothing;
    if (block[this.phase] !== phases.announced) this.abort(block, abortReasons.timeout);
    block[this.phase] = phases.idle;
    return transportVerdicts.failed;
  }

  /** The bytes of the message that is complete, into `bytes`; its length. */
  read(block: Float64Array, bytes: Uint8Array): number {
    const length = block[this.length] | 0;
    for (let i = 0; i < length; i += 1) bytes[i] = block[this.data + i];
    return length;
  }

  /** Writes the answer that is due: CTS, acknowledgement or abort; false when there is none. */
  write(block: Float64Array, frame: Uint8Array): boolean {
    const control = block[this.control] | 0;
    if (control === 0) return false;
    block[this.control] = 0;
    writeControl(frame, this.pgn, block[this.own] | 0, this.source, control);
    const length = block[this.length] | 0;
    if (control === controls.clear) {
      frame[payloadAt + 1] = block[this.last] - block[this.packet] + 1;
      frame[payloadAt + 2] = block[this.packet];
    } else if (control === controls.done) {
      frame[payloadAt + 1] = length;
      frame[payloadAt + 2] = length >> 8;
      frame[payloadAt + 3] = Math.ceil(length / 7);
    } else frame[payloadAt + 1] = block[this.reason];
    return true;
  }

  private abort(block: Float64Array, reason: number): void {
    block[this.control] = controls.abort;
    block[this.reason] = reason;
  }
}

/** Identifier of a message to one destination or everybody, for tests and tools. */
export function directedIdentifier(priority: number, pgn: number, destination: number, source: number): number {
  return identifierOf({ priority, pgn, source, destination });
}
