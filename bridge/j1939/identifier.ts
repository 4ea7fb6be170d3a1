/**
 * Identifiers of SAE J1939 (J1939-21, data link layer): 29 bits, priority (3), extended data page and data page (2), PDU
 * format (8), PDU specific (8), source address (8). With a PDU format below 240 (PDU 1) the specific byte is the
 * destination, from 240 on (PDU 2) it belongs to the parameter group number.
 */
export interface J1939Identifier {
  /** 0 (highest) to 7. */
  readonly priority: number;
  /** Parameter group number, 18 bits; of PDU 1 with a low byte of 0. */
  readonly pgn: number;
  readonly source: number;
  /** PDU 1 only; 255 is everybody. */
  readonly destination?: number;
}

/** Bits of the priority, which a receiver does not look at. */
export const priorityBits = 0x1c000000;

/** Whether messages of a parameter group go to one destination (PDU 1). */
export function isDirected(pgn: number): boolean {
  return ((pgn >> 8) & 0xff) < 240;
}

export function identifierOf({ priority, pgn, source, destination }: J1939Identifier): number {
  const group = isDirected(pgn) ? (pgn & 0x3ff00) | (destination ?? 255) : pgn;
  return (priority << 26) | (group << 8) | source;
}

export function partsOf(identifier: number): J1939Identifier {
  const group = (identifier >> 8) & 0x3ffff;
  const parts = { priority: (identifier >> 26) & 7, source: identifier & 0xff };
  return isDirected(group) ? { ...parts, pgn: group & 0x3ff00, destination: group & 0xff } : { ...parts, pgn: group };
}
