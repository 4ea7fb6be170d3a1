import { readFileSync } from 'node:fs';
import path from 'node:path';
import { describe, expect, it } from 'vitest';
import { assemble } from '../../configs/assemble.js';
import { readBench } from '../../configs/bench.js';
import { catalogue } from '../../configs/catalogue.js';
import { memoryFiles } from '../../configs/files.js';
import { readScenario } from '../../configs/scenario.js';
import { root } from './command.js';

const readme = readFileSync(path.join(root, 'README.md'), 'utf8');
const blocks = [...readme.matchAll(/```yaml\n([\s\S]*?)```/g)].map((match) => match[1]!);

describe('the README', () => {
  it('shows a first bench and a scenario that work as they stand', () => {
    const files = memoryFiles({ 'stand.yaml': blocks[0]!, 'round.yaml': blocks[1]! });
    const spec = readBench('stand.yaml', catalogue, files);
    const { script } = readScenario('round.yaml', spec, files);
    const assembly = assemble(spec, { seed: 1, script });
    for (let tick = assembly.firstTick; tick < script.ticks; tick += 1) assembly.tick.run(tick);
    expect(assembly.plant.solver.failed).toBe(false);
    expect(assembly.signals[assembly.table.find('flywheel.speed')]!).toBeGreaterThan(30);
    const { energy, stuffs } = assembly.ledger.shares(assembly.block, assembly.signals);
    expect(energy).toBeLessThan(1e-4);
    expect(stuffs['oil']).toBeLessThan(1e-12);
  });

  it('shows a scenario of the truck that reads as it stands', () => {
    const truck = readBench(path.join(root, 'configs', 'harbour-truck', 'bench.yaml'), catalogue);
    const { script } = readScenario('s.yaml', truck, memoryFiles({ 's.yaml': blocks[2]! }));
    expect([script.steps.length, script.requirements.length]).toEqual([1, 1]);
  });

  it('names every command that there is', async () => {
    const { output } = await (await import('./command.js')).runCommand('--help');
    const commands = [...output.matchAll(/^ {2}([a-z]+)(?: |\n)/gm)]
      .map((match) => match[1]!)
      .filter((name) => name !== 'help');
    expect(commands.length).toBeGreaterThan(5);
    for (const name of commands) expect(readme).toContain(`\`${name}`);
  });

  it('has no place left to fill', () => {
    expect(readme).not.toMatch(/<!--/);
  });
});
