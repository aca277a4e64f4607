import type { Condition, Located, NameRef, RuleDecl, RulesFile } from '../ast.js';

/** Any node of the syntax tree, as a walk meets it. */
export type Node = Readonly<Record<string, unknown>> & {
  readonly kind?: string;
} & Partial<Located>;

/**
 * Calls back for every object of a piece of the tree, outer first, with the key it stood under.
 * `false` keeps the walk from going deeper. Spans, tables' rows and texts are passed over.
 */
export function walk(
  piece: unknown,
  call: (node: Node, key: string) => boolean | undefined | void,
): void {
  const visit = (node: unknown, key: string): void => {
    if (Array.isArray(node)) {
      for (const item of node) visit(item, key);
    } else if (node !== null && typeof node === 'object') {
      if (call(node as Node, key) === false) return;
      for (const [inner, child] of Object.entries(node)) {
        if (inner !== 'at' && inner !== 'rows' && inner !== 'sources') visit(child, inner);
      }
    }
  };
  visit(piece, '');
}

const MEASURES = new Set(['measure', 'scoped', 'firings', 'since', 'predicted']);

/** The measures in a piece of the tree. */
export function measuresIn(piece: unknown): (Node & Located)[] {
  const found: (Node & Located)[] = [];
  walk(piece, (node) => {
    if (node.kind !== undefined && MEASURES.has(node.kind) && node.at)
      found.push(node as Node & Located);
  });
  return found;
}

/** Every name that a piece of the tree mentions, as it stands there. */
export function namesIn(piece: unknown): NameRef[] {
  const found: NameRef[] = [];
  walk(piece, (node) => {
    if (typeof node.name === 'string' && node.at) found.push(node as unknown as NameRef);
  });
  return found;
}

/** Every condition of a file, with the words for where it stands and the rule it belongs to. */
export function conditionsOf(
  file: RulesFile,
): { readonly condition: Condition; readonly where: ConditionPlace; readonly rule?: RuleDecl }[] {
  const found: { condition: Condition; where: ConditionPlace; rule?: RuleDecl }[] = [];
  for (const phase of file.phases) {
    if (phase.course.kind === 'until')
      found.push({ condition: phase.course.condition, where: 'until' });
  }
  for (const rule of file.rules) {
    if (rule.when.kind === 'becomes')
      found.push({ condition: rule.when.condition, where: 'when', rule });
    if (rule.if) found.push({ condition: rule.if, where: 'if', rule });
    if (rule.sham) found.push({ condition: rule.sham, where: 'sham', rule });
    for (const { body } of rule.do) {
      const until =
        body.kind === 'hold' ? body.until : body.kind === 'pulse' ? body.train?.until : undefined;
      if (until?.while) found.push({ condition: until.while, where: 'while', rule });
    }
  }
  if (file.end) found.push({ condition: file.end, where: 'end' });
  return found;
}
export type ConditionPlace = 'until' | 'when' | 'if' | 'sham' | 'while' | 'end';

/** The same amount, but for where it stands. */
export function sameTree(a: unknown, b: unknown): boolean {
  return JSON.stringify(a, withoutPlaces) === JSON.stringify(b, withoutPlaces);
}

function withoutPlaces(key: string, value: unknown): unknown {
  return key === 'at' ? undefined : value;
}
