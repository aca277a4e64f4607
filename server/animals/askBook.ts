import { askChild, compiledScript } from '../askChild.js';
import { LapwingError } from '../errors/codes.js';
import type { AnimalBefore } from '../session/description.js';
import { type BeforeAnswer, type BeforeQuestion, NOBODY } from './book.js';

/** Longer than a slow share takes; one that hangs must not keep an animal waiting on the belt. */
const ASKED_MS = 20_000;
/** Reading an hour's record takes seconds. */
const TOLD_MS = 120_000;

/**
 * Asks the book, in a process of its own, whether a session may begin.
 * @param despite why it is to begin whatever speaks against it
 * @throws LapwingError ANIMALS_AGAINST with everything that speaks against it
 */
export async function askBefore(
  question: Omit<BeforeQuestion, 'ask'>,
  despite: string | undefined,
): Promise<BeforeAnswer> {
  const answer = await ask<BeforeAnswer>({ ask: 'before', ...question }, ASKED_MS).catch(
    (error: Error): BeforeAnswer => ({ animal: unread(question, error.message) }),
  );
  const { against } = answer.animal;
  if (against.length === 0) return answer;
  if (despite === undefined) throw new LapwingError('animalsAgainst', `${against.join('. ')}.`);
  return { ...answer, animal: { ...answer.animal, despite } };
}

/** Tells the book, in a process of its own, that a session began. */
export async function tellBegan(sessionFolder: string): Promise<void> {
  await ask({ ask: 'began', sessionFolder }, TOLD_MS);
}

/** Tells the book, in a process of its own, what a session gave. */
export async function tellEnded(sessionFolder: string): Promise<void> {
  await ask({ ask: 'ended', sessionFolder }, TOLD_MS);
}

/** The words for whoever begins a session that no book looks after. */
export function noticeFor(subject: string, animal: AnimalBefore | undefined): string | undefined {
  if (subject === NOBODY) return undefined;
  if (animal === undefined)
    return `No animals folder is set for this rig, so nobody looks at the weight and the day's water of ${subject}.`;
  if (animal.kept) return undefined;
  return `${subject} is not kept in ${animal.folder}: its water will be in no book.`;
}

function unread({ folder, rig }: Omit<BeforeQuestion, 'ask'>, why: string): AnimalBefore {
  const nothing = { weightG: null, percent: null, leastPercent: null, targetUl: null };
  const against = [`the animals folder does not answer: ${why}`];
  return { folder, rig, kept: false, ...nothing, protocol: '', against };
}

function ask<Answer extends object>(question: object, timeoutMs: number): Promise<Answer> {
  const script = compiledScript(import.meta.url, './bookProcess.js');
  const args = [JSON.stringify(question)];
  return askChild<Answer>({
    ...{ script, args, timeoutMs },
    ...{ about: 'the animals folder', failure: 'animalsFolderBad' },
  });
}
