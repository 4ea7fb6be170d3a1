import { CanCodec, type PayloadCodec } from './can-codec.js';
import { TroubleCodec } from './j1939/trouble-codec.js';
import type { MessageSpec } from './message-map.js';

/** The codec of a message's payload on CAN. */
export function makeCodec(message: MessageSpec): PayloadCodec {
  return message.signals.some((signal) => signal.trouble !== undefined)
    ? new TroubleCodec(message)
    : new CanCodec(message);
}
