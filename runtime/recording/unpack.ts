/**
 * A strict reader of MessagePack (msgpack.org specification) for files that strangers may have made: maps with string
 * keys, arrays, strings, bytes, numbers, booleans, nil and nothing else. Counts are checked against the bytes that are
 * there before anything is allocated; nesting is bounded; extension types, repeated keys and `__proto__` are refused.
 * Bytes come back as views into the input.
 */
export type Packed = null | boolean | number | string | Uint8Array | Packed[] | { [key: string]: Packed };

export class UnpackError extends Error {
  override readonly name = 'UnpackError';
}

const DEEPEST = 32;

/** The one value that `bytes` holds. Throws `UnpackError` when it is not well formed, or when something follows it. */
export function unpack(bytes: Uint8Array): Packed {
  const reader = new Reader(bytes);
  const value = reader.value(0);
  if (reader.at !== bytes.length) throw new UnpackError(`${bytes.length - reader.at} bytes too many behind the value`);
  return value;
}

class Reader {
  at = 0;
  private readonly view: DataView;
  private readonly text = new TextDecoder('utf-8', { fatal: true });

  constructor(private readonly bytes: Uint8Array) {
    this.view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  }

  value(depth: number): Packed {
    if (depth > DEEPEST) throw new UnpackError(`nested deeper than ${DEEPEST}`);
    const type = this.view.getUint8(this.take(1));
    if (type < 0x80) return type;
    if (type < 0x90) return this.map(type & 15, depth);
    if (type < 0xa0) return this.array(type & 15, depth);
    if (type < 0xc0) return this.string(type & 31);
    if (type >= 0xe0) return type - 256;
    switch (type) {
      case 0xc0:
        return null;
      case 0xc2:
        return false;
      case 0xc3:
        return true;
      case 0xc4:
        return this.raw(this.view.getUint8(this.take(1)));
      case 0xc5:
        return this.raw(this.view.getUint16(this.take(2)));
      case 0xc6:
        return this.raw(this.view.getUint32(this.take(4)));
      case 0xca:
        return this.view.getFloat32(this.take(4));
      case 0xcb:
        return this.view.getFloat64(this.take(8));
      case 0xcc:
        return this.view.getUint8(this.take(1));
      case 0xcd:
        return this.view.getUint16(this.take(2));
      case 0xce:
        return this.view.getUint32(this.take(4));
      case 0xcf:
        return this.safe(this.view.getBigUint64(this.take(8)));
      case 0xd0:
        return this.view.getInt8(this.take(1));
      case 0xd1:
        return this.view.getInt16(this.take(2));
      case 0xd2:
        return this.view.getInt32(this.take(4));
      case 0xd3:
        return this.safe(this.view.getBigInt64(this.take(8)));
      case 0xd9:
        return this.string(this.view.getUint8(this.take(1)));
      case 0xda:
        return this.string(this.view.getUint16(this.take(2)));
      case 0xdb:
        return this.string(this.view.getUint32(this.take(4)));
      case 0xdc:
        return this.array(this.view.getUint16(this.take(2)), depth);
      case 0xdd:
        return this.array(this.view.getUint32(this.take(4)), depth);
      case 0xde:
        return this.map(this.view.getUint16(this.take(2)), depth);
      case 0xdf:
        return this.map(this.view.getUint32(this.take(4)), depth);
      default:
        throw new UnpackError(`type 0x${type.toString(16)} at byte ${this.at - 1} has no place here`);
    }
  }

  private take(count: number): number {
    const from = this.at;
    if (count > this.bytes.length - from)
      throw new UnpackError(`ends at byte ${this.bytes.length}, in the middle of a value`);
    this.at = from + count;
    return from;
  }

  private raw(length: number): Uint8Array {
    const from = this.take(length);
    return this.bytes.subarray(from, from + length);
  }

  private string(length: number): string {
    try {
      return this.text.decode(this.raw(length));
    } catch (error) {
      if (error instanceof UnpackError) throw error;
      throw new UnpackError(`text at byte ${this.at - length} is not UTF-8`);
    }
  }

  private array(count: number, depth: number): Packed[] {
    if (count > this.bytes.length - this.at)
      throw new UnpackError(`a list of ${count} at byte ${this.at} is longer than what follows`);
    const list: Packed[] = [];
    for (let i = 0; i < count; i += 1) list.push(this.value(depth + 1));
    return list;
  }

  private map(count: number, depth: number): { [key: string]: Packed } {
    if (count * 2 > this.bytes.length - this.at)
      throw new UnpackError(`a map of ${count} at byte ${this.at} is longer than what follows`);
    const map: { [key: string]: Packed } = {};
    for (let i = 0; i < count; i += 1) {
      const key = this.value(depth + 1);
      if (typeof key !== 'string' || key === '__proto__')
        throw new UnpackError(`a key at byte ${this.at} is not a plain name`);
      if (Object.hasOwn(map, key)) throw new UnpackError(`key ${JSON.stringify(key)} stands twice`);
      map[key] = this.value(depth + 1);
    }
    return map;
  }

  private safe(value: bigint): number {
    if (value > BigInt(Number.MAX_SAFE_INTEGER) || value < BigInt(Number.MIN_SAFE_INTEGER))
      throw new UnpackError(`${value} is beyond exact numbers`);
    return Number(value);
  }
}
