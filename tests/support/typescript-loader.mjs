import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';

// The compiler takes half a second to load: what it made is kept, by the text it was made from.
const cache = new URL('../../node_modules/.cache/oilspring-tests/', import.meta.url);

export async function resolve(specifier, context, next) {
  if (/^(\.|\/|file:)/.test(specifier) && specifier.endsWith('.js')) {
    const wanted = new URL(specifier.replace(/\.js$/, '.ts'), context.parentURL);
    if (existsSync(wanted)) return { url: wanted.href, format: 'module', shortCircuit: true };
  }
  return next(specifier, context);
}

export async function load(url, context, next) {
  if (!url.startsWith('file:') || !url.endsWith('.ts')) return next(url, context);
  const path = fileURLToPath(url);
  const text = readFileSync(path, 'utf8');
  const kept = new URL(`${createHash('sha256').update(path).update(text).digest('hex')}.mjs`, cache);
  if (existsSync(kept)) return { format: 'module', source: readFileSync(kept, 'utf8'), shortCircuit: true };
  const { default: typescript } = await import('typescript');
  const { outputText } = typescript.transpileModule(text, {
    fileName: path,
    compilerOptions: {
      target: typescript.ScriptTarget.ES2022,
      module: typescript.ModuleKind.ESNext,
      verbatimModuleSyntax: true,
      inlineSourceMap: true,
    },
  });
  mkdirSync(cache, { recursive: true });
  const fresh = new URL(`${kept.href}.${process.pid}.${Math.random()}`);
  writeFileSync(fresh, outputText);
  renameSync(fresh, kept);
  return { format: 'module', source: outputText, shortCircuit: true };
}
