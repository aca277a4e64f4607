import type { Mark } from '../ast.js';
import type { Builder } from './builder.js';
import { pointOf, spanOf } from './compileSum.js';
import type { Amount } from './program.js';

/** The index of a mark, set by the engine whenever its event happens. */
export function markOf(b: Builder, mark: Mark): number {
  switch (mark.kind) {
    case 'lick mark': {
      const span = mark.within ? spanOf(b, mark.within) : -1;
      return b.mark(`lick ${span}`, (index) => b.lickMarks.push({ span, mark: index }));
    }
    case 'place mark': {
      const { name } = mark.place;
      if (mark.event === 'reaches') {
        const point = pointOf(b, { kind: 'name', name, at: mark.place.at });
        return b.mark(`reaches ${point}`, (index) => b.points[point]!.marks.push(index));
      }
      const span = spanOf(b, mark.place);
      const list = mark.event === 'enters' ? 'enterMarks' : 'leaveMarks';
      return b.mark(`${mark.event} ${span}`, (index) => {
        b.spans[span]!.tracked = true;
        b.spans[span]![list].push(index);
      });
    }
    case 'name mark': {
      const { name } = mark.name;
      if (mark.event === 'begins') {
        const phase = b.names.need(name, 'phase').index;
        return b.mark(`begins ${phase}`, (index) => b.phaseMarks.push({ phase, mark: index }));
      }
      const input = b.names.need(name, 'input').index;
      const rises = mark.event === 'rises';
      return b.mark(`${mark.event} ${input}`, (index) => {
        b.inputMarks.push({ input, rises, mark: index });
      });
    }
  }
}

/** Time or laps since a mark; longer than any number when it never was. */
export function placeMarkSince(mark: number, unit: 'time' | 'laps'): Amount {
  if (unit === 'time') return (s) => s.nowUs - s.marks[mark]!.atUs;
  return (s) => s.lap - s.marks[mark]!.lap;
}
