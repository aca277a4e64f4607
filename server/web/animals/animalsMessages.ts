/** What the Animals page and the service say to each other. */
import type { AnimalCard } from '../../animals/entry.js';
import type { AnimalPage, Overview } from '../../animals/overview.js';

export type { AnimalCard, Entry } from '../../animals/entry.js';
export type { AnimalSession } from '../../animals/history.js';
export type { AnimalPage, AnimalRow } from '../../animals/overview.js';
export type { DayWater } from '../../animals/waterBook.js';
export type { WeighedOn, WeightLevel } from '../../animals/weight.js';

/** `folder` is null where the rig file names none: no animal is kept then. */
export type AnimalsTold = Overview & { readonly folder: string | null };
export type AnimalTold = AnimalPage;

/** One entry to be written down. */
export type AnimalsAsk = { readonly animal: string; readonly by?: string } & (
  | { readonly do: 'add'; readonly set: Partial<AnimalCard> }
  | {
      readonly do: 'change';
      readonly set: Partial<AnimalCard>;
      readonly from?: string;
      readonly reason?: string;
    }
  | ({ readonly do: 'weigh'; readonly grams: number } & Said)
  | ({ readonly do: 'water'; readonly ul: number } & Said)
  | {
      readonly do: 'correct';
      readonly of: string;
      readonly grams?: number;
      readonly ul?: number;
      readonly reason: string;
    }
);

interface Said {
  readonly at?: string;
  readonly note?: string;
  readonly sure?: boolean;
}
