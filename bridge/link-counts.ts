import type { EventKind } from '../runtime/journal.js';
import { busFaultCounts } from './bus-adversary.js';
import { linkEvents } from './link-events.js';
import type { LinkSpec } from './message-map.js';

/** A count or state that a link or message keeps in the block and shows as a signal. */
export interface CountInfo {
  readonly about: string;
  /** Shown in seconds, kept in ticks. */
  readonly ticks?: boolean;
  /** Shown per second, kept per tick. */
  readonly perTick?: boolean;
  /** Reported when it rises. */
  readonly event?: EventKind;
}
export type Counts = Readonly<Record<string, CountInfo>>;

/** Counts of a UDP link, each a slot of the block and a signal `link.name`. */
export const udpLinkCounts = {
  received: { about: 'datagrams taken' },
  malformed: { about: 'datagrams of no known form', event: linkEvents.malformed },
  wrongChecksum: { about: 'datagrams with a wrong checksum', event: linkEvents.wrongChecksum },
  wrongMap: { about: 'datagrams made with another message map', event: linkEvents.wrongMap },
  wrongLength: { about: 'datagrams with a wrong length', event: linkEvents.wrongLength },
  floods: { about: 'ticks in which the bound on datagrams was reached', event: linkEvents.flood },
  hellos: { about: 'times the controller said that it has started', event: linkEvents.hello },
  replies: { about: 'messages used' },
  oneStepReplies: { about: 'messages used that answer the tick just before' },
} as const satisfies Counts;

/** Counts and states of a CAN link. */
export const canLinkCounts = {
  received: { about: 'frames taken, error frames included' },
  replies: { about: 'messages used' },
  unknown: { about: 'frames whose identifier no message to the bench has' },
  remote: { about: 'remote requests' },
  malformed: { about: 'frames of no known form', event: linkEvents.malformedFrames },
  wrongLength: { about: 'frames with a wrong payload length or frame format', event: linkEvents.wrongFrameLength },
  floods: { about: 'ticks in which the bound on frames was reached', event: linkEvents.flood },
  errorFrames: { about: 'error frames from the CAN controller', event: linkEvents.errorFrames },
  warnings: { about: 'times the CAN controller came to its warning limit', event: linkEvents.errorWarning },
  passives: { about: 'times the CAN controller became error passive', event: linkEvents.errorPassive },
  busOffs: { about: 'times the CAN controller went bus-off', event: linkEvents.busOff },
  restarts: { about: 'times the CAN controller was restarted after bus-off', event: linkEvents.busRestarted },
  controllerState: { about: 'state of the CAN controller: 0 error active, 1 warning, 2 error passive, 3 bus-off' },
  transmitErrors: { about: 'transmit error counter as last told' },
  receiveErrors: { about: 'receive error counter as last told' },
  interfaceState: { about: 'state of the interface: 0 up, 1 down, 2 not there' },
  downs: { about: 'times the interface went down', event: linkEvents.interfaceDown },
  deletions: { about: 'times the interface was deleted', event: linkEvents.interfaceGone },
  ups: { about: 'times the interface came up again', event: linkEvents.interfaceUp },
  dropped: { about: 'frames that the kernel dropped because the receive buffer was full', event: linkEvents.dropped },
  queueFull: { about: 'frames not sent because the transmit queue was full', event: linkEvents.queueFull },
  unsent: { about: 'frames not sent for another reason', event: linkEvents.unsent },
} as const satisfies Counts;

/** What a CAN link does by SAE J1939; all 0 where no message is of it. */
export const j1939Counts = {
  requests: { about: 'requests for a parameter group that came to units of the bench' },
  longMessages: { about: 'messages of more than 8 bytes received whole' },
  transportFailures: { about: 'messages of more than 8 bytes that broke off', event: linkEvents.brokenOff },
  transportBusy: { about: 'messages of more than 8 bytes not sent because the one before was on its way' },
  addressesLost: { about: 'addresses that another unit took', event: linkEvents.addressLost },
} as const satisfies Counts;

/** Of every received message. */
export const receivedCounts = {
  age: { about: 'time since the newest message that was used', ticks: true },
  timedOut: { about: '1 while a time-out lasts' },
  received: { about: 'messages used' },
  outOfRange: { about: 'messages with a value outside its range', event: linkEvents.outOfRange },
  timeOuts: { about: 'time-outs' },
  period: { about: 'time between the two newest messages that were used', ticks: true },
  rate: { about: 'messages used per second, counted over the last whole 1000 ticks', perTick: true },
  jitter: { about: 'largest difference of that time from the cycle', ticks: true },
  lost: { about: 'messages missing in the sequence', event: linkEvents.lost },
  duplicate: { about: 'messages that came twice', event: linkEvents.duplicate },
  late: { about: 'messages that came after a newer one', event: linkEvents.late },
  restarts: { about: 'jumps of the sequence', event: linkEvents.restarted },
} as const satisfies Counts;

/** Of a message received by CAN, beside those. */
export const canReceivedCounts = {
  wrongChecksum: { about: 'messages with a wrong checksum', event: linkEvents.wrongMessageChecksum },
  wrongLength: { about: 'messages with a wrong payload length or frame format' },
} as const satisfies Counts;

/** Of every sent message. */
export const sentCounts = {
  sent: { about: 'messages sent' },
  muted: { about: '1 while it is kept from going: its control unit is taken out, or its condition does not hold' },
  unsendable: { about: 'times not sent because a value was not finite or not allowed', event: linkEvents.unsendable },
} as const satisfies Counts;

/** What adversaries did on the two ways of a CAN link, named as their counts are. */
const adversaryCounts: Counts = Object.fromEntries(
  (['received', 'sent'] as const).flatMap((way) =>
    Object.entries(busFaultCounts).map(([name, about]) => [`${way}${name}`, { about: `${about}, ${way}` }]),
  ),
);

/** Unit in which a count is shown, and what turns it into that; `step` is the length of a tick, s. */
export function shownAs({ ticks, perTick }: CountInfo, step: number): { unit: string; scale: number } {
  if (ticks) return { unit: 's', scale: step };
  return perTick ? { unit: '1/s', scale: 1 / step } : { unit: '1', scale: 1 };
}

export function countsOfLink(kind: LinkSpec['kind']): Counts {
  return kind === 'udp' ? udpLinkCounts : { ...canLinkCounts, ...j1939Counts, ...adversaryCounts };
}

export function countsOfMessage(kind: LinkSpec['kind'], direction: 'sent' | 'received'): Counts {
  if (direction === 'sent') return sentCounts;
  return kind === 'udp' ? receivedCounts : { ...receivedCounts, ...canReceivedCounts };
}

/** Names that no signal of a message may have: the exchange shows its own under them. */
export const reservedNames: readonly string[] = Object.keys({ ...receivedCounts, ...canReceivedCounts, ...sentCounts });
