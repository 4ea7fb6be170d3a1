import { describe, expect, it } from 'vitest';
import { amplification } from '../../../tools/check/stability.js';

describe('amplification of RODAS3', () => {
  it('has the values of its stability function: R(-1), R(-10), R(-100)', () => {
    expect(amplification(-1, 0)).toBeCloseTo(0.3621399, 6);
    expect(amplification(-10, 0)).toBeCloseTo(0.1201131, 6);
    expect(amplification(-100, 0)).toBeCloseTo(0.0246209, 6);
  });
  it('follows exp(z) to third order, and never grows on the imaginary axis', () => {
    expect(amplification(0.01, 0.02) / Math.exp(0.01)).toBeCloseTo(1, 6);
    for (let y = 0.1; y < 1e4; y *= 1.5) expect(amplification(0, y)).toBeLessThanOrEqual(1 + 1e-9);
  });
});
