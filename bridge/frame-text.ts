import type { PayloadCodec } from './can-codec.js';
import { frameSizes, identifierFlags, identifierMasks, identifierWord, payloadAt, payloadRoom } from './can-frame.js';
import { IdentifierTable } from './identifier-table.js';
import type { MessageMap, MessageSpec } from './message-map.js';
import { makeCodec } from './payload-codec.js';
import { makeProtector } from './protection/make.js';
import { fieldVerdicts } from './udp-codec.js';

/** Turns the frames of one link into words, by the map. For people: allocates. */
export class FrameText {
  private readonly messages: readonly MessageSpec[];
  private readonly codecs: readonly PayloadCodec[];
  private readonly table: IdentifierTable;

  constructor(map: MessageMap, link: string) {
    this.messages = map.messages.filter((message) => message.link === link);
    this.codecs = this.messages.map((message) => makeCodec(message));
    this.table = new IdentifierTable(this.messages);
  }

  /** Name of the message, its values with units, and what is wrong with it; or the bare frame. */
  describe(frame: Uint8Array, size: number): string {
    const word = identifierWord(frame);
    if (payloadRoom(size) < 0 || frame[4]! > payloadRoom(size)) return `no frame: ${size} bytes`;
    const length = frame[4]!;
    const bare = `${((word & identifierMasks.extended) >>> 0).toString(16).toUpperCase()} [${length}] ${Buffer.from(frame.subarray(payloadAt, payloadAt + length)).toString('hex')}`;
    if ((word & identifierFlags.error) !== 0) return `error frame ${bare}`;
    if ((word & identifierFlags.remote) !== 0) return `remote request ${bare}`;
    const index = this.table.find(word);
    if (index < 0) return `unknown ${bare}`;
    const message = this.messages[index]!;
    const codec = this.codecs[index]!;
    if (!codec.fits(length) || (size === frameSizes.flexible) !== (message.flexibleDataRate === true))
      return `${message.name}: wrong length or format, ${bare}`;
    const payload = frame.subarray(payloadAt);
    const protector = makeProtector(message);
    const counter = protector?.check(payload, length);
    if (counter === -1) return `${message.name}: wrong checksum, ${bare}`;
    const values = new Float64Array(codec.count);
    const verdict = codec.read(payload, values, 0, length);
    const words = message.signals.flatMap((signal, i) => {
      if (!codec.carries(i)) return [];
      const name = Object.entries(signal.names ?? {}).find(([, value]) => value === values[i])?.[0];
      return [
        `${signal.name} ${name ?? Number(values[i]!.toPrecision(7))}${signal.unit === '1' ? '' : ` ${signal.unit}`}`,
      ];
    });
    const notes = [
      ...(protector && protector.modulo > 0 ? [`counter ${counter}`] : []),
      ...(verdict === fieldVerdicts.fine ? [] : ['value outside its range']),
    ];
    return `${message.name}: ${[...words, ...notes].join(', ')}`;
  }
}
