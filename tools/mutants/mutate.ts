import ts from 'typescript';
import type { Mutant } from './mutant.js';

/** Negations rather than shifted bounds: on measured numbers `<` and `<=` differ in nothing that a run could show. */
const relations = new Map([
  [ts.SyntaxKind.LessThanToken, '>='],
  [ts.SyntaxKind.LessThanEqualsToken, '>'],
  [ts.SyntaxKind.GreaterThanToken, '<='],
  [ts.SyntaxKind.GreaterThanEqualsToken, '<'],
  [ts.SyntaxKind.EqualsEqualsEqualsToken, '!=='],
  [ts.SyntaxKind.ExclamationEqualsEqualsToken, '==='],
]);
const arithmetic = new Map([
  [ts.SyntaxKind.PlusToken, '-'],
  [ts.SyntaxKind.MinusToken, '+'],
  [ts.SyntaxKind.AsteriskToken, '/'],
  [ts.SyntaxKind.SlashToken, '*'],
  [ts.SyntaxKind.AmpersandAmpersandToken, '||'],
  [ts.SyntaxKind.BarBarToken, '&&'],
]);
const functions = new Map([
  ['Math.min', 'Math.max'],
  ['Math.max', 'Math.min'],
]);

/**
 * All mechanical mutations of a source, in its order: relations negated, arithmetic and logic exchanged, signs and `!` left
 * out, numbers doubled, `Math.min` and `Math.max` exchanged, each arm of a choice taken always, conditions of `if` always true
 * and always false, and statements left out. Each is one change of the text.
 */
export function mutations(source: string): Mutant[] {
  const file = ts.createSourceFile('controller.ts', source, ts.ScriptTarget.ES2022, true);
  const found: Mutant[] = [];
  const names = new Set<string>();
  const add = (node: ts.Node, what: string, to: string) => {
    const start = node.getStart(file);
    const { line, character } = file.getLineAndCharacterOfPosition(start);
    let name = `${line + 1}.${character + 1} ${what}`;
    for (let k = 2; names.has(name); k += 1) name = `${line + 1}.${character + 1} ${what} (${k})`;
    names.add(name);
    const text = source.slice(start, node.end);
    const shown = text.replace(/\s+/g, ' ');
    found.push({
      name,
      kind: 'mechanical',
      what: `line ${line + 1}: \`${shown.length > 80 ? `${shown.slice(0, 77)}...` : shown}\`: ${what}`,
      source: source.slice(0, start) + to + source.slice(node.end),
    });
  };
  const visit = (node: ts.Node): void => {
    if (ts.isTypeNode(node) || ts.isImportDeclaration(node) || ts.isInterfaceDeclaration(node)) return;
    if (ts.isBinaryExpression(node)) {
      const { operatorToken } = node;
      const other = relations.get(operatorToken.kind) ?? arithmetic.get(operatorToken.kind);
      if (other !== undefined) add(operatorToken, `${operatorToken.getText(file)} to ${other}`, other);
    } else if (ts.isPrefixUnaryExpression(node)) {
      if (node.operator === ts.SyntaxKind.MinusToken || node.operator === ts.SyntaxKind.ExclamationToken)
        add(node, `without ${node.getText(file)[0]}`, node.operand.getText(file));
    } else if (ts.isNumericLiteral(node)) {
      const value = Number(node.text);
      const to = String(value === 0 ? 1 : 2 * value);
      add(node, `${node.text} to ${to}`, to);
    } else if (ts.isCallExpression(node)) {
      const called = node.expression.getText(file);
      const other = functions.get(called);
      if (other !== undefined) add(node.expression, `${called} to ${other}`, other);
    } else if (ts.isConditionalExpression(node)) {
      add(node, 'always the first arm', `(${node.whenTrue.getText(file)})`);
      add(node, 'always the second arm', `(${node.whenFalse.getText(file)})`);
    } else if (ts.isIfStatement(node)) {
      add(node.expression, 'always true', 'true');
      add(node.expression, 'never true', 'false');
    } else if (ts.isExpressionStatement(node)) {
      add(node, 'statement left out', ';');
    }
    ts.forEachChild(node, visit);
  };
  visit(file);
  return found;
}

/** TypeScript to JavaScript, without checking: a mutant may be wrong in any way that runs. */
export function compiled(source: string): string {
  return ts.transpileModule(source, {
    compilerOptions: { module: ts.ModuleKind.ESNext, target: ts.ScriptTarget.ES2022 },
  }).outputText;
}
