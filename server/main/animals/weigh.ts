import { Command } from 'commander';
import { cardOn } from '../../animals/history.js';
import { levelOf, percentOf } from '../../animals/weight.js';
import { CAUTION, deskAt, grams, print, type WhereFlags, whereAndWho } from './options.js';
import { weightWords } from './words.js';

export interface EntryFlags extends WhereFlags {
  readonly by: string;
  readonly at?: string;
  readonly note?: string;
  readonly sure?: boolean;
}

/** Adds the options of what was found or done at some time. */
export function whenAndNote(command: Command): Command {
  return whereAndWho(command)
    .option('--at <time>', '18:30, or "2026-12-01 18:30"; now where nothing is said')
    .option('--note <text>')
    .option('--sure', 'it is right, however unlikely it looks');
}

/** `lapwing weigh NAME GRAMS`. */
export function weighCommand(): Command {
  return whenAndNote(new Command('weigh'))
    .description("write an animal's weight down; no session begins without today's")
    .argument('<animal>')
    .argument('<grams>', 'as the balance shows it, implant and all', grams)
    .action(async (animal: string, weighedG: number, flags: EntryFlags) => {
      const desk = deskAt(flags);
      const entry = await desk.weigh(animal, weighedG, flags);
      const { history, today } = await desk.history(animal);
      const card = cardOn(history, today);
      const percent = percentOf(card, weighedG);
      const level = levelOf(card, percent);
      const weighed = { day: today, at: entry.written, grams: weighedG, percent, level };
      const words = `${animal}: ${weightWords(weighed, card.leastPercent)} (of its corrected baseline).`;
      print(flags, { entry, percent, level }, level === 'fine' ? words : `${words} ${CAUTION}`);
    });
}
