import { describe, expect, it } from 'vitest';
import { memoryFiles } from '../../configs/files.js';
import { Problems } from '../../configs/problems.js';
import { readSource } from '../../configs/source.js';

function read(files: Record<string, string>) {
  const problems = new Problems();
  const source = readSource('variant.yaml', problems, memoryFiles(files));
  return { source, problems: problems.all };
}

describe('a file with a base', () => {
  it('has all of it but the top keys that it says itself', () => {
    const { source, problems } = read({
      'variant.yaml': 'base: bench.yaml\nlinks: { bus: { is: can } }\ninclude: more.yaml\n',
      'bench.yaml': 'bench: truck\nlinks: { bus: { is: udp }, other: { is: udp } }\ninclude: map.yaml\n',
      'map.yaml': 'messages: { a: 1 }\n',
      'more.yaml': 'duty: other.yaml\n',
    });
    expect(problems).toEqual([]);
    const root = source.root!;
    expect([...root.entries.keys()].sort()).toEqual(['bench', 'duty', 'links', 'messages']);
    const links = root.entries.get('links')!.value;
    expect(links.kind === 'mapping' && [...links.entries.keys()]).toEqual(['bus']);
    expect(source.texts.map((one) => one.name)).toEqual(['variant.yaml', 'more.yaml', 'bench.yaml', 'map.yaml']);
  });

  it('says what is wrong with it where it is named', () => {
    const missing = read({ 'variant.yaml': 'bench: x\nbase: nowhere.yaml\n' });
    expect(missing.problems.map(({ what, where }) => [what, where?.line])).toEqual([['no such file', 2]]);
    const ring = read({ 'variant.yaml': 'base: bench.yaml\n', 'bench.yaml': 'base: variant.yaml\n' });
    expect(ring.problems.map(({ what, where }) => [what, where?.file])).toEqual([
      ['file included twice', 'bench.yaml'],
    ]);
    const outside = read({ 'variant.yaml': 'base: ../bench.yaml\n' });
    expect(outside.problems.map(({ what, path }) => [what, path])).toEqual([
      ['outside the folder of the bench', 'base'],
    ]);
  });
});
