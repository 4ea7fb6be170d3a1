/** Arrays that double when they are full: gathering on the host thread, where allocation is no harm. */
export class InputColumns {
  count = 0;
  /** Bytes of all inputs. */
  length = 0;
  private ticks = new Float64Array(1024);
  private links = new Uint16Array(1024);
  private lengths = new Uint32Array(1024);
  private bytes = new Uint8Array(1 << 16);

  add(tick: number, link: number, from: Uint8Array, at: number, length: number): void {
    if (this.count === this.ticks.length) {
      this.ticks = grown(this.ticks, new Float64Array(2 * this.count));
      this.links = grown(this.links, new Uint16Array(2 * this.count));
      this.lengths = grown(this.lengths, new Uint32Array(2 * this.count));
    }
    if (this.length + length > this.bytes.length)
      this.bytes = grown(this.bytes, new Uint8Array(2 * (this.length + length)));
    this.ticks[this.count] = tick;
    this.links[this.count] = link;
    this.lengths[this.count] = length;
    this.bytes.set(from.subarray(at, at + length), this.length);
    this.length += length;
    this.count += 1;
  }

  fields(): Record<string, unknown> {
    return {
      ticks: copyOf(this.ticks.subarray(0, this.count)),
      links: copyOf(this.links.subarray(0, this.count)),
      lengths: copyOf(this.lengths.subarray(0, this.count)),
      bytes: copyOf(this.bytes.subarray(0, this.length)),
    };
  }

  clear(): void {
    this.count = 0;
    this.length = 0;
  }
}

export class EventColumns {
  count = 0;
  private ticks = new Float64Array(64);
  private codes = new Int32Array(64);
  private subjects = new Int32Array(64);
  private values = new Float64Array(3 * 64);

  add(tick: number, code: number, subject: number, a: number, b: number, c: number): void {
    if (this.count === this.ticks.length) {
      this.ticks = grown(this.ticks, new Float64Array(2 * this.count));
      this.codes = grown(this.codes, new Int32Array(2 * this.count));
      this.subjects = grown(this.subjects, new Int32Array(2 * this.count));
      this.values = grown(this.values, new Float64Array(6 * this.count));
    }
    this.ticks[this.count] = tick;
    this.codes[this.count] = code;
    this.subjects[this.count] = subject;
    this.values.set([a, b, c], 3 * this.count);
    this.count += 1;
  }

  fields(): Record<string, unknown> {
    return {
      ticks: copyOf(this.ticks.subarray(0, this.count)),
      codes: copyOf(this.codes.subarray(0, this.count)),
      subjects: copyOf(this.subjects.subarray(0, this.count)),
      values: copyOf(this.values.subarray(0, 3 * this.count)),
    };
  }

  clear(): void {
    this.count = 0;
  }
}

function grown<T extends Float64Array | Int32Array | Uint32Array | Uint16Array | Uint8Array>(from: T, into: T): T {
  into.set(from);
  return into;
}

function copyOf(view: ArrayBufferView): Buffer {
  return Buffer.from(view.buffer.slice(view.byteOffset, view.byteOffset + view.byteLength) as ArrayBuffer);
}
