import type { Day } from './days.js';

/** What is kept of an animal; every field may be unknown until somebody says it. */
export interface AnimalCard {
  readonly sex: 'female' | 'male' | 'unknown';
  readonly bornOn: Day | null;
  readonly strain: string;
  /** Weight from which the percent is taken, as weighed on `baselineOn`. */
  readonly baselineG: number | null;
  readonly baselineOn: Day | null;
  /** Head plate, cement, probe: what a weighing now holds that is not animal. */
  readonly implantG: number;
  /** The baseline was weighed with the implant on. */
  readonly implantInBaseline: boolean;
  /** The approved protocol that the limits below come from. */
  readonly protocol: string;
  /** Water a day, from the protocol. */
  readonly targetUl: number | null;
  /** From the protocol; 80 where nobody has said (common practice, no source). */
  readonly leastPercent: number;
  /** `restricted`: on a water target; `free`: has water all day; `left`: kept here no longer. */
  readonly state: 'restricted' | 'free' | 'left';
  readonly note: string;
}

/** What a session gave an animal, by the board's word. */
export interface SessionWater {
  readonly givenUl: number;
  /** Of drops that nobody can account for: given is between `givenUl` and that plus this. */
  readonly uncertainUl: number;
  readonly drops: number;
  /** Of `givenUl` and `drops`, those without a lick within 3 s: perhaps not drunk. */
  readonly notLickedUl: number;
  readonly notLickedDrops: number;
  /** The record could not be read: whether drops were licked is not known. */
  readonly licksUnknown?: boolean;
}

/** One thing that was found or done: what one file of the animals folder says. */
export type Fact =
  | {
      readonly kind: 'card';
      readonly set: Partial<AnimalCard>;
      /** The first day on which it holds; from the beginning where nothing is said. */
      readonly from?: Day;
      readonly reason?: string;
    }
  | { readonly kind: 'weight'; readonly at: string; readonly grams: number; readonly note?: string }
  | { readonly kind: 'water'; readonly at: string; readonly ul: number; readonly note?: string }
  | {
      readonly kind: 'session began';
      readonly at: string;
      readonly session: string;
      readonly rig: string;
      readonly override?: Override;
    }
  | {
      readonly kind: 'session ended';
      /** When the session began: its water belongs to that day. */
      readonly at: string;
      readonly session: string;
      readonly rig: string;
      readonly water: SessionWater;
    }
  | {
      readonly kind: 'correction';
      /** The entry that was wrong. */
      readonly of: string;
      /** What it should have said; without any, it is struck out. */
      readonly grams?: number;
      readonly ul?: number;
      readonly at?: string;
      readonly reason: string;
    };

/** Why a session was begun though something spoke against it. */
export interface Override {
  readonly reason: string;
  readonly against: readonly string[];
}

export type FactKind = Fact['kind'];

/** A fact with who wrote it down and where; `entry.schema.json` explains each field. */
export type Entry = Fact & {
  readonly format: 1;
  /** The file's name without `.json`; no two are ever the same. */
  readonly id: string;
  readonly animal: string;
  /** One more than the highest that the writer had seen of this animal: orders changes. */
  readonly step: number;
  /** By the writer's clock, RFC 3339. */
  readonly written: string;
  readonly computer: string;
  readonly by: string;
};

export const UNKNOWN_CARD: AnimalCard = {
  sex: 'unknown',
  bornOn: null,
  strain: '',
  baselineG: null,
  baselineOn: null,
  implantG: 0,
  implantInBaseline: false,
  protocol: '',
  targetUl: null,
  leastPercent: 80,
  state: 'restricted',
  note: '',
};
