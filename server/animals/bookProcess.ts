/**
 * The child process that asks and tells the water book for the loop: `node bookProcess.js QUESTION`,
 * the question and the answer as JSON. The folder may be on a share that hangs, and records take
 * seconds to read: neither may hold up a loop whose board waits for its next beat.
 */
import { LapwingError } from '../errors/codes.js';
import {
  type BeforeQuestion,
  type BeganQuestion,
  before,
  began,
  type EndedQuestion,
  ended,
} from './book.js';

type Question = BeforeQuestion | BeganQuestion | EndedQuestion;

async function answer(question: Question): Promise<object> {
  if (question.ask === 'before') return before(question);
  if (question.ask === 'began') await began(question);
  else await ended(question);
  // Not `done`, which `askChild` takes for progress.
  return { told: true };
}

try {
  const found = await answer(JSON.parse(process.argv[2] ?? '{}') as Question);
  process.stdout.write(`${JSON.stringify(found)}\n`);
} catch (error) {
  const { message } = error as Error;
  const code = error instanceof LapwingError ? error.code : 'ANIMALS_FOLDER_BAD';
  process.stdout.write(`${JSON.stringify({ error: { code, message } })}\n`);
  process.exitCode = 1;
}
