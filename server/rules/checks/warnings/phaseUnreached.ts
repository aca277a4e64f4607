import type { PhaseDecl } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { contradictory, keyOf } from '../contradiction.js';
import {
  alternativesOf,
  firingsCannotReach,
  jumps,
  mostInSession,
  reachedPhases,
} from '../course.js';
import { intervalOf } from '../interval.js';

/** Can the phase end by what it says itself? */
export function hasWayOut({ symbols }: CheckContext, { course }: PhaseDecl): boolean {
  if (course.kind === 'to the end') return false;
  if (course.kind === 'for') return true;
  return alternativesOf(course.condition).some(
    (term) => !contradictory([term], symbols) && !firingsCannotReach(term, symbols),
  );
}

/** Phases that the session never comes to. */
export const phaseUnreached: Check = (context) => {
  const { file, problems } = context;
  const reached = reachedPhases(file, (phase) => hasWayOut(context, phase));
  let before: PhaseDecl | undefined;
  for (const phase of file.phases) {
    if (!reached.has(phase.name.name)) {
      problems.report(
        'phaseUnreached',
        phase.name.at,
        `the phase \`${phase.name.name}\` is never reached`,
        {
          expected: 'a phase before it that ends, or a rule that says `go to`',
          ...(before ? { also: [{ at: before.at, note: 'this phase goes on to the end' }] } : {}),
        },
      );
      continue;
    }
    if (!hasWayOut(context, phase)) before = phase;
  }
  for (const rule of file.rules) {
    const moment = rule.when.kind === 'after' ? rule.when.moment : rule.when;
    if (moment.kind !== 'begins' || typeof moment.what === 'string') continue;
    if (reached.has(moment.what.name)) continue;
    const also = [{ at: rule.name.at, note: `the rule \`${rule.name.name}\` can never fire` }];
    problems.report('neverTrue', moment.at, `the phase \`${moment.what.name}\` is never reached`, {
      also,
    });
  }
  if (reached.size === file.phases.length) endsBefore(context);
};

/** Phases of fixed length that together outlast the session. */
function endsBefore({ file, symbols, problems }: CheckContext): void {
  const { named, next } = jumps(file);
  if (named.size > 0 || next || !file.end) return;
  const most = mostInSession(file, symbols);
  const lapsDone = {
    kind: 'scoped',
    measure: 'laps done',
    scope: { kind: 'this', stretch: 'session' },
  };
  const mostLaps = most.get(keyOf(lapsDone)) ?? Infinity;
  const mostUs = most.get(keyOf({ kind: 'measure', measure: 'time' })) ?? Infinity;
  let laps = 0;
  let us = 0;
  for (const phase of file.phases) {
    if (laps >= mostLaps || us >= mostUs) {
      problems.report(
        'phaseUnreached',
        phase.name.at,
        `the session ends before \`${phase.name.name}\` begins`,
        {
          expected: 'shorter phases, or a later end',
          also: [{ at: file.end.at, note: 'the end' }],
        },
      );
      return;
    }
    if (phase.course.kind !== 'for' || phase.course.lengths.length !== 1) continue;
    const [length] = phase.course.lengths;
    if (length!.kind === 'laps') laps += intervalOf(length!.count, symbols).low;
    else us += intervalOf(length!.time, symbols).low;
  }
}
