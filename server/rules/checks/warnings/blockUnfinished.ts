import type { Check } from '../check.js';
import { mostLaps, phasesOf } from '../course.js';
import { usesIn } from '../uses.js';

/** A block not finished when its phase of fixed length ends: the choices do not balance there. */
export const blockUnfinished: Check = ({ file, symbols, problems }) => {
  for (const draw of file.draws) {
    const block = draw.habits.find((habit) => habit.kind === 'blocks');
    if (block?.kind !== 'blocks' || draw.every.kind !== 'lap') continue;
    const users = file.rules.filter((rule) =>
      usesIn({ when: rule.when, asked: rule.if, sham: rule.sham, actions: rule.do }).some(
        ({ ref }) => ref.name === draw.name.name,
      ),
    );
    const phases = new Set(users.flatMap((rule) => phasesOf(rule, file)));
    for (const phase of phases) {
      const laps = mostLaps(phase, symbols);
      if (!Number.isFinite(laps) || laps % block.size === 0) continue;
      problems.report(
        'blockUnfinished',
        block.at,
        `\`${phase.name.name}\` has ${laps} laps, which blocks of ${block.size} do not fill`,
        {
          expected: `a phase of ${Math.ceil(laps / block.size) * block.size} laps, or another block`,
          also: [{ at: phase.at, note: 'the phase' }],
        },
      );
    }
  }
};
