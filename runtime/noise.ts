/**
 * Noise as a pure function of seed, stream and tick: no generator state, so that any tick can be computed again alone.
 * The counter goes through the finaliser of MurmurHash3 (public domain), twice 32 bits make a uniform number, and the
 * inverse normal distribution after Wichura (AS 241, Applied Statistics 37 (1988) 477, PPND16, 1e-16 relative) makes
 * it Gaussian. Allocates nothing.
 */

/** Writes a uniform number in (0, 1), 53 bits, into `out[at]`. */
export function uniform(seed: number, stream: number, tick: number, out: Float64Array, at: number): void {
  const key = mix((seed | 0) ^ Math.imul((stream | 0) + 1, 0x9e3779b1));
  const word = mix(key ^ Math.imul((tick | 0) + 1, 0x85ebca6b));
  const high = mix((word + 0x243f6a88) | 0) >>> 5;
  const low = mix((word ^ key ^ 0x85a308d3) | 0) >>> 6;
  out[at] = (high * 67108864 + low + 0.5) / 9007199254740992;
}

/** Writes a number of the standard normal distribution (mean 0, variance 1) into `out[at]`. */
export function gaussian(seed: number, stream: number, tick: number, out: Float64Array, at: number): void {
  uniform(seed, stream, tick, out, at);
  inverseNormal(out, at);
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

/**
 * Replaces p = out[at], 0 < p < 1, by the argument at which the standard normal distribution has that value. Through the
 * array, since a number passed to or from a function too large to be inlined is boxed.
 */
export function inverseNormal(out: Float64Array, at: number): void {
  const p = out[at]!;
  const q = p - 0.5;
  if (Math.abs(q) <= 0.425) {
    const r = 0.180625 - q * q;
    const above =
      ((((((2509.0809287301227 * r + 33430.57558358813) * r + 67265.7709270087) * r + 45921.95393154987) * r +
        13731.69376550946) *
        r +
        1971.5909503065513) *
        r +
        133.14166789178438) *
        r +
      3.3871328727963665;
    const below =
      ((((((5226.495278852854 * r + 28729.085735721943) * r + 39307.89580009271) * r + 21213.794301586597) * r +
        5394.196021424751) *
        r +
        687.1870074920579) *
        r +
        42.31333070160091) *
        r +
      1;
    out[at] = (q * above) / below;
    return;
  }
  const tail = Math.sqrt(-Math.log(q < 0 ? p : 1 - p));
  const far = tail > 5;
  const r = far ? tail - 5 : tail - 1.6;
  const above = far
    ? ((((((2.0103343992922881e-7 * r + 2.7115555687434876e-5) * r + 0.0012426609473880784) * r +
        0.026532189526576124) *
        r +
        0.29656057182850487) *
        r +
        1.7848265399172913) *
        r +
        5.463784911164114) *
        r +
      6.657904643501103
    : ((((((0.0007745450142783414 * r + 0.022723844989269184) * r + 0.2417807251774506) * r + 1.2704582524523684) * r +
        3.6478483247632045) *
        r +
        5.769497221460691) *
        r +
        4.630337846156546) *
        r +
      1.4234371107496835;
  const below = far
    ? ((((((2.0442631033899397e-15 * r + 1.421511758316446e-7) * r + 1.8463183175100548e-5) * r +
        0.0007868691311456133) *
        r +
        0.014875361290850615) *
        r +
        0.1369298809227358) *
        r +
        0.599832206555888) *
        r +
      1
    : ((((((1.0507500716444169e-9 * r + 0.0005475938084995345) * r + 0.015198666563616457) * r + 0.14810397642748008) *
        r +
        0.6897673349851) *
        r +
        1.6763848301838038) *
        r +
        2.053191626637759) *
        r +
      1;
  out[at] = q < 0 ? -above / below : above / below;
}
