import type { Scope, SpanExpr } from '../../ast.js';
import type { Check } from '../check.js';
import { walk } from '../walk.js';

/** `this visit` without a place to visit. */
export const visits: Check = ({ file, problems }) => {
  walk(file, (node) => {
    const scope = node.scope as Scope | undefined;
    const ofVisit = scope?.kind === 'this' && scope.stretch === 'visit';
    const nth = node.kind === 'nth lick' && node.stretch === 'visit';
    const within = node.within as SpanExpr | undefined;
    if ((!ofVisit && !nth) || within || !node.at) return;
    const takesPlace =
      nth || (node.kind === 'scoped' && ['licks', 'mean speed'].includes(node.measure as string));
    problems.report('visitWithoutPlace', scope?.at ?? node.at, '`this visit`, to what place?', {
      expected: takesPlace
        ? 'a place: `licks in zone this visit`'
        : 'another scope, such as `this lap`',
    });
  });
};
