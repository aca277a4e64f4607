import type { NameRef } from '../../ast.js';
import type { Check } from '../check.js';
import { reportCircles } from './circles.js';

/** Rules that fire each other with no time between: one instant would never end. */
export const firingCircles: Check = ({ file, problems }) => {
  const needs = new Map<string, { name: NameRef; uses: NameRef[] }>();
  for (const { name, when } of file.rules) {
    needs.set(name.name, { name, uses: when.kind === 'fires' ? [when.rule] : [] });
  }
  reportCircles(needs, (path, closing) => {
    const names = [...path, path[0]!].map(({ name }) => `\`${name}\``).join(' waits for ');
    problems.report('firingCircle', closing.at, `${names} within one instant`, {
      expected: 'a time between, such as `1 s after water fires`',
      also: path.map((name) => ({ at: name.at, note: `\`${name.name}\` is in the circle` })),
    });
  });
};
