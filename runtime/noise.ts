/**
 * Noise as a pure function of seed, stream and tick: no generator state, so that any tick can be computed again alone.
 * The counter goes through the finaliser of MurmurHash3 (public domain), twice 32 bits make a uniform number, and the
 * inverse normal distribution after Wichura (AS 241, Applied Statistics 37 (1988) 477, PPND16, 1e-16 relative) makes
 * it Gaussian. Allocates nothing.
 */

/** A uniform number in (0, 1), 53 bits. */
export function uniform(seed: number, stream: number, tick: number): number {
  const key = mix((seed | 0) ^ Math.imul((stream | 0) + 1, 0x9e3779b1));
  const word = mix(key ^ Math.imul((tick | 0) + 1, 0x85ebca6b));
  const high = mix((word + 0x243f6a88) | 0) >>> 5;
  const low = mix((word ^ key ^ 0x85a308d3) | 0) >>> 6;
  return (high * 67108864 + low + 0.5) / 9007199254740992;
}

/** Writes a number of the standard normal distribution (mean 0, variance 1) into `out[at]`. */
export function gaussian(seed: number, stream: number, tick: number, out: Float64Array, at: number): void {
  out[at] = inverseNormal(uniform(seed, stream, tick));
}

function mix(value: number): number {
  let h = value;
  h ^= h >>> 16;
  h = Math.imul(h, 0x85ebca6b);
  h ^= h >>> 13;
  h = Math.imul(h, 0xc2b2ae35);
  h ^= h >>> 16;
  return h;
}

/** The argument at which the standard normal distribution has the value p, 0 < p < 1. */
export function inverseNormal(p: number): number {
  const q = p - 0.5;
  if (Math.abs(q) <= 0.425) {
    const r = 0.180625 - q * q;
    const above =
      ((((((2509.0809287301226727 * r + 33430.575583588128105) * r + 67265.770927008700853) * r + 45921.953931549871457) * r +
        13731.693765509461125) *
        r +
        1971.5909503065514427) *
        r +
        133.14166789178437745) *
        r +
      3.387132872796366608;
    const below =
      ((((((5226.495278852854561 * r + 28729.085735721942674) * r + 39307.89580009271061) * r + 21213.794301586595867) * r +
        5394.1960214247511077) *
        r +
        687.1870074920579083) *
        r +
        42.313330701600911252) *
        r +
      1;
    return (q * above) / below;
  }
  const tail = Math.sqrt(-Math.log(q < 0 ? p : 1 - p));
  const far = tail > 5;
  const r = far ? tail - 5 : tail - 1.6;
  const above = far
    ? ((((((2.01033439929228813265e-7 * r + 2.71155556874348757815e-5) * r + 0.0012426609473880784386) * r +
        0.026532189526576123093) *
        r +
        0.29656057182850489123) *
        r +
        1.7848265399172913358) *
        r +
        5.4637849111641143699) *
        r +
      6.6579046435011037772
    : ((((((7.7454501427834140764e-4 * r + 0.0227238449892691845833) * r + 0.24178072517745061177) * r +
        1.27045825245236838258) *
        r +
        3.64784832476320460504) *
        r +
        5.7694972214606914055) *
        r +
        4.6303378461565452959) *
        r +
      1.42343711074968357734;
  const below = far
    ? ((((((2.04426310338993978564e-15 * r + 1.4215117583164458887e-7) * r + 1.8463183175100546818e-5) * r +
        7.868691311456132591e-4) *
        r +
        0.0148753612908506148525) *
        r +
        0.1369298809227358053) *
        r +
        0.59983220655588793769) *
        r +
      1
    : ((((((1.05075007164441684324e-9 * r + 5.475938084995344946e-4) * r + 0.0151986665636164571966) * r +
        0.14810397642748007459) *
        r +
        0.68976733498510000455) *
        r +
        1.6763848301838038494) *
        r +
        2.05319162663775882187) *
        r +
      1;
  return q < 0 ? -above / below : above / below;
}
