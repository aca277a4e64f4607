import type { RulesFile } from '../rules/ast.js';

/** What a reader of many runs' figures has to know of how they came about. */
export function runsNotes(
  file: RulesFile,
  { everyFrame, minutes }: { readonly everyFrame: boolean; readonly minutes: number },
): string[] {
  const notes = [
    'A simulated animal is no animal: the figures say what the rules can do, not what yours will.',
    `A session that did not end by itself was ended after ${minutes} minutes.`,
  ];
  const pressed = file.rules.filter(({ when }) => waitsForPress(when)).map(({ name }) => name.name);
  if (pressed.length > 0) notes.push(`Nobody presses buttons: ${pressed.join(', ')}.`);
  if (everyFrame) return notes;
  notes.push(
    'Between places, licks, inputs and delays the board was looked at 50 times a second: a condition that is watched is seen up to 20 ms late (--every-frame: 1000 times, and five times slower).',
  );
  const watching = file.rules.filter(({ when }) => when.kind === 'becomes' && !when.lasting);
  if (watching.length > 0) {
    const names = watching.map(({ name }) => name.name).join(', ');
    notes.push(`A threshold that hovers is crossed less often that way: ${names}.`);
  }
  return notes;
}

function waitsForPress(when: RulesFile['rules'][number]['when']): boolean {
  return when.kind === 'after' ? when.moment.kind === 'presses' : when.kind === 'presses';
}
