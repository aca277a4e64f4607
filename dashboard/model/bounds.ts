import { unitWords } from './format.js';

interface Bounded {
  readonly name: string;
  readonly unit: string;
  readonly least?: number;
  readonly most?: number;
  readonly options?: readonly (number | string)[];
}

/** Why what was typed cannot be chosen; empty when it can. */
export function boundsProblem(choice: Bounded, draft: string): string {
  if (choice.options) {
    return choice.options.some((option) => String(option) === draft)
      ? ''
      : 'Not one of the choices.';
  }
  const value = Number(draft);
  if (draft.trim() === '' || !Number.isFinite(value)) return 'A number is wanted.';
  const { least, most } = choice;
  const unit = unitWords(choice.unit);
  if (least !== undefined && value < least) return `At least ${least} ${unit}.`;
  if (most !== undefined && value > most) return `At most ${most} ${unit}.`;
  return '';
}
