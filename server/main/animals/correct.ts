import { Command } from 'commander';
import { LapwingError } from '../../errors/codes.js';
import { deskAt, grams, print, volumeUl, type WhereFlags, whereAndWho } from './options.js';
import { entryWords } from './words.js';

interface CorrectFlags extends WhereFlags {
  readonly by: string;
  readonly grams?: number;
  readonly water?: number;
  readonly strike?: boolean;
  readonly reason: string;
}

/** `lapwing correct NAME ENTRY`: by a new entry; the wrong one stays where it is. */
export function correctCommand(): Command {
  return whereAndWho(new Command('correct'))
    .description('correct or strike out a weight or water; the wrong entry stays, and is marked')
    .argument('<animal>')
    .argument('<entry>', 'its letters, as `lapwing animals show NAME` lists them')
    .option('--grams <grams>', 'what the weight should have been', grams)
    .option('--water <volume>', 'what the water should have been', volumeUl)
    .option('--strike', 'it should not be there at all')
    .requiredOption('--reason <text>', 'why')
    .action(async (animal: string, of: string, flags: CorrectFlags) => {
      const said = [flags.grams, flags.water, flags.strike].filter((one) => one !== undefined);
      if (said.length !== 1) {
        const what = 'Give one of --grams, --water and --strike.';
        throw new LapwingError('animalsEntryBad', what);
      }
      const to = { grams: flags.grams, ul: flags.water };
      const entry = await deskAt(flags).correct(animal, of, to, flags.reason, flags.by);
      print(flags, entry, entryWords(entry));
    });
}
