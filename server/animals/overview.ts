import type { Trouble } from './animalsFolder.js';
import { type Day, dayOf } from './days.js';
import type { AnimalCard, Entry } from './entry.js';
import { type AnimalSession, cardOn, type History, historyOf } from './history.js';
import { type DayWater, waterByDay, waterOn } from './waterBook.js';
import { lastWeighing, type WeighedOn, weighedOn, weightsOf } from './weight.js';

/** One animal as a list shows it. */
export interface AnimalRow {
  readonly animal: string;
  readonly card: AnimalCard;
  /** Today's weighing, or null. */
  readonly today: WeighedOn | null;
  readonly last: WeighedOn | null;
  readonly water: DayWater;
  readonly lastSession: AnimalSession | null;
  /** Why it stands on the evening list; empty when nothing is due any more. */
  readonly evening: string;
}

/** All animals now: what the page and the commands show. */
export interface Overview {
  readonly zone: string;
  readonly day: Day;
  readonly animals: readonly AnimalRow[];
  readonly troubles: readonly Trouble[];
}

/** One animal with all that was kept of it. */
export interface AnimalPage extends AnimalRow {
  readonly zone: string;
  readonly day: Day;
  readonly weights: readonly WeighedOn[];
  readonly days: readonly DayWater[];
  readonly sessions: readonly AnimalSession[];
  readonly entries: readonly Entry[];
  readonly troubles: readonly Trouble[];
}

/** The row of one animal on the day of `now`. */
export function rowOf(history: History, day: Day): AnimalRow {
  const water = waterOn(history, day);
  const card = cardOn(history, day);
  return {
    animal: history.name,
    card,
    today: weighedOn(history, day) ?? null,
    last: lastWeighing(history) ?? null,
    water,
    lastSession: history.sessions.at(-1) ?? null,
    evening: eveningWords(card, water),
  };
}

export function overviewOf(
  histories: readonly History[],
  troubles: readonly Trouble[],
  now: Date,
  zone: string,
): Overview {
  const day = dayOf(now, zone);
  const animals = histories.map((history) => rowOf(history, day));
  const ahead = histories.flatMap((history) => clocksAhead(history, now));
  const own = histories.flatMap((history) => history.troubles);
  return { zone, day, animals, troubles: [...troubles, ...own, ...ahead] };
}

export function pageOf(history: History, now: Date, zone: string, days: number): AnimalPage {
  const day = dayOf(now, zone);
  return {
    ...rowOf(history, day),
    ...{ zone, day, weights: weightsOf(history), days: waterByDay(history, day, days) },
    sessions: [...history.sessions].reverse(),
    entries: [...history.entries].reverse(),
    troubles: [...history.troubles, ...clocksAhead(history, now)],
  };
}

/** Histories of all animals in a reading, by name. */
export function historiesOf(
  entries: ReadonlyMap<string, readonly Entry[]>,
  zone: string,
): History[] {
  return [...entries]
    .map(([name, found]) => historyOf(name, found, zone))
    .sort((a, b) => a.name.localeCompare(b.name, 'en', { numeric: true }));
}

/** Animals that are still due water today, and those of whom it is not known. */
export function eveningList(overview: Overview): AnimalRow[] {
  return overview.animals.filter(({ evening }) => evening !== '');
}

function eveningWords({ state, targetUl }: AnimalCard, water: DayWater): string {
  if (state !== 'restricted') return '';
  if (targetUl === null) return 'no target is known: say what the protocol gives it a day';
  if (water.open.length > 0) return 'a session is not in the book yet: see what it gave first';
  if (water.due!.mostUl === 0) return '';
  const had = water.earnedUl + water.byHandUl + water.uncertainUl > 0;
  if (!had) return 'no water today';
  return water.due!.leastUl === 0 ? 'perhaps not all was drunk' : 'less than its target';
}

const AHEAD_MS = 120_000;

function clocksAhead({ name, entries }: History, now: Date): Trouble[] {
  const ahead = new Set<string>();
  for (const { written, computer } of entries) {
    if (Date.parse(written) - now.getTime() > AHEAD_MS) ahead.add(computer);
  }
  return [...ahead].map((computer) => ({
    animal: name,
    what: `${computer} wrote an entry in the future: its clock or this computer's is wrong`,
  }));
}
