/** What the Animals page knows, and how it says it. Nothing here touches the screen. */
import type {
  AnimalCard,
  AnimalsAsk,
  AnimalsTold,
  AnimalTold,
  DayWater,
  Entry,
  WeighedOn,
  WeightLevel,
} from '../../server/web/animals/animalsMessages.js';
import { fixed } from './format.js';
import type { Level } from './health.js';
import type { Notice } from './rehearse.js';

export interface Animals {
  list: AnimalsTold | undefined;
  /** Why there is no list: no folder is named, or the share is away. */
  trouble: { readonly text: string; readonly remedy: string } | undefined;
  open: string | undefined;
  animal: AnimalTold | undefined;
  /** The form for a new animal, or for changing the one that is open, is shown. */
  form: 'none' | 'add' | 'change';
  notice: Notice | undefined;
  /** An entry that looked mistyped, to be sent again if it is right. */
  doubted: AnimalsAsk | undefined;
  busy: boolean;
  /** Counts what was written, so that forms begin anew. */
  written: number;
}

export function emptyAnimals(): Animals {
  return {
    ...{ list: undefined, trouble: undefined, open: undefined, animal: undefined },
    ...{ form: 'none', notice: undefined, doubted: undefined, busy: false, written: 0 },
  };
}

export const LEVELS: Readonly<Record<WeightLevel, Level>> = {
  fine: 'good',
  near: 'warn',
  below: 'bad',
  unknown: 'off',
};

export const LEVEL_WORDS: Readonly<Record<WeightLevel, string>> = {
  fine: 'above its limit',
  near: 'near its limit',
  below: 'below its limit',
  unknown: 'no baseline',
};

export const STATE_WORDS: Readonly<Record<AnimalCard['state'], string>> = {
  restricted: 'on a water target',
  free: 'free water',
  left: 'not here any more',
};

export function millilitres(ul: number): string {
  if (ul > 0 && ul < 100) return `${fixed(ul, ul < 10 ? 1 : 0)} µL`;
  return `${fixed(ul / 1_000, 2)} mL`;
}

/** "none", "0.35 mL", "0.35–0.41 mL"; empty for an animal without a target. */
export function dueWords({ due, open }: DayWater): string {
  if (due === null) return '';
  if (due.mostUl === 0) return 'none';
  const least = fixed(due.leastUl / 1_000, 2);
  const most = fixed(due.mostUl / 1_000, 2);
  const words = least === most ? `${most} mL` : `${least}–${most} mL`;
  return open.length > 0 ? `at most ${words}` : words;
}

/** What it has had, a phrase a source. */
export function hadParts(water: DayWater): string[] {
  return [
    ...(water.earnedUl > 0 || water.sessions.length > 0
      ? [`${millilitres(water.earnedUl)} earned`]
      : []),
    ...(water.uncertainUl > 0 ? [`${millilitres(water.uncertainUl)} uncertain`] : []),
    ...(water.notLickedUl > 0 ? [`${millilitres(water.notLickedUl)} perhaps not drunk`] : []),
    ...(water.byHandUl > 0 ? [`${millilitres(water.byHandUl)} by hand`] : []),
    ...(water.open.length > 0 ? ['a session not in the book yet'] : []),
  ];
}

export function weightWords(weighed: WeighedOn | null): string {
  if (weighed === null) return 'not weighed today';
  const { grams, percent } = weighed;
  return percent === null ? `${fixed(grams, 1)} g` : `${fixed(grams, 1)} g, ${fixed(percent, 1)} %`;
}

/** Grams, microlitres and percent as people type them: a comma will do, and a unit. */
export function numberIn(text: string): number | undefined {
  const found = /^\s*(\d+(?:[.,]\d+)?)\s*(?:g|mL|ml|%)?\s*$/.exec(text);
  return found ? Number(found[1]!.replace(',', '.')) : undefined;
}

/** Day and minute of an entry, in the colony's own zone as written. */
export function whenWords(at: string): string {
  return at.slice(0, 16).replace('T', ' ');
}

export function entryWords(entry: Entry): string {
  switch (entry.kind) {
    case 'weight':
      return `weighed ${entry.grams} g${noted(entry.note)}`;
    case 'water':
      return `${millilitres(entry.ul)} by hand${noted(entry.note)}`;
    case 'session began':
      return entry.override === undefined
        ? `session began on ${entry.rig}`
        : `session began on ${entry.rig} although ${entry.override.against.join('; ')}: “${entry.override.reason}”`;
    case 'session ended': {
      const { givenUl, drops, notLickedDrops } = entry.water;
      const missed = notLickedDrops > 0 ? `, ${notLickedDrops} perhaps not drunk` : '';
      return `session gave ${millilitres(givenUl)} in ${drops} drops${missed}`;
    }
    case 'card':
      return `${cardWords(entry.set)}${entry.from === undefined ? '' : `, from ${entry.from}`}${noted(entry.reason)}`;
    case 'correction':
      return `corrects an entry: ${correctionWords(entry)}${noted(entry.reason)}`;
  }
}

export const FIELD_WORDS: Readonly<Record<keyof AnimalCard, string>> = {
  sex: 'sex',
  bornOn: 'born',
  strain: 'strain',
  baselineG: 'baseline, g',
  baselineOn: 'baseline weighed on',
  implantG: 'implant, g',
  implantInBaseline: 'implant in baseline',
  protocol: 'protocol',
  targetUl: 'water a day, µL',
  leastPercent: 'alarm level, %',
  state: 'state',
  note: 'note',
};

function cardWords(set: Partial<AnimalCard>): string {
  return Object.entries(set)
    .map(([field, value]) => `${FIELD_WORDS[field as keyof AnimalCard]} ${valueWords(value)}`)
    .join(', ');
}

function valueWords(value: unknown): string {
  if (value === null || value === '') return 'not said';
  if (typeof value === 'boolean') return value ? 'yes' : 'no';
  return String(value);
}

function correctionWords({ grams, ul }: Extract<Entry, { kind: 'correction' }>): string {
  if (grams !== undefined) return `${grams} g`;
  return ul === undefined ? 'struck out' : millilitres(ul);
}

function noted(note: string | undefined): string {
  return note ? ` (${note})` : '';
}
