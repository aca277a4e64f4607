import { mkdir, open, readdir, readFile } from 'node:fs/promises';
import os from 'node:os';
import { join } from 'node:path';
import { setTimeout as delay } from 'node:timers/promises';
import { LapwingError } from '../errors/codes.js';
import { nearestName } from '../rules/nearestName.js';
import { safeName } from '../session/safeName.js';
import { inZone, isZone, ownZone } from './days.js';
import type { Entry, Fact } from './entry.js';
import { newId, readEntryText, writeEntryFile } from './entryFile.js';

/** Something about the folder that a person should look at. */
export interface Trouble {
  readonly animal: string;
  readonly what: string;
}

/** All that the folder says: entries of each animal, in no order yet. */
export interface Reading {
  readonly zone: string;
  readonly entries: ReadonlyMap<string, readonly Entry[]>;
  readonly troubles: readonly Trouble[];
}

const LONGEST_NAME = 40;
const AT_ONCE = 16;
/** A file that another computer is still writing is whole a moment later. */
const WRITING_MS = 80;
const COLONY = 'colony.json';

/**
 * The folder in which animals are kept, possibly on a share that several rigs write to at once. Each
 * entry is a file of its own under a name of its own, so that no two writers ever touch one file
 * (`ANIMALS.md`). Everything is asynchronous: a share that hangs must not hang who asks.
 */
export class AnimalsFolder {
  /** Entries never change, so what was read whole once is not read again. */
  readonly #known = new Map<string, Entry>();
  #reading: Promise<Reading> | undefined;
  #zone: string | undefined;

  constructor(
    readonly folder: string,
    /** For tests of clocks that disagree. */
    private readonly now: () => Date = () => new Date(),
    private readonly computer = os.hostname(),
  ) {}

