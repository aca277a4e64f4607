import type { DrawDecl, RuleDecl, RulesFile } from './ast.js';
import { namesIn } from './checks/walk.js';

/** What a blinded session hides: its draw, and what its arm decides about. */
export interface Sealed {
  readonly draw: string;
  /** The words that it chooses among. */
  readonly arms: readonly string[];
  /** Rules that are real in some arms and sham in others, and what each drives first. */
  readonly rules: readonly { readonly name: string; readonly drives: string | null }[];
  /** What those rules drive. */
  readonly outputs: readonly string[];
}

export function isSealed({ habits }: DrawDecl): boolean {
  return habits.some(({ kind }) => kind === 'sealed');
}

/** Rules whose `sham` turns on the sealed draw. */
export function blindedIn(file: RulesFile): RuleDecl[] {
  const draw = file.draws.find(isSealed);
  if (draw === undefined) return [];
  return file.rules.filter(({ sham }) =>
    namesIn(sham ?? []).some(({ name }) => name === draw.name.name),
  );
}

/** What must be hidden while the allocation is sealed; undefined for a file without a sealed draw. */
export function sealedOf(file: RulesFile): Sealed | undefined {
  const draw = file.draws.find(isSealed);
  if (draw === undefined || draw.choices.kind !== 'options') return undefined;
  const rules = blindedIn(file);
  const driven = rules.map((rule) =>
    rule.do.flatMap(({ body }) => ('output' in body ? [body.output.name] : [])),
  );
  return {
    draw: draw.name.name,
    arms: draw.choices.options.flatMap((one) => (one.kind === 'name' ? [one.name] : [])),
    rules: rules.map(({ name }, n) => ({ name: name.name, drives: driven[n]![0] ?? null })),
    outputs: [...new Set(driven.flat())],
  };
}
