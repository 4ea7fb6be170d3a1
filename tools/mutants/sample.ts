/** `count` of a list, in its order, drawn by a seed: the same seed draws the same. */
export function sample<T>(all: readonly T[], count: number, seed: number): T[] {
  // xorshift, after Marsaglia 2003
  let state = (seed | 0) === 0 ? 0x9e3779b9 : seed | 0;
  const draw = () => {
    state ^= state << 13;
    state ^= state >>> 17;
    state ^= state << 5;
    return (state >>> 0) / 2 ** 32;
  };
  for (let warm = 0; warm < 8; warm += 1) draw();
  const keys = all.map((_, i) => ({ i, key: draw() })).sort((a, b) => a.key - b.key || a.i - b.i);
  return keys
    .slice(0, count)
    .map(({ i }) => i)
    .sort((a, b) => a - b)
    .map((i) => all[i]!);
}
