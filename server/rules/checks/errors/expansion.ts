import type { NameRef } from '../../ast.js';
import type { Check } from '../check.js';
import { usesIn } from '../uses.js';

/** Amounts that one name may come to when the names in it are filled in. */
const LARGEST = 2_000;

/**
 * Names that double in size from line to line (`b: a + a`, `c: b + b`, ...): whoever reckons them
 * would never end. Runs only on a file without circles.
 */
export const expansion: Check = ({ file, problems }) => {
  const uses = new Map<string, readonly NameRef[]>();
  const add = (name: NameRef, piece: unknown): void => {
    uses.set(
      name.name,
      usesIn(piece).map(({ ref }) => ref),
    );
  };
  for (const { name, value } of file.values) add(name, value);
  for (const { name, place } of file.places) add(name, place);
  for (const { name, choices } of file.operator) add(name, { choices });
  for (const { name, choices, habits } of file.draws) add(name, { choices, habits });
  const sizes = new Map<string, number>();
  // Every pass settles the names whose own names are settled: a chain of names is short or refused.
  for (let pass = 0; pass < uses.size && sizes.size < uses.size; pass++) {
    for (const [name, refs] of uses) {
      if (sizes.has(name)) continue;
      const parts = refs.map((ref) => (uses.has(ref.name) ? sizes.get(ref.name) : 1));
      if (parts.includes(undefined)) continue;
      sizes.set(name, 1 + parts.reduce<number>((sum, part) => sum + part!, 0));
    }
  }
  for (const [name, size] of sizes) {
    if (size <= LARGEST) continue;
    const decls = [...file.values, ...file.places, ...file.operator, ...file.draws];
    const at = decls.find((decl) => decl.name.name === name)!.name.at;
    problems.report(
      'tooLarge',
      at,
      `\`${name}\` names names that name names, too many times over`,
      {
        expected: 'fewer names within names',
      },
    );
    // Those that need it are too large as well.
    return;
  }
};
