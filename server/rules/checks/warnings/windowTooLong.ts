import type { PhaseDecl, Scope } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { mostLaps, mostTimeUs, phasesOf } from '../course.js';
import { intervalOf } from '../interval.js';
import { walk } from '../walk.js';

/** `over the last 10 laps` in a phase of 5: nothing looks back past the start of its phase. */
export const windowTooLong: Check = (context) => {
  const { file } = context;
  for (const phase of file.phases) {
    if (phase.course.kind === 'until') check(context, phase.course, [phase]);
  }
  for (const rule of file.rules) check(context, rule, phasesOf(rule, file));
  if (file.end) check(context, file.end, file.phases);
};

function check(
  { symbols, problems }: CheckContext,
  piece: unknown,
  phases: readonly PhaseDecl[],
): void {
  if (phases.length === 0) return;
  walk(piece, (node) => {
    const scope = node as unknown as Scope;
    if (scope.kind !== 'last laps' && scope.kind !== 'last time') return;
    const wanted = intervalOf(scope.kind === 'last laps' ? scope.count : scope.time, symbols).low;
    const longest = phases.map((phase) =>
      scope.kind === 'last laps' ? mostLaps(phase, symbols) : mostTimeUs(phase, symbols),
    );
    if (longest.some((most) => most >= wanted)) return;
    problems.report('windowTooLong', scope.at, 'no phase in which this is asked lasts that long', {
      expected: 'a shorter window: it does not look back past the start of a phase',
      also: [{ at: phases[0]!.at, note: 'such a phase' }],
    });
  });
}
