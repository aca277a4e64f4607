import type { NameRef, RulesFile } from '../ast.js';
import { type Node, walk } from './walk.js';

/** What a name must be where it stands. */
export type Role =
  | 'amount'
  | 'point'
  | 'span'
  | 'rule'
  | 'phase'
  | 'input'
  | 'output'
  | 'valve'
  | 'table'
  | 'button'
  /** The left side of `is`: an amount, a draw of words, or an input. */
  | 'subject'
  /** A word or name that a draw chooses, or that `is` asks for. */
  | 'option';

export interface Use {
  readonly ref: NameRef;
  readonly as: Role;
}

/** Names that stand directly under a key of a node of some kind. */
const ROLES: Readonly<Record<string, Readonly<Record<string, Role>>>> = {
  edge: { of: 'span' },
  firings: { of: 'rule' },
  predicted: { of: 'rule' },
  visit: { to: 'span' },
  firing: { of: 'rule' },
  begins: { what: 'phase' },
  fires: { rule: 'rule' },
  rises: { input: 'input' },
  falls: { input: 'input' },
  presses: { button: 'button' },
  'every row': { table: 'table' },
  give: { from: 'valve' },
  pulse: { output: 'output' },
  hold: { output: 'output' },
  stop: { output: 'output' },
  'go to': { phase: 'phase' },
  'lick mark': { within: 'span' },
};
const MARK_ROLES: Readonly<Record<string, Role>> = {
  fires: 'rule',
  rises: 'input',
  falls: 'input',
  begins: 'phase',
  reaches: 'point',
  enters: 'span',
  leaves: 'span',
};

/** Every name that a piece of the tree uses, with what it must be there. */
export function usesIn(piece: unknown): Use[] {
  const uses: Use[] = [];
  const use = (ref: unknown, as: Role): void => {
    const { name, at } = (ref ?? {}) as Partial<NameRef>;
    if (typeof name === 'string' && at) uses.push({ ref: { name, at }, as });
  };
  walk(piece, (node, key) => {
    const { kind } = node;
    if (kind === 'name') {
      const role =
        key === 'reaches' ? 'point' : key === 'span' || key === 'within' ? 'span' : undefined;
      use(node, role ?? (key === 'options' || key === 'first' ? 'option' : 'amount'));
      return false;
    }
    if (kind === 'is') {
      const subject = node.subject as Node;
      if (subject.kind === 'name') {
        use(subject, 'subject');
        for (const item of usesIn({ options: node.options })) uses.push(item);
        return false;
      }
    }
    if (kind === 'reaches') {
      for (const item of usesIn({ reaches: node.place })) uses.push(item);
      return false;
    }
    if (kind === 'name mark' || kind === 'place mark') {
      use(node.name ?? node.place, MARK_ROLES[node.event as string]!);
      return false;
    }
    for (const [inner, role] of Object.entries((kind && ROLES[kind]) || {})) {
      // A span of a moment has a kind of its own and is met further down.
      if ((node[inner] as Node | undefined)?.kind === undefined) use(node[inner], role);
    }
    if (Array.isArray(node.phases) && 'value' in node)
      for (const phase of node.phases) use(phase, 'phase');
    return true;
  });
  return uses;
}

/** Every use of a name in a file; a declaration's own name is no use of it. */
export function usesOf(file: RulesFile): Use[] {
  const uses = [
    ...file.values.flatMap(({ value }) => usesIn(value)),
    ...file.places.flatMap(({ place }) => usesIn(place)),
    ...file.operator.flatMap(({ choices, step, first }) => usesIn({ choices, step, first })),
    ...file.draws.flatMap(({ choices, every, habits }) => usesIn({ choices, every, habits })),
    ...file.phases.flatMap(({ course }) => usesIn(course)),
    ...(file.end ? usesIn(file.end) : []),
  ];
  for (const rule of file.rules) {
    const { when, if: needed, sham, do: actions, limits, within, asked } = rule;
    // A rule's `within` is an amount, unlike the `within` of a measure.
    uses.push(
      ...usesIn({ when, needed, sham, actions, limits, asked }),
      ...usesIn({ amount: within }),
    );
  }
  return uses;
}
