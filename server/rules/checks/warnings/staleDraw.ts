import type { Check } from '../check.js';
import { usesIn } from '../uses.js';

/** A draw read some time after the firing that renews it: it is the next one by then. */
export const staleDraw: Check = ({ file, problems }) => {
  for (const draw of file.draws) {
    if (draw.every.kind !== 'firing') continue;
    const renewer = draw.every.of.name;
    for (const { when, if: asked, sham, do: actions, name } of file.rules) {
      const late =
        when.kind === 'after' && when.moment.kind === 'fires' && when.moment.rule.name === renewer;
      const delayed = name.name === renewer ? actions.filter(({ delay }) => delay) : [];
      const pieces = late ? { asked, sham, actions } : { delayed: delayed.map(({ body }) => body) };
      for (const { ref } of usesIn(pieces)) {
        if (ref.name !== draw.name.name) continue;
        problems.report('staleDraw', ref.at, `by then \`${ref.name}\` has its next value`, {
          expected: 'to read it when the rule itself fires',
          also: [{ at: draw.every.at, note: `\`${renewer}\` renews it when it fires` }],
        });
      }
    }
  }
};
