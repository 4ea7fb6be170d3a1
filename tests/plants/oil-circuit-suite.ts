import { describe, expect, it } from 'vitest';
import { places } from '../../runtime/circuit/build.js';
import type { ElementInstance } from '../../runtime/contract.js';
import { Bench } from '../support/circuit.js';
import { expectSameBits, jacobianError, worstImbalance } from './circuit-checks.js';

/** A small circuit with oil, and the commands that make it work hard. */
export interface OilCircuit {
  readonly elements: () => ElementInstance[];
  readonly drive: (bench: Bench, time: number) => void;
}

const oilHeld = (bench: Bench) => bench.plant.observed[places(bench.circuit).holdings]!;

/** What every circuit with oil has to pass. */
export function checkOilCircuits(circuits: Readonly<Record<string, OilCircuit>>): void {
  describe.each(Object.entries(circuits))('%s', (_name, { elements, drive }) => {
    const worked = (seconds: number, substeps = 4) => {
      const bench = new Bench(elements(), { substeps });
      bench.run(seconds, (time) => drive(bench, time));
      return bench;
    };

    it('has the derivatives that differences find, at many points of a hard run', () => {
      const bench = new Bench(elements());
      bench.run(1, (time) => {
        drive(bench, time);
        if (Math.round(time * 1000) % 97 !== 13) return;
        // off the corner where a shut valve begins to open: there differences see only half of the slope
        bench.circuit.states.forEach((state, i) => {
          const { y } = bench.plant;
          if (/(opening|ift)$/.test(state.name)) y[i] = Math.max(y[i]!, 1e-4);
          if (/^(bypass|main|equaliser|discharge)$/.test(state.name)) y[i] = Math.max(y[i]!, 0.02);
          // nor where a prescribed flow turns round
          if (state.name === 'flow' && Math.abs(y[i]!) < 1e-6) y[i] = 1e-6;
        });
        const { error, where } = jacobianError(bench.plant, [2e-8, 3e-9, 8e-10]);
        expect(error, `${where} at ${time} s`).toBeLessThan(2e-4);
      });
    });

    it('balances the energy of each element by itself', () => {
      const bench = new Bench(elements());
      bench.run(1, (time) => {
        drive(bench, time);
        if (Math.round(time * 1000) % 50 !== 7) return;
        const { relative, element: which } = worstImbalance(bench.plant);
        expect(relative, `${which} at ${time} s`).toBeLessThan(1e-9);
      });
    });

    it('gives the same bits fused and unfused', () => {
      expectSameBits(worked(0.237).plant);
    });

    it('closes the ledger and keeps the oil to rounding', () => {
      const bench = new Bench(elements());
      const before = oilHeld(bench);
      const powers = bench.circuit.readings.filter((reading) => /(loss|Power|supply)$/.test(reading.name));
      let turnedOver = 0;
      bench.run(1, (time) => {
        drive(bench, time);
        for (const { path } of powers) turnedOver += 1e-3 * Math.abs(bench.get(path));
      });
      expect(Math.abs(bench.energyResidual()) / turnedOver).toBeLessThan(1e-4);
      const brought = bench.plant.ledger[2]!;
      expect(Math.abs(oilHeld(bench) - before - brought) / before).toBeLessThan(1e-13);
    });

    it('stays positive and loses energy only downwards', () => {
      const bench = new Bench(elements());
      bench.run(1, (time) => {
        drive(bench, time);
        for (const { path } of bench.circuit.readings) {
          if (path.endsWith('ressure')) expect(bench.get(path), `${path} at ${time} s`).toBeGreaterThan(0);
          if (path.endsWith('.loss')) expect(bench.get(path), `${path} at ${time} s`).toBeGreaterThanOrEqual(-1e-9);
        }
      });
    });
  });
}
