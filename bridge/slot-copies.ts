/** A table of copies `to[j] = from[i] * scale + offset`, made when a bench is built and run in every tick. */
export class SlotCopies {
  private source = new Int32Array(0);
  private target = new Int32Array(0);
  private scale = new Float64Array(0);
  private offset = new Float64Array(0);

  get length(): number {
    return this.source.length;
  }

  add(source: number, target: number, scale = 1, offset = 0): void {
    this.source = Int32Array.of(...this.source, source);
    this.target = Int32Array.of(...this.target, target);
    this.scale = Float64Array.of(...this.scale, scale);
    this.offset = Float64Array.of(...this.offset, offset);
  }

  copy(from: Float64Array, to: Float64Array): void {
    const { source, target, scale, offset } = this;
    for (let i = 0; i < source.length; i += 1) to[target[i]] = from[source[i]] * scale[i] + offset[i];
  }
}
