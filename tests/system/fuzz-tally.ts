import type { ElementInstance, ElementKind } from '../../runtime/contract.js';
import { drawCircuit, kinds } from './draw-circuit.js';
import { runCircuit } from './run-circuit.js';

/** How often each kind, and each pair of kinds that share a port of a store, has been in an accepted circuit. */
class Coverage {
  readonly elements = new Map<string, number>();
  readonly pairs = new Map<string, number>();
  seconds = 0;

  add(elements: readonly ElementInstance[], seconds: number): void {
    this.seconds += seconds;
    const at = new Map<string, Set<string>>();
    const count = (map: Map<string, number>, key: string) => map.set(key, (map.get(key) ?? 0) + 1);
    for (const one of elements) count(this.elements, one.kind.kind);
    for (const one of elements)
      for (const to of Object.values(one.connections)) {
        const place = `${to.store}.${to.port}`;
        const store = elements.find((other) => other.name === to.store)!;
        at.set(place, (at.get(place) ?? new Set([store.kind.kind])).add(one.kind.kind));
      }
    const seen = new Set<string>();
    for (const group of at.values()) for (const a of group) for (const b of group) if (a < b) seen.add(`${a} ${b}`);
    for (const pair of seen) count(this.pairs, pair);
  }
}

/** Pairs of kinds that could share a port of a store. */
function possiblePairs(): number {
  const touches = (kind: ElementKind) => new Set(Object.values(kind.ports));
  let count = 0;
  for (const a of kinds)
    for (const b of kinds) {
      if (a.kind >= b.kind || (a.role === 'store' && b.role === 'store')) continue;
      if ([...touches(a)].some((port) => touches(b).has(port))) count += 1;
    }
  return count;
}

/** Seconds that each circuit is run. */
const seconds = 0.4;

/** Draws and runs circuits, one seed after another, and keeps count. */
export class FuzzTally {
  readonly coverage = new Coverage();
  readonly faults: string[] = [];
  readonly refusals = new Map<string, number>();
  accepted = 0;
  /** Stopped where a pressure or a temperature left what the laws are valid for. */
  left = 0;
  /** With parts of substeps that the safety net replaced. */
  replaced = 0;
  finer = 0;
  worst = 0;

  /** One seed; what there is to say of it, if anything. */
  take(seed: number): string | undefined {
    const { elements, refused } = drawCircuit(seed);
    if (refused.length > 0) {
      for (const why of refused) this.refusals.set(why, (this.refusals.get(why) ?? 0) + 1);
      return `seed ${seed}: refused: ${refused.join('; ')}`;
    }
    const result = runCircuit(elements, seed, seconds);
    this.accepted += 1;
    this.coverage.add(elements, result.seconds);
    this.worst = Math.max(this.worst, result.residual);
    if (result.finer) this.finer += 1;
    if (result.left) this.left += 1;
    if (result.replaced > 0) this.replaced += 1;
    if (result.fault) this.faults.push(`seed ${seed}: ${result.fault}`);
    return result.fault
      ? `seed ${seed}: ${result.fault}`
      : result.left
        ? `seed ${seed}: stopped at ${result.seconds.toFixed(3)} s: ${result.left}`
        : undefined;
  }

  /** Kinds that were in no accepted circuit. */
  missing(): string[] {
    return kinds.filter((kind) => !this.coverage.elements.has(kind.kind)).map((kind) => kind.kind);
  }

  summary(): string {
    const refused = [...this.refusals].map(([why, times]) => `\n  refused ${times} times: ${why}`).join('');
    return (
      `${this.accepted} circuits accepted, ${[...this.refusals.values()].reduce((a, b) => a + b, 0)} refused, ` +
      `${this.coverage.seconds.toFixed(1)} s simulated; ${this.coverage.elements.size} of ${kinds.length} elements, ` +
      `${this.coverage.pairs.size} of ${possiblePairs()} pairs of neighbours; ${this.faults.length} faults; ` +
      `${this.left} stopped outside the validity of a law, ${this.replaced} with replaced substeps, ` +
      `${this.finer} needed shorter substeps; largest energy residual ${this.worst.toExponential(1)}${refused}`
    );
  }
}
