import { resolve } from 'node:path';
import { Command } from 'commander';
import { ended } from '../../animals/book.js';
import { eveningList } from '../../animals/overview.js';
import { waterOn } from '../../animals/waterBook.js';
import { LapwingError } from '../../errors/codes.js';
import { progressBar } from '../progressBar.js';
import { overviewAt } from './animals.js';
import { CAUTION, deskAt, print, volumeUl, type WhereFlags, whereAnimals } from './options.js';
import { type EntryFlags, whenAndNote } from './weigh.js';
import { dueWords, eveningWords, millilitres, overviewWords } from './words.js';

/** `lapwing water`: the water book. */
export function waterCommand(): Command {
  const command = whereAnimals(new Command('water'))
    .description('the water book: what each animal has had today and is still due')
    .option('--tonight', 'only who is still due water, for the evening round')
    .enablePositionalOptions()
    .action(async (flags: WhereFlags & { readonly tonight?: boolean }) => {
      const overview = await overviewAt(flags);
      if (!flags.tonight) {
        print(flags, overview, overviewWords(overview));
        return;
      }
      const due = eveningList(overview);
      const { day, zone, troubles } = overview;
      print(flags, { day, zone, due, troubles }, eveningWords(due, overview));
    });
  command.addCommand(
    whenAndNote(new Command('give'))
      .description('write down water that was given by hand')
      .argument('<animal>')
      .argument('<volume>', 'such as 400uL or 0.4mL', volumeUl)
      .action(async (animal: string, ul: number, flags: EntryFlags) => {
        const desk = deskAt(flags);
        const entry = await desk.give(animal, ul, flags);
        const { history, today } = await desk.history(animal);
        const water = waterOn(history, today);
        const words = `${animal}: ${millilitres(ul)} by hand; due today: ${dueWords(water)}. ${CAUTION}`;
        print(flags, { entry, water }, words);
      }),
  );
  command.addCommand(
    whereAnimals(new Command('file'))
      .description("put a session's water into the book, where that was not done at its end")
      .argument('<session>', 'the session folder')
      .action(async (session: string, flags: WhereFlags) => {
        const sessionFolder = resolve(session);
        const said = flags.animals !== undefined || flags.rig !== undefined;
        const folder = said ? { folder: deskAt(flags).folder.folder } : {};
        const bar = progressBar('reading the record');
        const share = (done: number) => bar.show(done);
        const water = await ended({ ask: 'ended', sessionFolder, ...folder }, share);
        bar.clear();
        if (water === undefined) {
          const what = `${session} names no animals folder that keeps its animal.`;
          throw new LapwingError('animalsNoFolder', what);
        }
        const sure = `${millilitres(water.givenUl)} in ${water.drops} drops`;
        print(flags, water, `In the book: ${sure}, ${water.notLickedDrops} perhaps not drunk.`);
      }),
  );
  return command;
}
