import { payloadAt } from './can-frame.js';
import { interfaceStates, noteCount, noteKinds } from './can-notes.js';
import type { canLinkCounts } from './link-counts.js';

type Slots = Readonly<Record<keyof typeof canLinkCounts, number>>;

/** States of a CAN controller (ISO 11898-1 fault confinement; `warning` is active with a counter of 96 or more). */
export const controllerStates = { active: 0, warning: 1, passive: 2, busOff: 3 } as const;

// linux/can/error.h: classes in the identifier, details in the payload
const ERROR_CONTROLLER = 0x4;
const ERROR_BUS_OFF = 0x40;
const ERROR_RESTARTED = 0x100;
const ERROR_COUNTERS = 0x200;
const CONTROLLER_WARNING = 0x04 | 0x08;
const CONTROLLER_PASSIVE = 0x10 | 0x20;
const CONTROLLER_ACTIVE = 0x40;

/** As if the CAN controller had gone bus-off, or had been restarted after it. */
export function reportBusOff(block: Float64Array, slots: Slots, off: boolean): void {
  block[slots.errorFrames] += 1;
  block[slots.controllerState] = off ? controllerStates.busOff : controllerStates.active;
  if (off) block[slots.busOffs] += 1;
  else block[slots.restarts] += 1;
}

/** What an error frame says of the CAN controller, into the slots of a link. */
export function useErrorFrame(block: Float64Array, slots: Slots, word: number, frame: Uint8Array): void {
  block[slots.errorFrames] += 1;
  const state = block[slots.controllerState];
  let next = state;
  const detail = frame[payloadAt + 1];
  if ((word & ERROR_CONTROLLER) !== 0) {
    if ((detail & CONTROLLER_PASSIVE) !== 0) next = controllerStates.passive;
    else if ((detail & CONTROLLER_WARNING) !== 0) next = controllerStates.warning;
    else if ((detail & CONTROLLER_ACTIVE) !== 0) next = controllerStates.active;
  }
  if ((word & ERROR_COUNTERS) !== 0 || next !== state) {
    block[slots.transmitErrors] = frame[payloadAt + 6];
    block[slots.receiveErrors] = frame[payloadAt + 7];
  }
  if ((word & ERROR_RESTARTED) !== 0) {
    block[slots.restarts] += 1;
    next = controllerStates.active;
  }
  if ((word & ERROR_BUS_OFF) !== 0) next = controllerStates.busOff;
  if (next === state) return;
  block[slots.controllerState] = next;
  if (next === controllerStates.busOff) block[slots.busOffs] += 1;
  else if (next === controllerStates.passive && state < next) block[slots.passives] += 1;
  else if (next === controllerStates.warning && state < next) block[slots.warnings] += 1;
}

/** What a note of the transport says, into the slots of a link; false when it is none. */
export function useNote(block: Float64Array, slots: Slots, note: Uint8Array): boolean {
  switch (note[0]) {
    case noteKinds.interface: {
      const state = note[1];
      if (state > interfaceStates.gone) return false;
      block[slots.interfaceState] = state;
      if (state === interfaceStates.up) block[slots.ups] += 1;
      else if (state === interfaceStates.down) block[slots.downs] += 1;
      else block[slots.deletions] += 1;
      return true;
    }
    case noteKinds.dropped:
      block[slots.dropped] += noteCount(note);
      return true;
    case noteKinds.queueFull:
      block[slots.queueFull] += noteCount(note);
      return true;
    case noteKinds.unsent:
      block[slots.unsent] += noteCount(note);
      return true;
    case noteKinds.malformed:
      block[slots.malformed] += noteCount(note);
      return true;
    default:
      return false;
  }
}
