import type { Trouble } from './animalsFolder.js';
import { type Day, dayOf } from './days.js';
import {
  type AnimalCard,
  type Entry,
  type Override,
  type SessionWater,
  UNKNOWN_CARD,
} from './entry.js';

/** How far apart two computers' clocks may seem before it is said. */
const CLOCKS_AGREE_MS = 60_000;

type Of<K extends Entry['kind']> = Extract<Entry, { kind: K }>;

/** What an entry says once its corrections are counted in. */
export interface Corrected {
  readonly id: string;
  readonly at: string;
  readonly day: Day;
  readonly by: string;
  readonly note: string;
  /** Said to have been wrong altogether; it counts for nothing. */
  readonly struck: boolean;
  /** Why it was corrected, where it was. */
  readonly correction: string | null;
}
export interface Weighing extends Corrected {
  readonly grams: number;
}
export interface HandWater extends Corrected {
  readonly ul: number;
}
export interface AnimalSession {
  readonly session: string;
  readonly rig: string;
  readonly at: string;
  readonly day: Day;
  readonly override: Override | null;
  /** null while it runs, or where it was never closed. */
  readonly water: SessionWater | null;
  /** Id of the entry that says what it gave. */
  readonly endId: string | null;
  readonly correction: string | null;
}

/** One animal, from its entries: in order, with corrections counted in. */
export interface History {
  readonly name: string;
  readonly entries: readonly Entry[];
  readonly cards: readonly Of<'card'>[];
  readonly weighings: readonly Weighing[];
  readonly handWater: readonly HandWater[];
  readonly sessions: readonly AnimalSession[];
  readonly troubles: readonly Trouble[];
}

/**
 * Puts an animal's entries together. Changes go in the order of their steps (a writer's step is one
 * more than any it had seen, after Lamport, "Time, clocks, and the ordering of events in a
 * distributed system", 1978), so that a change made in the knowledge of another follows it whatever
 * the clocks say; those made without knowing of each other go by their clocks, then by their ids.
 */
export function historyOf(name: string, found: readonly Entry[], zone: string): History {
  const entries = [...found].sort(inOrder);
  const of = <K extends Entry['kind']>(kind: K) =>
    entries.filter((entry): entry is Of<K> => entry.kind === kind);
  const corrections = new Map(of('correction').map((entry) => [entry.of, entry]));
  const corrected = (entry: Of<'weight'> | Of<'water'>): Corrected => {
    const change = corrections.get(entry.id);
    const at = change?.at ?? entry.at;
    return {
      ...{ id: entry.id, at, day: dayOf(new Date(at), zone), by: entry.by },
      note: entry.note ?? '',
      struck: change !== undefined && isStriking(change),
      correction: change?.reason ?? null,
    };
  };
  const weighings = of('weight').map((entry) => ({
    ...corrected(entry),
    grams: corrections.get(entry.id)?.grams ?? entry.grams,
  }));
  const handWater = of('water').map((entry) => ({
    ...corrected(entry),
    ul: corrections.get(entry.id)?.ul ?? entry.ul,
  }));
  return {
    ...{ name, entries, cards: of('card') },
    weighings: weighings.sort(byTime),
    handWater: handWater.sort(byTime),
    sessions: sessionsOf(of('session began'), of('session ended'), corrections, zone),
    troubles: [...clocksApart(name, entries), ...saidAtOnce(name, of('card'))],
  };
}

/** What is known of the animal on a day: of each field the last change that held by then. */
export function cardOn(history: History, day: Day): AnimalCard {
  const card: Record<string, unknown> = { ...UNKNOWN_CARD };
  const early = new Set<string>();
  for (const { set, from = '' } of history.cards) {
    for (const [field, value] of Object.entries(set)) {
      // Of a time before the first word on it, the first word is the best there is.
      const first = !early.has(field);
      if (from <= day || first) card[field] = value;
      early.add(field);
    }
  }
  return card as unknown as AnimalCard;
}

function isStriking({ grams, ul, at }: Of<'correction'>): boolean {
  return grams === undefined && ul === undefined && at === undefined;
}

function sessionsOf(
  began: readonly Of<'session began'>[],
  ended: readonly Of<'session ended'>[],
  corrections: ReadonlyMap<string, Of<'correction'>>,
  zone: string,
): AnimalSession[] {
  const sessions = new Map<string, AnimalSession>();
  for (const { session, rig, at, override = null } of began) {
    const day = dayOf(new Date(at), zone);
    const none = { water: null, endId: null, correction: null };
    sessions.set(session, { session, rig, at, day, override, ...none });
  }
  // Told again (after mending, say), the last word counts.
  for (const { id, session, rig, at, water } of ended) {
    const change = corrections.get(id);
    sessions.set(session, {
      ...{ session, rig, at, day: dayOf(new Date(at), zone), endId: id },
      override: sessions.get(session)?.override ?? null,
      water: change === undefined ? water : correctedWater(water, change),
      correction: change?.reason ?? null,
    });
  }
  return [...sessions.values()].sort(byTime);
}

function correctedWater(water: SessionWater, change: Of<'correction'>): SessionWater {
  if (change.ul === undefined && !isStriking(change)) return water;
  return {
    ...{ givenUl: change.ul ?? 0, uncertainUl: 0, drops: water.drops },
    ...{ notLickedUl: 0, notLickedDrops: 0 },
  };
}

function inOrder(a: Entry, b: Entry): number {
  return (
    a.step - b.step ||
    Date.parse(a.written) - Date.parse(b.written) ||
    (a.id < b.id ? -1 : a.id > b.id ? 1 : 0)
  );
}

function byTime(a: { readonly at: string }, b: { readonly at: string }): number {
  return Date.parse(a.at) - Date.parse(b.at);
}

/** A later step with an earlier clock, on another computer: the two disagree by at least that. */
function clocksApart(animal: string, entries: readonly Entry[]): Trouble[] {
  const most = new Map<string, number>();
  let latest: Entry | undefined;
  for (const entry of entries) {
    if (latest !== undefined && entry.step > latest.step && entry.computer !== latest.computer) {
      const apartMs = Date.parse(latest.written) - Date.parse(entry.written);
      const pair = `${entry.computer} is behind that of ${latest.computer}`;
      if (apartMs > CLOCKS_AGREE_MS) most.set(pair, Math.max(apartMs, most.get(pair) ?? 0));
    }
    if (latest === undefined || Date.parse(entry.written) > Date.parse(latest.written))
      latest = entry;
  }
  return [...most].map(([pair, ms]) => ({
    animal,
    what: `the clock of ${pair}, by ${Math.floor(ms / 60_000)} min or more: set both by a time server`,
  }));
}

/** Two computers that changed a field at the same step did not know of each other. */
function saidAtOnce(animal: string, cards: readonly Of<'card'>[]): Trouble[] {
  const troubles: Trouble[] = [];
  cards.forEach((card, n) => {
    const before = cards[n - 1];
    if (before === undefined || before.step !== card.step) return;
    for (const [field, value] of Object.entries(card.set)) {
      const other = (before.set as Record<string, unknown>)[field];
      if (other === undefined || other === value) return;
      const what = `${field} was set to ${other} (${before.by}) and to ${value} (${card.by}) at once; the second holds`;
      troubles.push({ animal, what });
    }
  });
  return troubles;
}
