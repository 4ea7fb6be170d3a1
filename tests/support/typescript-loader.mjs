import { existsSync, readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import typescript from 'typescript';

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
  const { outputText } = typescript.transpileModule(readFileSync(path, 'utf8'), {
    fileName: path,
    compilerOptions: {
      target: typescript.ScriptTarget.ES2022,
      module: typescript.ModuleKind.ESNext,
      verbatimModuleSyntax: true,
      inlineSourceMap: true,
    },
  });
  return { format: 'module', source: outputText, shortCircuit: true };
}
