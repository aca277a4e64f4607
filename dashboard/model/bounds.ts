import { isOnStep } from '../../server/rules/steps.js';
import { shown, shownUnit } from './units.js';

interface Bounded {
  readonly name: string;
  readonly unit: string;
  readonly least?: number;
  readonly most?: number;
  readonly step?: number;
  readonly options?: readonly (number | string)[];
}

/** Why what was typed cannot be chosen; empty when it can. What is typed is in the shown unit. */
export function boundsProblem(choice: Bounded, draft: string): string {
  if (choice.options) {
    return choice.options.some((option) => String(option) === draft)
      ? ''
      : 'Not one of the choices.';
  }
  if (draft.trim() === '' || !Number.isFinite(Number(draft))) return 'A number is wanted.';
  const { least, most, step, unit } = choice;
  const { word } = shownUnit(unit);
  const value = typedValue(choice, draft);
  if (least !== undefined && value < least) return `At least ${shown(least, unit)} ${word}.`;
  if (most !== undefined && value > most) return `At most ${shown(most, unit)} ${word}.`;
  if (step !== undefined && !isOnStep(value, least ?? 0, step)) {
    return `In steps of ${shown(step, unit)} ${word} from ${shown(least ?? 0, unit)}.`;
  }
  return '';
}

/** What was typed, in base units. */
export function typedValue({ unit }: Pick<Bounded, 'unit'>, draft: string): number {
  return Number((Number(draft) * shownUnit(unit).factor).toPrecision(12));
}
