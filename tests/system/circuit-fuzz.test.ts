import { describe, expect, it } from 'vitest';
import type { ElementKind } from '../../runtime/contract.js';
import { drawCircuit } from './draw-circuit.js';
import { FuzzTally } from './fuzz-tally.js';
import { runCircuit } from './run-circuit.js';

/** A seeded sample; `npm run fuzz` is the long version. */
const count = 16;

describe(`${count} random circuits`, () => {
  it('keep numbers, oil and energy, and touch every element', { timeout: 300_000 }, () => {
    const tally = new FuzzTally();
    for (let seed = 1; tally.accepted < count && seed < 4 * count; seed += 1) {
      tally.take(seed);
      const { elements } = drawCircuit(seed);
      expect(elements.length).toBeGreaterThanOrEqual(12);
    }
    process.stdout.write(`fuzzing: ${tally.summary()}\n`);
    expect(tally.faults).toEqual([]);
    expect(tally.accepted).toBe(count);
    expect(tally.missing()).toEqual([]);
    expect(tally.left).toBe(0);
    // about one random circuit in ten has pressures that jump too hard for four substeps, as `check` would say
    expect(tally.finer).toBeLessThanOrEqual(0.15 * count);
  });
});

/** A text of one of the functions of an element, and what the defect makes of it. */
interface Defect {
  readonly kind: string;
  readonly in: 'flows' | 'derivatives' | 'loss' | 'efforts' | 'update';
  readonly right: string;
  readonly wrong: string;
}
const defects: readonly Defect[] = [
  { kind: 'orifice', in: 'flows', right: '(massFlow > 0 ? lost : 0) + carried', wrong: 'carried' },
  { kind: 'check-valve', in: 'flows', right: 'to.massFlow += massFlow', wrong: 'to.massFlow += 1.0001 * massFlow' },
  { kind: 'pump-motor', in: 'flows', right: 'shaft.torque += torque', wrong: 'shaft.torque += 1.01 * torque' },
  {
    kind: 'pump-motor',
    in: 'flows',
    right: 'high.massFlow -= massFlow + acrossMass + highMass',
    wrong: 'high.massFlow -= massFlow + acrossMass',
  },
  { kind: 'clutch', in: 'flows', right: 'b.torque += torque', wrong: 'b.torque += 0.99 * torque' },
  { kind: 'compliant-shaft', in: 'flows', right: 'b.torque += torque', wrong: 'b.torque += 1.005 * torque' },
  { kind: 'torque-converter', in: 'flows', right: 'turbine.torque += given', wrong: 'turbine.torque += 1.05 * given' },
  {
    kind: 'gas-accumulator',
    in: 'derivatives',
    right: 'derivative.mass = oil.massFlow',
    wrong: 'derivative.mass = 0.999 * oil.massFlow',
  },
  { kind: 'oil-volume', in: 'derivatives', right: 'oil.heatFlow + wall.heatFlow', wrong: 'oil.heatFlow' },
  { kind: 'filter', in: 'flows', right: 'from.massFlow -= massFlow', wrong: 'from.massFlow -= filtered * density' },
  {
    kind: 'isolation-valve',
    in: 'flows',
    right: 'law.minimumJerk(state.position)',
    wrong: 'Math.sqrt(state.position - 0.5)',
  },
  { kind: 'retarder', in: 'loss', right: ') * shaft.speed', wrong: ') * -shaft.speed' },
  { kind: 'planetary-joint', in: 'derivatives', right: '(1 + z) * sun.torque', wrong: 'z * sun.torque' },
  { kind: 'vehicle', in: 'derivatives', right: 'road.force - rolling', wrong: 'road.force + rolling' },
];

function planted(kind: ElementKind, defect: Defect): ElementKind {
  const source = kind[defect.in]!.toString()
    .replace(/\/\/.*$/gm, '')
    .replace(/\s+/g, ' ');
  if (!source.includes(defect.right)) throw new Error(`${kind.kind}.${defect.in} does not say \`${defect.right}\``);
  const changed = new Function(`return { ${source.replace(defect.right, defect.wrong)} }`)()[defect.in];
  return { ...kind, [defect.in]: changed };
}

describe('a planted defect', () => {
  it.each(defects.map((defect) => [`${defect.kind}: ${defect.wrong}`, defect] as const))(
    'is caught: %s',
    (_name, defect) => {
      for (let seed = 101; seed < 131; seed += 1) {
        const whole = drawCircuit(seed, defect.kind);
        if (whole.refused.length > 0 || !whole.elements.some((one) => one.kind.kind === defect.kind)) continue;
        const { elements } = drawCircuit(seed, defect.kind, (kind) =>
          kind.kind === defect.kind ? planted(kind, defect) : kind,
        );
        if (runCircuit(elements, seed, 0.3).fault === undefined) continue;
        // what it says is due to the defect: without it the same circuit is fine
        expect(runCircuit(whole.elements, seed, 0.3).fault).toBeUndefined();
        return;
      }
      expect.fail('thirty circuits with it showed nothing');
    },
  );
});
