import { LapwingError } from '../errors/codes.js';
import { type AnimalsFolder, type Reading, unknownAnimal } from './animalsFolder.js';
import { type Day, dayOf, instantOf, inZone } from './days.js';
import type { AnimalCard, Entry, Fact } from './entry.js';
import { cardOn, type History, historyOf } from './history.js';
import { whyUnlikely } from './weight.js';

/** What a person says of when and who; `sure` is for an amount that looks mistyped. */
export interface Saying {
  /** `18:30`, `2026-12-01 18:30`, RFC 3339; now where nothing is said. */
  readonly at?: string | undefined;
  readonly note?: string | undefined;
  readonly by: string;
  readonly sure?: boolean | undefined;
}

/** By hand at once, more of a day's target than this looks mistyped. */
const MUCH_OF_TARGET = 2;
const FUTURE_MS = 120_000;

/** Everything that a person enters into the animals folder, checked as people mistype it. */
export class AnimalsDesk {
  constructor(
    readonly folder: AnimalsFolder,
    private readonly now: () => Date = () => new Date(),
  ) {}

  /** @throws LapwingError ANIMALS_UNKNOWN */
  async history(animal: string): Promise<{ history: History; reading: Reading; today: Day }> {
    const reading = await this.folder.read();
    const entries = reading.entries.get(animal);
    if (entries === undefined) throw unknownAnimal(animal, [...reading.entries.keys()]);
    const today = dayOf(this.now(), reading.zone);
    return { history: historyOf(animal, entries, reading.zone), reading, today };
  }

  /** @throws LapwingError ANIMALS_UNLIKELY for a weight half or half again the last, and as `add` */
  async weigh(animal: string, grams: number, saying: Saying): Promise<Entry> {
    const { history, reading, today } = await this.history(animal);
    const at = this.#when(saying.at, reading.zone, today);
    const why = whyUnlikely(history, grams, today);
    if (why !== undefined && saying.sure !== true) throw unlikely(why);
    return this.folder.add(animal, { kind: 'weight', at, grams, ...noted(saying) }, saying.by);
  }

  /** Water given by hand. @throws LapwingError ANIMALS_UNLIKELY beyond twice the day's target */
  async give(animal: string, ul: number, saying: Saying): Promise<Entry> {
    const { history, reading, today } = await this.history(animal);
    const at = this.#when(saying.at, reading.zone, today);
    const { targetUl } = cardOn(history, today);
    if (targetUl !== null && ul > MUCH_OF_TARGET * targetUl && saying.sure !== true) {
      throw unlikely(
        `${ul / 1_000} mL for ${animal}, whose target is ${targetUl / 1_000} mL a day`,
      );
    }
    return this.folder.add(animal, { kind: 'water', at, ul, ...noted(saying) }, saying.by);
  }

  /** Changes what is known of an animal, from a day on (today where nothing is said). */
  async change(
    animal: string,
    set: Partial<AnimalCard>,
    by: string,
    {
      from,
      reason,
    }: { readonly from?: Day | undefined; readonly reason?: string | undefined } = {},
  ): Promise<Entry> {
    const { today } = await this.history(animal);
    const why = reason ? { reason } : {};
    return this.folder.add(animal, { kind: 'card', set, from: from ?? today, ...why }, by);
  }

  /**
   * Corrects or strikes out an entry, by a new one. `of` is its id, or the first letters of the
   * random part when they are enough.
   * @throws LapwingError ANIMALS_ENTRY_BAD when there is no such entry, or it has no such amount
   */
  async correct(
    animal: string,
    of: string,
    to: { readonly grams?: number | undefined; readonly ul?: number | undefined },
    reason: string,
    by: string,
  ): Promise<Entry> {
    const { history } = await this.history(animal);
    const found = history.entries.filter(({ id }) => id === of || shortId(id).startsWith(of));
    const [entry] = found;
    if (entry === undefined || found.length > 1 || of === '') {
      const what = found.length > 1 ? 'is not enough to tell entries apart' : 'is no entry';
      throw bad(`${JSON.stringify(of)} ${what} of ${animal}`);
    }
    if (!['weight', 'water', 'session ended'].includes(entry.kind)) {
      throw bad(`${shortId(entry.id)} is no weight and no water; change a card by a new change`);
    }
    const amount = entry.kind === 'weight' ? to.ul : to.grams;
    if (amount !== undefined) {
      throw bad(`${shortId(entry.id)} is ${entry.kind === 'weight' ? 'a weight, g' : 'water, uL'}`);
    }
    const change = {
      ...(to.grams === undefined ? {} : { grams: to.grams }),
      ...(to.ul === undefined ? {} : { ul: to.ul }),
    };
    const fact: Fact = { kind: 'correction', of: entry.id, ...change, reason };
    return this.folder.add(animal, fact, by);
  }

  #when(text: string | undefined, zone: string, today: Day): string {
    const now = this.now();
    const at = text ? instantOf(text, zone, today) : now;
    if (at.getTime() > now.getTime() + FUTURE_MS) throw bad(`${text} is in the future`);
    return inZone(at, zone);
  }
}

/** Enough of an id to tell entries of one animal apart by eye. */
export function shortId(id: string): string {
  return id.slice(id.indexOf('-') + 1, id.indexOf('-') + 9);
}

function noted({ note }: Saying): { note?: string } {
  return note ? { note } : {};
}

function unlikely(what: string): LapwingError {
  return new LapwingError('animalsUnlikely', `${what}.`);
}

function bad(what: string): LapwingError {
  return new LapwingError('animalsEntryBad', `${what}.`);
}
