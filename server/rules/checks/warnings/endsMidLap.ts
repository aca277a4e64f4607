import type { PhaseDecl } from '../../ast.js';
import type { Check } from '../check.js';
import { measuresIn, type Node, walk } from '../walk.js';

/** Phases that can end in mid-lap, so that the rest of the lap belongs to the next. */
export const endsMidLap: Check = ({ file, problems }) => {
  const placed = file.rules.find(({ when }) => ['reaches', 'enters', 'leaves'].includes(when.kind));
  if (!placed) return;
  file.phases.forEach((phase, index) => {
    const next = file.phases[index + 1];
    if (phase.atLapEnd || !next || !canEndMidLap(phase)) return;
    problems.report(
      'endsMidLap',
      phase.at,
      `\`${phase.name.name}\` can end in mid-lap: the places after that belong to \`${next.name.name}\``,
      {
        expected: '`, at lap end` if the lap should be whole',
        also: [{ at: placed.when.at, note: 'such a place' }],
      },
    );
  });
};

function canEndMidLap({ course }: PhaseDecl): boolean {
  if (course.kind === 'to the end') return false;
  if (course.kind === 'for') return course.lengths.some(({ kind }) => kind === 'time');
  let state = false;
  walk(course.condition, (node) => {
    if (node.kind === 'in' || node.kind === 'still') state = true;
    if (node.kind === 'is' && (node.subject as Node).kind === 'name') state = true;
  });
  return state || measuresIn(course.condition).some((measure) => !changesAtSeam(measure));
}

/** Measures that only change as a lap begins. */
function changesAtSeam(measure: Node): boolean {
  if (measure.kind === 'measure')
    return measure.measure === 'lap' || measure.measure === 'phase lap';
  if (measure.kind === 'since' || measure.kind === 'predicted') return false;
  return measure.measure === 'laps done' || (measure.scope as Node).kind === 'last laps';
}
