import type {
  ByPhase,
  Choices,
  Dimension,
  DrawDecl,
  OperatorDecl,
  PlaceDecl,
  RulesFile,
  Sum,
  TableDecl,
  ValueDecl,
} from '../ast.js';
import { baseFactor, dimensionOf, multiply, type Powers, powersOf } from '../checks/dimensions.js';
import type { OutputFacts, RigFacts } from '../facts.js';

/** What each name of a checked file stands for. */
export type Meaning =
  | { readonly kind: 'value'; readonly decl: ValueDecl }
  | { readonly kind: 'place'; readonly decl: PlaceDecl }
  | { readonly kind: 'draw'; readonly decl: DrawDecl; readonly index: number }
  | { readonly kind: 'choice'; readonly decl: OperatorDecl; readonly index: number }
  | { readonly kind: 'table'; readonly decl: TableDecl }
  | { readonly kind: 'phase'; readonly index: number }
  | { readonly kind: 'rule'; readonly index: number }
  | { readonly kind: 'input'; readonly index: number }
  | { readonly kind: 'output'; readonly output: OutputFacts };

export class Names {
  private readonly meanings = new Map<string, Meaning>();
  /** The rig's own names: a rule may be called as the output that it drives. */
  private readonly rig = new Map<string, Meaning>();

  constructor(
    readonly file: RulesFile,
    facts: RigFacts,
  ) {
    // The file's own names last: they win over the rig's, as the checker lets them.
    for (const output of facts.outputs) this.rig.set(output.name, { kind: 'output', output });
    for (const input of facts.inputs) {
      this.rig.set(input.name, { kind: 'input', index: input.index });
    }
    for (const [name, meaning] of this.rig) this.meanings.set(name, meaning);
    for (const decl of file.values) this.meanings.set(decl.name.name, { kind: 'value', decl });
    for (const decl of file.places) this.meanings.set(decl.name.name, { kind: 'place', decl });
    for (const decl of file.tables) this.meanings.set(decl.name.name, { kind: 'table', decl });
    file.draws.forEach((decl, index) => {
      this.meanings.set(decl.name.name, { kind: 'draw', decl, index });
    });
    file.operator.forEach((decl, index) => {
      this.meanings.set(decl.name.name, { kind: 'choice', decl, index });
    });
    file.phases.forEach((decl, index) => {
      this.meanings.set(decl.name.name, { kind: 'phase', index });
    });
    file.rules.forEach((decl, index) => {
      this.meanings.set(decl.name.name, { kind: 'rule', index });
    });
  }

  get(name: string): Meaning | undefined {
    return this.meanings.get(name);
  }

  /** The meaning, of the kind that the checker has proved it to be. */
  need<K extends Meaning['kind']>(name: string, ...kinds: K[]): Meaning & { kind: K } {
    for (const meaning of [this.meanings.get(name), this.rig.get(name)]) {
      if (meaning && (kinds as string[]).includes(meaning.kind)) {
        return meaning as Meaning & { kind: K };
      }
    }
    throw new Error(`not a checked rules file: ${name} is no ${kinds.join(' or ')}`);
  }

  /** What the units of an amount come to; a sum's are those of its left side. */
  powersOf(sum: Sum): Powers {
    if (sum.kind === 'negate') return this.powersOf(sum.of);
    if (sum.kind !== 'binary') return powersOf(this.dimensionOf(sum));
    const left = this.powersOf(sum.left);
    if (sum.operator === '+' || sum.operator === '-') return left;
    return multiply(left, this.powersOf(sum.right), sum.operator === '*' ? 1 : -1);
  }

  /** What the base numbers' product or quotient must be multiplied by; 1 for a sum. */
  factorOf(sum: Sum & { kind: 'binary' }): number {
    if (sum.operator === '+' || sum.operator === '-') return 1;
    const sign = sum.operator === '*' ? 1 : -1;
    return baseFactor(this.powersOf(sum.left), this.powersOf(sum.right), sign);
  }

  dimensionOf(sum: Sum): Dimension {
    switch (sum.kind) {
      case 'quantity':
        return sum.dimension;
      case 'edge':
        return 'length';
      case 'negate':
        return this.dimensionOf(sum.of);
      case 'binary':
        return dimensionOf(this.powersOf(sum)) ?? 'number';
      case 'name': {
        const meaning = this.meanings.get(sum.name);
        if (meaning?.kind === 'value') return this.dimensionOf(meaning.decl.value.base);
        if (meaning?.kind === 'place') return 'length';
        if (meaning?.kind === 'draw' || meaning?.kind === 'choice') {
          return this.dimensionOfChoices(meaning.decl.choices);
        }
        return 'number';
      }
      case 'measure':
        if (sum.measure === 'position') return 'length';
        if (sum.measure === 'speed') return 'speed';
        return sum.measure === 'lap' || sum.measure === 'phase lap' ? 'number' : 'time';
      case 'scoped':
        if (sum.measure === 'water given') return 'volume';
        return sum.measure === 'mean speed' ? 'speed' : 'number';
      case 'firings':
        return 'number';
      case 'predicted':
        return sum.what === 'asymmetry' ? 'number' : 'length';
      case 'since':
        return sum.unit === 'time' ? 'time' : 'number';
    }
  }

  dimensionOfChoices(choices: Choices): Dimension {
    if (choices.kind === 'between') return this.dimensionOf(choices.from);
    const first = choices.options[0]!;
    if (first.kind === 'quantity') return first.dimension;
    return this.meanings.get(first.name)?.kind === 'place' ? 'length' : 'number';
  }
}

/** The names that a piece of the tree mentions, directly or through what they stand for. */
export function namesUsed(node: unknown, names: Names, found = new Set<string>()): Set<string> {
  if (Array.isArray(node)) {
    for (const item of node) namesUsed(item, names, found);
    return found;
  }
  if (node === null || typeof node !== 'object') return found;
  const { name } = node as { name?: unknown };
  if (typeof name === 'string' && !found.has(name)) {
    found.add(name);
    const meaning = names.get(name);
    if (meaning?.kind === 'value') namesUsed(meaning.decl.value, names, found);
    if (meaning?.kind === 'place') namesUsed(meaning.decl.place, names, found);
    if (meaning?.kind === 'draw' || meaning?.kind === 'choice') {
      namesUsed(meaning.decl.choices, names, found);
    }
  }
  for (const [key, child] of Object.entries(node)) {
    if (key !== 'at' && key !== 'rows') namesUsed(child, names, found);
  }
  return found;
}

/** The value, or its exception for a phase. */
export function inPhase<T>(value: ByPhase<T>, phaseName: string | undefined): T {
  const exception = value.exceptions.find((e) => e.phases.some((p) => p.name === phaseName));
  return exception ? exception.value : value.base;
}
