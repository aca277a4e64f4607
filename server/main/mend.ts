import { resolve } from 'node:path';
import { Command } from 'commander';
import { ended } from '../animals/book.js';
import { mend } from '../session/record/mend.js';
import { describeTroubles } from '../session/record/recordState.js';

/** `lapwing mend SESSION`: closes a record that was left open or torn. */
export function mendCommand(): Command {
  return new Command('mend')
    .description('close a record that a crash left open, and say what is missing')
    .argument('<session>', 'the session folder')
    .action(async (folder: string) => {
      const { state, bytes } = await mend(folder);
      const troubles = describeTroubles(state);
      const lines = [
        `${state.messages} messages up to input ${state.lastInput}, ${(bytes / 1e6).toFixed(1)} MB`,
        ...(troubles.length === 0 ? ['nothing is missing'] : troubles),
        ...(await bookWords(resolve(folder))),
      ];
      process.stdout.write(`${lines.join('\n')}\n`);
    });
}

/** What the session gave goes into the water book, where one is kept for its animal. */
async function bookWords(sessionFolder: string): Promise<string[]> {
  try {
    const water = await ended({ ask: 'ended', sessionFolder });
    return water === undefined ? [] : [`${water.givenUl.toFixed(1)} uL are in the water book`];
  } catch (error) {
    return [`the water book was not told: ${(error as Error).message}`];
  }
}
