/**
 * What a CAN transport has to tell besides frames, as inputs of 8 bytes, so that the record holds them and a run derived
 * again counts the same. A frame is 16 or 72 bytes long: the length tells them apart.
 *
 * | offset | type | what                                                          |
 * |-------:|------|------------------------------------------------------------------|
 * |      0 | u8   | kind, see `noteKinds`                                            |
 * |      1 | u8   | `interface`: the new state, see `interfaceStates`                |
 * |      2 | u16  | `unsent`: error number of the last one                           |
 * |      4 | u32  | the others: how many since the last note of the kind             |
 */
export const noteSize = 8;

export const noteKinds = { interface: 1, dropped: 2, queueFull: 3, unsent: 4, malformed: 5 } as const;

export const interfaceStates = { up: 0, down: 1, gone: 2 } as const;

export function writeNote(into: Uint8Array, kind: number, state: number, error: number, count: number): number {
  into[0] = kind;
  into[1] = state;
  into[2] = error;
  into[3] = error >>> 8;
  into[4] = count;
  into[5] = count >>> 8;
  into[6] = count >>> 16;
  into[7] = count >>> 24;
  return noteSize;
}

export function noteCount(note: Uint8Array): number {
  return note[4] + note[5] * 0x100 + note[6] * 0x10000 + note[7] * 0x1000000;
}

/** Counts of a transport until they are told, one note each. Nothing is allocated. */
export class NoteQueue {
  dropped = 0;
  queueFull = 0;
  unsent = 0;
  unsentReason = 0;
  malformed = 0;
  private state = -1;

  /** The interface has come into a state. Only the newest that was not told yet is told. */
  interface(state: number): void {
    this.state = state;
  }

  /** Writes the next note into `into`; its length, or -1 when there is nothing to tell. */
  take(into: Uint8Array): number {
    if (this.state >= 0) {
      const length = writeNote(into, noteKinds.interface, this.state, 0, 1);
      this.state = -1;
      return length;
    }
    if (this.dropped > 0) {
      const length = writeNote(into, noteKinds.dropped, 0, 0, this.dropped);
      this.dropped = 0;
      return length;
    }
    if (this.queueFull > 0) {
      const length = writeNote(into, noteKinds.queueFull, 0, 0, this.queueFull);
      this.queueFull = 0;
      return length;
    }
    if (this.unsent > 0) {
      const length = writeNote(into, noteKinds.unsent, 0, this.unsentReason, this.unsent);
      this.unsent = 0;
      return length;
    }
    if (this.malformed > 0) {
      const length = writeNote(into, noteKinds.malformed, 0, 0, this.malformed);
      this.malformed = 0;
      return length;
    }
    return -1;
  }
}
