import { BASE_UNIT, type RulesFile } from '../rules/ast.js';
import { boundsOf, choiceBounds } from '../rules/engine/bounds.js';
import { Names } from '../rules/engine/names.js';
import type { Program } from '../rules/engine/program.js';

/** One of the operator's choices as a page shows it; amounts in base units. */
export interface ChoiceView {
  readonly name: string;
  /** The base unit; empty for a plain number or a word. */
  readonly unit: string;
  readonly least?: number;
  readonly most?: number;
  /** From the least upwards; anything between the bounds where nothing is said. */
  readonly step?: number;
  readonly options?: readonly (number | string)[];
}

/** What the operator may choose during a session, and between which bounds. */
export function choicesOf(file: RulesFile, program: Program): ChoiceView[] {
  const names = new Names(file, program.facts);
  return file.operator.map(({ name: { name }, choices, step }, index) => {
    const unit = BASE_UNIT[program.choices[index]!.dimension];
    if (choices.kind === 'between') {
      const steps = step ? { step: boundsOf(step, names).least } : {};
      return { name, unit, ...choiceBounds(choices, names), ...steps };
    }
    const options = choices.options.map((option) =>
      option.kind === 'quantity' ? option.value : option.name,
    );
    return { name, unit, options };
  });
}
