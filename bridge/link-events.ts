import type { EventKind } from '../runtime/journal.js';

/** The events of links and messages. A time-out carries ages in seconds; counts carry their rise and their total. */
export const linkEvents = {
  timedOut: {
    name: 'message timed out',
    severity: 'warning',
    text: '{subject} has not come for {a:s}: its substitute values count',
  },
  cameBack: { name: 'message came back', severity: 'note', text: '{subject} comes again after {a:s} of silence' },
  awake: { name: 'controller awake', severity: 'note', text: 'the first message came on {subject}' },
  hello: {
    name: 'controller started',
    severity: 'note',
    text: 'the controller on {subject} said that it has started ({b} times so far)',
  },
  restarted: {
    name: 'sequence restarted',
    severity: 'warning',
    text: 'the sequence numbers of {subject} jumped: its sender started again or another one sends too ({b} times so far)',
  },
  lost: { name: 'messages lost', severity: 'warning', text: '{a} of {subject} missing in its sequence ({b} so far)' },
  duplicate: {
    name: 'messages duplicated',
    severity: 'warning',
    text: '{a} of {subject} came twice and were not used ({b} so far)',
  },
  late: {
    name: 'messages late',
    severity: 'warning',
    text: '{a} of {subject} came after a newer one and were not used ({b} so far)',
  },
  outOfRange: {
    name: 'values out of range',
    severity: 'warning',
    text: '{a} of {subject} carried a value outside its range ({b} so far)',
  },
  unsendable: {
    name: 'message not sent',
    severity: 'error',
    text: '{subject} was due {a} times with a value that is not a finite number or not allowed and was not sent ({b} so far)',
  },
  malformed: {
    name: 'malformed datagrams',
    severity: 'warning',
    text: '{a} datagrams on {subject} are of no known form and were not used ({b} so far)',
  },
  wrongChecksum: {
    name: 'wrong checksums',
    severity: 'warning',
    text: '{a} datagrams on {subject} have a wrong checksum and were not used ({b} so far)',
  },
  wrongMap: {
    name: 'wrong message map',
    severity: 'error',
    text: '{a} datagrams on {subject} were made with another message map and were not used ({b} so far): build the controller with the present header',
  },
  wrongLength: {
    name: 'wrong lengths',
    severity: 'warning',
    text: '{a} datagrams on {subject} have a wrong length and were not used ({b} so far)',
  },
  malformedFrames: {
    name: 'malformed frames',
    severity: 'warning',
    text: '{a} inputs on {subject} are no CAN frames and were not used ({b} so far)',
  },
  wrongFrameLength: {
    name: 'wrong frame lengths',
    severity: 'warning',
    text: '{a} frames on {subject} have another payload length or frame format than the map says and were not used ({b} so far)',
  },
  wrongMessageChecksum: {
    name: 'wrong message checksums',
    severity: 'warning',
    text: '{a} of {subject} had a wrong checksum and were not used ({b} so far)',
  },
  errorFrames: { name: 'error frames', severity: 'warning', text: '{a} error frames on {subject} ({b} so far)' },
  errorWarning: {
    name: 'bus errors',
    severity: 'warning',
    text: 'the CAN controller of {subject} came to its warning limit: check termination, bit rate and wiring ({b} times so far)',
  },
  errorPassive: {
    name: 'error passive',
    severity: 'warning',
    text: 'the CAN controller of {subject} is error passive: check termination, bit rate and that another node is on the bus ({b} times so far)',
  },
  busOff: {
    name: 'bus-off',
    severity: 'error',
    text: 'the CAN controller of {subject} is bus-off and sends nothing until it is restarted ({b} times so far)',
  },
  busRestarted: {
    name: 'bus restarted',
    severity: 'note',
    text: 'the CAN controller of {subject} was restarted ({b} times so far)',
  },
  interfaceDown: {
    name: 'interface down',
    severity: 'error',
    text: 'the interface of {subject} went down: nothing comes and nothing leaves until it is up again ({b} times so far)',
  },
  interfaceGone: {
    name: 'interface deleted',
    severity: 'error',
    text: 'the interface of {subject} is not there any more: the link waits for one of its name ({b} times so far)',
  },
  interfaceUp: {
    name: 'interface up',
    severity: 'note',
    text: 'the interface of {subject} is up again ({b} times so far)',
  },
  dropped: {
    name: 'frames dropped',
    severity: 'error',
    text: 'the kernel dropped {a} frames on {subject} because the receive buffer was full ({b} so far)',
  },
  queueFull: {
    name: 'transmit queue full',
    severity: 'warning',
    text: '{a} frames on {subject} were not sent because the transmit queue was full ({b} so far)',
  },
  unsent: {
    name: 'frames not sent',
    severity: 'warning',
    text: '{a} frames on {subject} could not be sent ({b} so far)',
  },
  brokenOff: {
    name: 'long messages broken off',
    severity: 'warning',
    text: '{a} messages of more than 8 bytes on {subject} broke off: a packet was missing or late ({b} so far)',
  },
  addressLost: {
    name: 'address lost',
    severity: 'error',
    text: 'another control unit on {subject} took {a} addresses of the bench, whose units send nothing more ({b} so far): take the stand-in out, or give it another address',
  },
  flood: {
    name: 'link flooded',
    severity: 'warning',
    text: 'in {a} ticks {subject} brought as much as a tick may take; the rest waits ({b} ticks so far)',
  },
} as const satisfies Record<string, EventKind>;
