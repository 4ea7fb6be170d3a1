/**
 * NAME of a control unit (SAE J1939-81, section 4.1.1): 64 bits, sent from the least significant byte on. Of two units
 * that claim one address the one with the smaller NAME keeps it.
 */
export interface UnitName {
  /** 21 bits. */
  readonly identity: number;
  /** 11 bits. */
  readonly manufacturer: number;
  /** 3 and 5 bits. */
  readonly unitInstance: number;
  readonly functionInstance: number;
  /** 8 bits. */
  readonly function: number;
  /** 7 and 4 bits. */
  readonly vehicleSystem: number;
  readonly vehicleSystemInstance: number;
  /** 3 bits: 0 global, 1 on-highway, 2 agriculture, 3 construction, 4 marine, 5 industrial. */
  readonly industryGroup: number;
}

/** Greatest value of each part. */
export const nameLimits: Readonly<Record<keyof UnitName, number>> = {
  identity: 0x1fffff,
  manufacturer: 0x7ff,
  unitInstance: 7,
  functionInstance: 31,
  function: 255,
  vehicleSystem: 127,
  vehicleSystemInstance: 15,
  industryGroup: 7,
};

/** A control unit for which the bench claims an address. */
export interface AddressedUnit {
  readonly unit: string;
  readonly address: number;
  readonly name: UnitName;
}

/** The eight bytes of a NAME. Units of the bench keep to their address: the bit `arbitrary address capable` is 0. */
export function nameBytes(name: UnitName): Uint8Array {
  const low = (name.identity | (name.manufacturer << 21)) >>> 0;
  const high =
    (name.unitInstance |
      (name.functionInstance << 3) |
      (name.function << 8) |
      (name.vehicleSystem << 17) |
      (name.vehicleSystemInstance << 24) |
      (name.industryGroup << 28)) >>>
    0;
  const bytes = new Uint8Array(8);
  const view = new DataView(bytes.buffer);
  view.setUint32(0, low, true);
  view.setUint32(4, high, true);
  return bytes;
}

/** Whether the NAME `a` is the smaller one: below 0, above 0, or 0 when they are the same. */
export function compareNames(a: Uint8Array, b: Uint8Array): number {
  for (let i = 7; i >= 0; i -= 1) if (a[i] !== b[i]) return a[i] - b[i];
  return 0;
}
