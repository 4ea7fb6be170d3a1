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
    text: '{subject} was due {a} times with a value that is not a finite number and was not sent ({b} so far)',
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
  flood: {
    name: 'link flooded',
    severity: 'warning',
    text: 'in {a} ticks {subject} brought as many datagrams as a tick may take; the rest waits ({b} ticks so far)',
  },
} as const satisfies Record<string, EventKind>;
