import type { Check } from '../check.js';
import { KIND_WORDS } from '../symbols.js';
import { usesOf } from '../uses.js';

/** Values, places, draws, choices and tables that nothing uses; included ones are for other files. */
export const unusedName: Check = ({ file, symbols, problems }) => {
  const used = new Set(usesOf(file).map(({ ref }) => ref.name));
  for (const section of [file.values, file.operator, file.tables, file.draws, file.places]) {
    for (const { name } of section) {
      if (name.at.file !== 0 || used.has(name.name)) continue;
      const kind = KIND_WORDS[symbols.get(name.name)?.kind ?? 'broken'];
      problems.report('unusedName', name.at, `\`${name.name}\` is ${kind} that nothing uses`);
    }
  }
};