  /** Reads what is new; asked again meanwhile, one reading answers all. */
  read(): Promise<Reading> {
    this.#reading ??= this.#readAll().finally(() => {
      this.#reading = undefined;
    });
    return this.#reading;
  }

  /**
   * Writes a fact down as a new entry.
   * @throws LapwingError ANIMALS_UNKNOWN, ANIMALS_ENTRY_BAD, ANIMALS_FOLDER_BAD
   */
  async add(animal: string, fact: Fact, by: string): Promise<Entry> {
    const own = await this.#entriesOf(animal);
    if (own.length === 0) throw unknownAnimal(animal, await this.#names());
    return this.#write(animal, fact, by, own);
  }

  /** Begins to keep an animal. @throws LapwingError ANIMALS_EXISTS, and as `add` */
  async addAnimal(
    animal: string,
    card: Extract<Fact, { kind: 'card' }>,
    by: string,
  ): Promise<Entry> {
    if (safeName(animal, LONGEST_NAME, '') !== animal) {
      const what = `${JSON.stringify(animal)}: expected 1 to ${LONGEST_NAME} letters, digits, "-", "_" or ".", the first a letter or digit`;
      throw new LapwingError('animalsEntryBad', `${what}.`);
    }
    await this.#zoneOfColony(true);
    // Also where only the case differs: not every disk tells such folders apart.
    const same = (await this.#names()).find((name) => name.toLowerCase() === animal.toLowerCase());
    if (same !== undefined && (await this.#entriesOf(same)).length > 0) {
      throw new LapwingError('animalsExists', `${same} is kept already.`);
    }
    await this.#guarded(() => mkdir(join(this.folder, animal), { recursive: true }));
    return this.#write(animal, card, by, []);
  }

  async #write(animal: string, fact: Fact, by: string, seen: readonly Entry[]): Promise<Entry> {
    const zone = await this.#zoneOfColony(true);
    const now = this.now();
    const entry: Entry = {
      ...{ format: 1, id: newId(now), animal },
      step: 1 + seen.reduce((most, { step }) => Math.max(most, step), 0),
      ...{ written: inZone(now, zone), computer: this.computer, by },
      ...fact,
    };
    await this.#guarded(() => writeEntryFile(join(this.folder, animal), entry));
    this.#known.set(`${animal}/${entry.id}`, entry);
    return entry;
  }

  async #readAll(): Promise<Reading> {
    const zone = await this.#zoneOfColony(false);
    const entries = new Map<string, readonly Entry[]>();
    const troubles: Trouble[] = [];
    for (const name of await this.#names()) {
      const own = await this.#entriesOf(name, troubles);
      if (own.length > 0) entries.set(name, own);
    }
    return { zone, entries, troubles };
  }

  async #names(): Promise<string[]> {
    const found = await this.#guarded(() => readdir(this.folder, { withFileTypes: true }));
    return found.filter((entry) => entry.isDirectory() && !entry.name.startsWith('.')).map(nameOf);
  }

  async #entriesOf(animal: string, troubles: Trouble[] = []): Promise<readonly Entry[]> {
    if (safeName(animal, LONGEST_NAME, '') !== animal) return [];
    const folder = join(this.folder, animal);
    const names = await readdir(folder).catch(() => []);
    const ids = names.filter((name) => name.endsWith('.json')).map((name) => name.slice(0, -5));
    const entries: Entry[] = [];
    for (let n = 0; n < ids.length; n += AT_ONCE) {
      const some = ids.slice(n, n + AT_ONCE);
      for (const found of await Promise.all(some.map((id) => this.#entry(animal, id)))) {
        if ('why' in found) troubles.push({ animal, what: found.why });
        else entries.push(found);
      }
    }
    return entries;
  }

  async #entry(animal: string, id: string): Promise<Entry | { readonly why: string }> {
    const key = `${animal}/${id}`;
    const known = this.#known.get(key);
    if (known !== undefined) return known;
    const file = join(this.folder, animal, `${id}.json`);
    let found = await readEntryFile(file, id);
    if ('why' in found) {
      await delay(WRITING_MS);
      found = await readEntryFile(file, id);
    }
    if ('why' in found) return { why: `${animal}/${id}.json cannot be used: ${found.why}` };
    if (found.animal !== animal) return { why: `${key}.json is an entry of ${found.animal}` };
    this.#known.set(key, found);
    return found;
  }

  /** Days are this zone's, for every computer that shares the folder. */
  async #zoneOfColony(make: boolean): Promise<string> {
    if (this.#zone !== undefined) return this.#zone;
    const file = join(this.folder, COLONY);
    if (make) await this.#guarded(() => makeColony(this.folder, file));
    for (let attempt = 1; ; attempt++) {
      const text = await readFile(file, 'utf8').catch(() => undefined);
      if (text === undefined && !make) return ownZone();
      const zone = zoneIn(text ?? '');
      if (zone !== undefined) {
        this.#zone = zone;
        return zone;
      }
      // Whoever made it a moment ago is still writing.
      if (attempt === 10) {
        const what = `${file}: expected {"format": 1, "zone": "Europe/Lisbon"}`;
        throw new LapwingError('animalsFolderBad', `${what}, with a zone of the IANA database.`);
      }
      await delay(WRITING_MS);
    }
  }

  async #guarded<T>(work: () => Promise<T>): Promise<T> {
    try {
      return await work();
    } catch (error) {
      if (error instanceof LapwingError) throw error;
      const what = `${this.folder}: ${(error as Error).message}`;
      throw new LapwingError('animalsFolderBad', what, { cause: error });
    }
  }
}

export function unknownAnimal(animal: string, names: readonly string[]): LapwingError {
  const near = nearestName(animal, names);
  const known =
    names.length === 0 ? 'none is kept yet' : `kept are ${names.slice(0, 12).join(', ')}`;
  const guess = near === undefined ? known : `did you mean ${near}?`;
  return new LapwingError(
    'animalsUnknown',
    `No animal is called ${JSON.stringify(animal)}; ${guess}`,
  );
}

async function readEntryFile(file: string, id: string): Promise<Entry | { readonly why: string }> {
  try {
    return readEntryText(await readFile(file, 'utf8'), id);
  } catch (error) {
    return { why: (error as Error).message };
  }
}

async function makeColony(folder: string, file: string): Promise<void> {
  await mkdir(folder, { recursive: true });
  try {
    const made = await open(file, 'wx', 0o644);
    await made.writeFile(`${JSON.stringify({ format: 1, zone: ownZone() }, undefined, 2)}\n`);
    await made.close();
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error;
  }
}

function zoneIn(text: string): string | undefined {
  try {
    const { format, zone } = JSON.parse(text) as { format?: unknown; zone?: unknown };
    return format === 1 && typeof zone === 'string' && isZone(zone) ? zone : undefined;
  } catch {
    return undefined;
  }
}

function nameOf({ name }: { readonly name: string }): string {
  return name;
}
