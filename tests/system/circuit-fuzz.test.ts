import { describe, expect, it } from 'vitest';
import type { ElementKind } from '../../runtime/contract.js';
import { Coverage, drawCircuit, kinds, possiblePairs, runCircuit } from './circuit-fuzz.js';

/** A seeded sample here; OILSPRING_FUZZ=10000 for the long version, OILSPRING_FUZZ_SEED for another start. */
const count = Number(process.env.OILSPRING_FUZZ ?? 18);
const first = Number(process.env.OILSPRING_FUZZ_SEED ?? 1);
const seconds = 0.4;

describe(`${count} random circuits`, () => {
  it('keep numbers, oil and energy, and touch every element', { timeout: 600_000 + count * 5000 }, () => {
    const coverage = new Coverage();
    const faults: string[] = [];
    const refusals = new Map<string, number>();
    let refused = 0;
    let left = 0;
    let lost = 0;
    let finer = 0;
    let accepted = 0;
    let worst = 0;
    for (let seed = first; accepted < count && seed < first + 3 * count + 100; seed += 1) {
      const circuit = drawCircuit(seed, coverage.elements);
      if (circuit.refused.length > 0) {
        for (const why of circuit.refused) refusals.set(why, (refusals.get(why) ?? 0) + 1);
        refused += 1;
        continue;
      }
      const result = runCircuit(circuit.elements, seed, seconds);
      accepted += 1;
      coverage.add(circuit.elements, result.seconds);
      expect(circuit.elements.length).toBeGreaterThanOrEqual(12);
      worst = Math.max(worst, result.residual);
      if (result.finer) finer += 1;
      if (result.left) left += 1;
      else if (result.replaced > 0) lost += 1;
      if (process.env.OILSPRING_FUZZ_VERBOSE && (result.left || result.replaced > 0))
        process.stdout.write(`seed ${seed}: ${result.left ?? 'substep replaced'} at ${result.seconds.toFixed(3)} s\n`);
      if (result.fault) faults.push(`seed ${seed}: ${result.fault}`);
    }
    process.stdout.write(
      `fuzzing: ${accepted} circuits, ${refused} refused, ${left} stopped outside the validity of a law, ` +
        `${lost} at a substep that the solver replaced, ` +
        `${finer} needed shorter substeps; ` +
        `${coverage.seconds.toFixed(1)} s simulated; ${coverage.elements.size} of ${kinds.length} elements, ` +
        `${coverage.pairs.size} of ${possiblePairs()} neighbour pairs; largest energy residual ${worst.toExponential(1)}\n${[...refusals].map(([why, times]) => `  refused ${times} times: ${why}\n`).join('')}`,
    );
    expect(faults).toEqual([]);
    expect(accepted).toBe(count);
    expect(kinds.filter((kind) => !coverage.elements.has(kind.kind)).map((kind) => kind.kind)).toEqual([]);
    // half of what is drawn at random may run dry or burst, not more
    expect(lost + left).toBeLessThan(0.5 * count);
    expect(finer).toBeLessThan(0.1 * count);
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
      const used = new Map<string, number>();
      for (let seed = 101; seed < 131; seed += 1) {
        const whole = drawCircuit(seed, used, defect.kind);
        if (whole.refused.length > 0 || !whole.elements.some((one) => one.kind.kind === defect.kind)) continue;
        const { elements } = drawCircuit(seed, used, defect.kind, (kind) =>
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
