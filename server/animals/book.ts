import { readdirSync } from 'node:fs';
import { basename, join } from 'node:path';
import { LapwingError } from '../errors/codes.js';
import { type AnimalBefore, readDescription } from '../session/description.js';
import { subjectInName } from '../session/folder.js';
import { AnimalsFolder, type Reading, unknownAnimal } from './animalsFolder.js';
import { beforeSession } from './beginning.js';
import { dayAfter, dayOf } from './days.js';
import type { Override } from './entry.js';
import { type History, historyOf } from './history.js';
import { sessionWaterOf } from './sessionWater.js';

/** A subject of this name is no animal: the rig runs by hand, or empty. */
export const NOBODY = 'nobody';

/** What a loop that is about to begin a session wants to know. */
export interface BeforeQuestion {
  readonly ask: 'before';
  readonly folder: string;
  readonly subject: string;
  readonly rig: string;
  readonly recordFolder: string;
}
export interface BeforeAnswer {
  readonly animal: AnimalBefore;
  /** All that it may have had today; undefined where the book does not know the animal. */
  readonly hadTodayUl?: number;
}

export interface BeganQuestion {
  readonly ask: 'began';
  readonly sessionFolder: string;
}
/** File what a session gave, as its folder says. */
export interface EndedQuestion {
  readonly ask: 'ended';
  readonly sessionFolder: string;
  /** Instead of the one that its description names. */
  readonly folder?: string;
}

/**
 * What the book says of an animal before a session. Sessions of this rig that should be in the book
 * and are not (the share was away, the computer died) are filed first.
 */
export async function before(question: BeforeQuestion, now = new Date()): Promise<BeforeAnswer> {
  const { folder, subject, rig, recordFolder } = question;
  const nothing = { weightG: null, percent: null, leastPercent: null, targetUl: null };
  const unkept = { folder, rig, kept: false, ...nothing, protocol: '' };
  if (subject === NOBODY) return { animal: { ...unkept, against: [] } };
  const animals = new AnimalsFolder(folder);
  let reading: Reading;
  try {
    reading = await animals.read();
  } catch (error) {
    return { animal: { ...unkept, against: [(error as Error).message] } };
  }
  let history = historyIn(reading, subject);
  if (history === undefined) {
    const { message } = unknownAnimal(subject, [...reading.entries.keys()]);
    return { animal: { ...unkept, against: [message] } };
  }
  if (await fileLeftOver(animals, history, recordFolder, rig, now, reading.zone)) {
    history = historyIn(await animals.read(), subject)!;
  }
  const { hadTodayUl, day, ...found } = beforeSession(history, now, reading.zone);
  return { animal: { folder, rig, kept: true, ...found }, hadTodayUl };
}

/** Notes that a session began. */
export async function began({ sessionFolder }: BeganQuestion): Promise<void> {
  const { subject, startedAt, experimenter, animal } = readDescription(sessionFolder);
  if (animal?.kept !== true) return;
  const { folder, rig, against, despite } = animal;
  const override: { override?: Override } =
    despite === undefined ? {} : { override: { reason: despite, against } };
  const session = basename(sessionFolder);
  await new AnimalsFolder(folder).add(
    subject,
    { kind: 'session began', at: startedAt, session, rig, ...override },
    experimenter ?? '',
  );
}

/**
 * Files what a session gave; one that is in the book already with the same water is left as it is.
 * @returns what it gave, or undefined where its animal is not kept
 */
export async function ended(
  { sessionFolder, folder }: EndedQuestion,
  progress: (done: number) => void = () => {},
) {
  const { subject, startedAt, experimenter, animal } = readDescription(sessionFolder);
  const into = folder ?? (animal?.kept === true ? animal.folder : undefined);
  if (into === undefined) return undefined;
  const animals = new AnimalsFolder(into);
  const reading = await animals.read();
  const history = historyIn(reading, subject);
  if (history === undefined) throw unknownAnimal(subject, [...reading.entries.keys()]);
  const session = basename(sessionFolder);
  const water = await sessionWaterOf(sessionFolder, progress);
  const there = history.sessions.find((one) => one.session === session);
  if (there?.correction === null && JSON.stringify(there.water) === JSON.stringify(water))
    return water;
  if (there !== undefined && there.correction !== null) {
    const what = `${session} is in the book and was corrected by hand (${there.correction})`;
    throw new LapwingError('animalsEntryBad', `${what}.`);
  }
  const rig = animal?.rig ?? there?.rig ?? '';
  const fact = { kind: 'session ended', at: startedAt, session, rig, water } as const;
  await animals.add(subject, fact, experimenter ?? '');
  return water;
}

/** Files sessions of this rig, of yesterday and today, that the book does not know to have ended. */
async function fileLeftOver(
  animals: AnimalsFolder,
  history: History,
  recordFolder: string,
  rig: string,
  now: Date,
  zone: string,
): Promise<boolean> {
  const today = dayOf(now, zone);
  const days = [dayAfter(today, -1), today, dayAfter(today)];
  const own = namesIn(recordFolder).filter(
    (name) => days.includes(name.slice(0, 10)) && name.includes(subjectInName(history.name)),
  );
  let filed = false;
  for (const name of own) {
    const known = history.sessions.find(({ session }) => session === name);
    if (known?.water) continue;
    const sessionFolder = join(recordFolder, name);
    const description = await Promise.resolve()
      .then(() => readDescription(sessionFolder))
      .catch(() => undefined);
    if (description?.subject !== history.name || description.animal?.kept === false) continue;
    if (description.animal !== undefined && description.animal.rig !== rig) continue;
    try {
      await ended({ ask: 'ended', sessionFolder, folder: animals.folder });
      filed = true;
    } catch {
      // It stays open in the book, which says so.
    }
  }
  return filed;
}

function historyIn(reading: Reading, subject: string): History | undefined {
  const entries = reading.entries.get(subject);
  return entries && historyOf(subject, entries, reading.zone);
}

function namesIn(folder: string): string[] {
  try {
    return readdirSync(folder).sort();
  } catch {
    return [];
  }
}
