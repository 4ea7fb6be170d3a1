import type { Expression, Formula } from '../runtime/judge/formula.js';
import type { AddressedUnit } from './j1939/name.js';

/**
 * The message map as plain data: which signal sits in which message, in which direction, when it is due, how it is
 * laid out on each kind of link and what counts when it stops coming. Read from the bench file by configs/messages.ts.
 * From the one map come the datagrams, the CAN frames, the C header, the CAN database file and a table for people.
 */
export interface MessageMap {
  readonly links: readonly LinkSpec[];
  readonly messages: readonly MessageSpec[];
}

export interface LinkSpec {
  readonly name: string;
  readonly kind: 'udp' | 'can' | 'can-multicast';
  /** Own address and port (udp), e.g. 127.0.0.1 and 47110; own address by which frames go (can-multicast). */
  readonly localAddress?: string;
  readonly localPort?: number;
  /** The peer's (udp), the group's (can-multicast). */
  readonly remoteAddress?: string;
  readonly remotePort?: number;
  /** Name of the interface (can). */
  readonly interface?: string;
  /** Nominal and data bit rate, bit/s (can). */
  readonly bitRate?: number;
  readonly dataBitRate?: number;
  /** Control units for which the bench claims an address (SAE J1939-81). */
  readonly units?: readonly AddressedUnit[];
}

export type WireType = 'u8' | 'i8' | 'u16' | 'i16' | 'u32' | 'i32' | 'f32' | 'f64';

export interface MapSignal {
  readonly name: string;
  /** Sent: path of the signal it carries. Received: path of the command it drives, or '' for a signal that only is shown. */
  readonly path: string;
  /** Sent: what it carries where that is no signal but a number or an expression, SI; `path` is then ''. */
  readonly expression?: Expression;
  /** The expression as the file has it, for people. */
  readonly said?: string;
  readonly about: string;
  /** Unit on the wire as text for people and headers: `bar(a)`, `N m`, `1`. */
  readonly unit: string;
  /** SI value = wire value in `unit` * unitScale + unitOffset. */
  readonly unitScale: number;
  readonly unitOffset: number;
  /** The SI unit itself, for the signal list, where the path does not tell it. */
  readonly siUnit?: string;
  /** UDP layout: the field's type; the wire number is (value in unit - offset) / scale. */
  readonly type: WireType;
  readonly scale: number;
  readonly offset: number;
  /** Range in `unit`, for saturation when sent and for the verdict `out of range` when received. */
  readonly least: number;
  readonly most: number;
  /** Received: the value in `unit` when the message has timed out or never came. */
  readonly substitute: number;
  /** Names for values: an enumeration. */
  readonly names?: Readonly<Record<string, number>>;
  readonly can?: CanLayout;
  /** In place of `can`, in a message of trouble codes (SAE J1939-73): the code whose occurrence count it is. */
  readonly trouble?: { readonly spn: number; readonly fmi: number };
  /** In such a message: the lamp whose state it is. */
  readonly lamp?: 'malfunction' | 'stop' | 'warning' | 'protect';
}

export interface CanLayout {
  /** As in CAN database text: bit number of the least significant (little endian) or most significant bit (big endian). */
  readonly startBit: number;
  readonly length: number;
  readonly byteOrder: 'little' | 'big';
  readonly signed: boolean;
  readonly float: boolean;
  readonly scale: number;
  readonly offset: number;
  /** Multiplexing: this signal is the selector, or is present when the named selector has one of these values. */
  readonly selector?: boolean;
  readonly selectedBy?: { readonly signal: string; readonly values: readonly (readonly [number, number])[] };
}

export interface MessageSpec {
  readonly name: string;
  readonly about: string;
  readonly link: string;
  /** Seen from the bench. */
  readonly direction: 'sent' | 'received';
  /** Sent: the control unit for which the bench stands in; its messages can be taken out together. */
  readonly standsFor?: string;
  /** Sent: it goes only in ticks in which this holds. */
  readonly while?: Formula;
  /** That condition as the file has it, for people. */
  readonly whileText?: string;
  /** Number of the message on the wire (UDP message number; CAN identifier). */
  readonly identifier: number;
  readonly extended?: boolean;
  /** The identifier is that of SAE J1939: it may be asked for, and more than 8 bytes go by the transport protocol. */
  readonly j1939?: boolean;
  /** Received: the three bits of an SAE J1939 priority in the identifier are not looked at. */
  readonly anyPriority?: boolean;
  readonly flexibleDataRate?: boolean;
  readonly bitRateSwitch?: boolean;
  /** Payload length on CAN, bytes. */
  readonly bytes?: number;
  /** Cycle, phase and start delay in ticks. */
  readonly every: number;
  readonly phase: number;
  readonly startDelay: number;
  /** Received: ticks without it after which the substitutes count. */
  readonly timeout: number;
  /** Sent: `cyclic`, or `on-change`, or cyclic with a faster cycle while its values move, or when it is asked for (SAE J1939). */
  readonly trigger: 'cyclic' | 'on-change' | 'cyclic-and-change' | 'on-request';
  readonly fastEvery?: number;
  /** What a received value outside its range does. */
  readonly outOfRange: 'saturate' | 'refuse';
  readonly protection?: Protection;
  readonly signals: readonly MapSignal[];
}

/** Counter and checksum inside the payload (CAN; UDP has its own in the header). */
export interface Protection {
  readonly kind: string;
  readonly settings: Readonly<Record<string, number | string>>;
}
