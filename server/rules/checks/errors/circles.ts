import type { NameRef } from '../../ast.js';
import type { Check } from '../check.js';
import { usesIn } from '../uses.js';

/** Values, places, draws and choices that need each other. */
export const circles: Check = ({ file, problems }) => {
  const needs = new Map<string, { readonly name: NameRef; readonly uses: readonly NameRef[] }>();
  const add = (name: NameRef, piece: unknown): void => {
    const uses = usesIn(piece).filter(({ as }) => ['amount', 'span', 'option'].includes(as));
    needs.set(name.name, { name, uses: uses.map(({ ref }) => ref) });
  };
  for (const { name, value } of file.values) add(name, value);
  for (const { name, place } of file.places) add(name, place);
  for (const { name, choices } of file.operator) add(name, { choices });
  for (const { name, choices, habits } of file.draws) add(name, { choices, habits });
  reportCircles(needs, (path, closing) => {
    const also = path.map((name) => ({ at: name.at, note: `\`${name.name}\` is in the circle` }));
    const names = [...path, path[0]!].map(({ name }) => `\`${name}\``).join(' needs ');
    problems.report('circle', closing.at, names, {
      expected: 'one of them without the others',
      also,
    });
  });
};

interface Needs {
  readonly name: NameRef;
  readonly uses: readonly NameRef[];
}

/** Finds each circle once, by walking depth first without recursion. */
export function reportCircles(
  needs: ReadonlyMap<string, Needs>,
  report: (path: readonly NameRef[], closing: NameRef) => void,
): void {
  const done = new Set<string>();
  for (const root of needs.keys()) {
    const path: { readonly needs: Needs; next: number }[] = [];
    const enter = (name: string): void => {
      const found = needs.get(name);
      if (found && !done.has(name)) path.push({ needs: found, next: 0 });
    };
    enter(root);
    while (path.length > 0) {
      const top = path.at(-1)!;
      const use = top.needs.uses[top.next++];
      if (!use) {
        done.add(top.needs.name.name);
        path.pop();
        continue;
      }
      const start = path.findIndex((step) => step.needs.name.name === use.name);
      if (start >= 0)
        report(
          path.slice(start).map((step) => step.needs.name),
          use,
        );
      else enter(use.name);
    }
  }
}
