import { readdirSync, readFileSync, statSync } from 'node:fs';
import path from 'node:path';
import { cruise, type IForbiddenRuleType } from 'dependency-cruiser';
import { beforeAll, describe, expect, it } from 'vitest';

/** The directions of the house: plants -> runtime <- bridge; configs -> all three; tools, tests -> anything. */
const root = path.resolve(import.meta.dirname, '..');
const own = ['runtime', 'plants', 'bridge', 'configs', 'tools', 'tests'];
const may: Record<string, string[]> = {
  runtime: [],
  plants: ['runtime'],
  bridge: ['runtime'],
  configs: ['runtime', 'plants', 'bridge'],
};
const forbidden: IForbiddenRuleType[] = Object.entries(may).map(([from, to]) => ({
  name: `${from} knows only ${to.join(', ') || 'itself'}`,
  severity: 'error',
  from: { path: `^${from}/` },
  to: { path: `^(${own.filter((layer) => layer !== from && !to.includes(layer)).join('|')})/` },
}));

let modules: { source: string; dependencies: { resolved: string; circular?: boolean; dependencyTypes: string[] }[] }[] =
  [];
let violations: { from: string; to: string; rule: { name: string } }[] = [];

beforeAll(async () => {
  const result = await cruise(
    ['runtime', 'plants', 'bridge', 'configs', 'tools'],
    {
      baseDir: root,
      ruleSet: { forbidden },
      validate: true,
      tsPreCompilationDeps: true,
      exclude: { path: '^(dist|node_modules)/' },
      doNotFollow: { path: 'node_modules' },
    },
    { extensions: ['.ts', '.tsx', '.js'], extensionAlias: { '.js': ['.ts', '.tsx', '.js'] } } as never,
  );
  if (typeof result.output === 'string') throw new Error('dependency-cruiser printed instead of telling');
  modules = result.output.modules as never;
  violations = result.output.summary.violations as never;
});

describe('layers', () => {
  it('sees the whole house', () => {
    expect(modules.length).toBeGreaterThan(150);
    expect(modules.some((module) => module.source === 'runtime/tick.ts')).toBe(true);
    // the rules can fail: configs really does look at plants
    expect(
      modules.some(
        (module) =>
          module.source.startsWith('configs/') && module.dependencies.some((to) => to.resolved.startsWith('plants/')),
      ),
    ).toBe(true);
  });

  it('keeps the directions', () => {
    expect(violations.map((violation) => `${violation.from} -> ${violation.to} (${violation.rule.name})`)).toEqual([]);
  });

  it('lets laws import nothing', () => {
    const laws = modules.filter((module) => module.source.startsWith('plants/laws/'));
    expect(laws.length).toBeGreaterThan(5);
    for (const law of laws)
      expect(`${law.source} imports ${law.dependencies.map((to) => to.resolved).join(' ')}`).toBe(
        `${law.source} imports `,
      );
  });
});

describe('what runs in a tick', () => {
  it('takes no clock and no chance from the outside', () => {
    const found: string[] = [];
    const allowed = /^runtime\/(realtime|recording)\//;
    const visit = (folder: string) => {
      for (const name of readdirSync(path.join(root, folder))) {
        const file = `${folder}/${name}`;
        if (statSync(path.join(root, file)).isDirectory()) visit(file);
        else if (file.endsWith('.ts') && !allowed.test(file)) {
          const text = readFileSync(path.join(root, file), 'utf8').replace(/\/\*[\s\S]*?\*\/|\/\/.*$/gm, '');
          if (/\bMath\.random\b|\bDate\.now\b|\bnew Date\b|\bperformance\.now\b|\bprocess\.hrtime\b/.test(text))
            found.push(file);
        }
      }
    };
    visit('runtime');
    visit('plants');
    expect(found).toEqual([]);
  });
});
