import type {
  Choices,
  Dimension,
  DrawDecl,
  NameRef,
  OperatorDecl,
  PhaseDecl,
  PlaceDecl,
  RuleDecl,
  RulesFile,
  TableDecl,
  ValueDecl,
} from '../ast.js';
import type { OutputFacts, RigFacts } from '../facts.js';
import { dimensionOf } from './dimensions.js';
import { powersOfSum } from './powers.js';

/** What a draw or an operator's choice comes to. */
export type Yield =
  | { readonly kind: 'amount'; readonly dimension: Dimension }
  | { readonly kind: 'point' }
  | { readonly kind: 'span' }
  | { readonly kind: 'word'; readonly words: readonly string[] }
  /** Wrong, and reported where it is declared. */
  | { readonly kind: 'unclear' };

export type RulesSymbol =
  | { readonly kind: 'value'; readonly decl: ValueDecl }
  | { readonly kind: 'place'; readonly decl: PlaceDecl; readonly shape: 'point' | 'span' }
  | { readonly kind: 'draw'; readonly decl: DrawDecl; readonly index: number }
  | { readonly kind: 'choice'; readonly decl: OperatorDecl; readonly index: number }
  | { readonly kind: 'table'; readonly decl: TableDecl }
  | { readonly kind: 'phase'; readonly decl: PhaseDecl; readonly index: number }
  | { readonly kind: 'rule'; readonly decl: RuleDecl; readonly index: number }
  /** Declared, but its phrase could not be read: anything goes. */
  | { readonly kind: 'broken' };

/** In words, with its article. */
export const KIND_WORDS: Readonly<Record<RulesSymbol['kind'], string>> = {
  value: 'a value',
  place: 'a place',
  draw: 'a draw',
  choice: "an operator's choice",
  table: 'a table',
  phase: 'a phase',
  rule: 'a rule',
  broken: 'a name',
};

/**
 * What every name of a file stands for. The file's own names share one list; outputs and inputs are
 * the rig's and lists of their own, so that a rule may be called like the output it drives.
 */
export class Symbols {
  private readonly named = new Map<string, RulesSymbol>();

  constructor(
    readonly file: RulesFile,
    readonly rig: RigFacts | undefined,
    broken: ReadonlySet<string>,
  ) {
    for (const name of broken) this.named.set(name, { kind: 'broken' });
    for (const decl of file.values) this.put(decl.name, { kind: 'value', decl });
    for (const decl of file.tables) this.put(decl.name, { kind: 'table', decl });
    for (const decl of file.places) {
      const shape = decl.place.base.to === undefined ? 'point' : 'span';
      this.put(decl.name, { kind: 'place', decl, shape });
    }
    file.draws.forEach((decl, index) => {
      this.put(decl.name, { kind: 'draw', decl, index });
    });
    file.operator.forEach((decl, index) => {
      this.put(decl.name, { kind: 'choice', decl, index });
    });
    file.phases.forEach((decl, index) => {
      this.put(decl.name, { kind: 'phase', decl, index });
    });
    file.rules.forEach((decl, index) => {
      this.put(decl.name, { kind: 'rule', decl, index });
    });
  }

  private put(name: NameRef, symbol: RulesSymbol): void {
    this.named.set(name.name, symbol);
  }

  get(name: string): RulesSymbol | undefined {
    return this.named.get(name);
  }

  /** Names of some kinds, for suggestions. */
  namesOf(...kinds: readonly RulesSymbol['kind'][]): string[] {
    return [...this.named]
      .filter(([, symbol]) => kinds.includes(symbol.kind))
      .map(([name]) => name);
  }

  output(name: string): OutputFacts | undefined {
    return this.rig?.outputs.find((output) => output.name === name);
  }

  /** The valve of a `give`: the one named, or the only one of the rig. */
  valve(from: NameRef | undefined): OutputFacts | undefined {
    if (from) return this.output(from.name);
    const valves = this.rig?.outputs.filter((output) => output.kind === 'valve') ?? [];
    return valves.length === 1 ? valves[0] : undefined;
  }

  hasInput(name: string): boolean {
    return this.rig?.inputs.some((input) => input.name === name) ?? true;
  }

  /** What the choices of a draw or of the operator come to. */
  yields(choices: Choices): Yield {
    if (choices.kind === 'between') {
      const powers = powersOfSum(choices.from, this);
      const dimension = powers && dimensionOf(powers);
      return dimension ? { kind: 'amount', dimension } : { kind: 'unclear' };
    }
    const kinds = choices.options.map((option): Yield => {
      if (option.kind === 'quantity') return { kind: 'amount', dimension: option.dimension };
      const symbol = this.get(option.name);
      if (symbol?.kind === 'place') return { kind: symbol.shape };
      if (symbol?.kind === 'value') {
        const powers = powersOfSum(option, this);
        const dimension = powers && dimensionOf(powers);
        return dimension ? { kind: 'amount', dimension } : { kind: 'unclear' };
      }
      return { kind: 'word', words: [option.name] };
    });
    const [first] = kinds;
    if (first?.kind === 'word' && kinds.every((kind) => kind.kind === 'word')) {
      return {
        kind: 'word',
        words: kinds.flatMap((kind) => (kind.kind === 'word' ? kind.words : [])),
      };
    }
    // `20 cm or target`: a length is a point.
    const pointLike = (kind: Yield): boolean =>
      kind.kind === 'point' || (kind.kind === 'amount' && kind.dimension === 'length');
    if (kinds.some((kind) => kind.kind === 'point') && kinds.every(pointLike))
      return { kind: 'point' };
    const same = (kind: Yield): boolean =>
      kind.kind === first?.kind &&
      (kind.kind !== 'amount' || first?.kind !== 'amount' || kind.dimension === first.dimension);
    return first && kinds.every(same) ? first : { kind: 'unclear' };
  }
}

/** The symbol table of a parsed file: for the checks, and for whoever compiles it. */
export function resolve(
  file: RulesFile,
  rig?: RigFacts,
  broken: ReadonlySet<string> = new Set(),
): Symbols {
  return new Symbols(file, rig, broken);
}
