import { Command, Option } from 'commander';
import { checkDay } from '../../animals/days.js';
import type { AnimalCard } from '../../animals/entry.js';
import { historiesOf, overviewOf, pageOf } from '../../animals/overview.js';
import { LapwingError } from '../../errors/codes.js';
import {
  CAUTION,
  deskAt,
  grams,
  percent,
  print,
  volumeUl,
  type WhereFlags,
  whereAndWho,
  whereAnimals,
} from './options.js';
import {
  dueWords,
  entryWords,
  hadWords,
  overviewWords,
  troubleWords,
  weightWords,
} from './words.js';

const DAYS_SHOWN = 14;

interface CardFlags extends WhereFlags {
  readonly by: string;
  readonly sex?: AnimalCard['sex'];
  readonly born?: string;
  readonly strain?: string;
  readonly baseline?: number;
  readonly baselineOn?: string;
  readonly implant?: number;
  readonly implantInBaseline?: boolean;
  readonly protocol?: string;
  readonly target?: number;
  readonly least?: number;
  readonly state?: AnimalCard['state'];
  readonly note?: string;
  readonly from?: string;
  readonly reason?: string;
}

/** `lapwing animals`: who is kept, their weight and water today; and how they are entered. */
export function animalsCommand(): Command {
  const command = whereAnimals(new Command('animals'))
    .description('the animals: weight and water today; add, change and show one')
    .enablePositionalOptions()
    .action(async (flags: WhereFlags) => {
      const overview = await overviewAt(flags);
      print(flags, overview, overviewWords(overview));
    });
  command.addCommand(
    cardOptions(new Command('add'))
      .description('begin to keep an animal')
      .argument('<name>', 'letters, digits, "-", "_" and "."')
      .action(async (name: string, flags: CardFlags) => {
        const set = { state: 'restricted' as const, ...cardOf(flags) };
        const { folder } = deskAt(flags);
        const entry = await folder.addAnimal(name, { kind: 'card', set }, flags.by);
        const least = set.leastPercent === undefined;
        const assumed = least ? ' Alarm level 80 % (common practice) until --least is said.' : '';
        print(flags, entry, `${name} is kept in ${folder.folder}.${assumed} ${CAUTION}`);
      }),
  );
  command.addCommand(
    cardOptions(new Command('change'))
      .description('change what is known of an animal; what was known before is kept')
      .argument('<name>', 'the animal')
      .option('--from <day>', 'the first day on which it holds; today where nothing is said')
      .option('--reason <text>', 'why')
      .action(async (name: string, flags: CardFlags) => {
        const set = cardOf(flags);
        if (Object.keys(set).length === 0) {
          throw new LapwingError('animalsEntryBad', 'Nothing was said to change.');
        }
        const from = flags.from === undefined ? undefined : checkDay(flags.from, '--from');
        const since = { from, reason: flags.reason };
        const entry = await deskAt(flags).change(name, set, flags.by, since);
        print(flags, entry, entryWords(entry));
      }),
  );
  command.addCommand(
    whereAnimals(new Command('show'))
      .description('all that was kept of one animal')
      .argument('<name>', 'the animal')
      .action(async (name: string, flags: WhereFlags) => {
        const { history, reading } = await deskAt(flags).history(name);
        const page = pageOf(history, new Date(), reading.zone, DAYS_SHOWN);
        const { card, day, water } = page;
        const lines = [
          `${name}, ${card.state}, ${card.sex}${card.bornOn === null ? '' : `, born ${card.bornOn}`}${card.strain ? `, ${card.strain}` : ''}`,
          `protocol ${card.protocol || 'not said'}; target ${card.targetUl === null ? 'not said' : `${card.targetUl / 1_000} mL a day`}; alarm below ${card.leastPercent} % of ${card.baselineG === null ? 'a baseline not said' : `${card.baselineG} g`}; implant ${card.implantG} g`,
          `${day}: ${weightWords(page.today, card.leastPercent)}; water: ${hadWords(water)}; due ${dueWords(water)}`,
          '',
          ...page.entries.map(entryWords),
          ...troubleWords(page.troubles),
          CAUTION,
        ];
        print(flags, page, lines.join('\n'));
      }),
  );
  return command;
}

/** All animals as they are now. */
export async function overviewAt(flags: WhereFlags) {
  const { zone, entries, troubles } = await deskAt(flags).folder.read();
  return overviewOf(historiesOf(entries, zone), troubles, new Date(), zone);
}

function cardOptions(command: Command): Command {
  return whereAndWho(command)
    .addOption(new Option('--sex <sex>').choices(['female', 'male', 'unknown']))
    .option('--born <day>', 'day of birth')
    .option('--strain <name>')
    .option('--baseline <grams>', 'the weight from which the percent is taken', grams)
    .option('--baseline-on <day>', 'when that was weighed')
    .option('--implant <grams>', 'mass of head plate, cement and probe, taken off weights', grams)
    .option('--implant-in-baseline', 'the baseline was weighed with the implant on')
    .option('--no-implant-in-baseline', 'it was weighed before')
    .option('--protocol <name>', 'the approved protocol')
    .option('--target <volume>', 'water a day, from the protocol, such as 1mL', volumeUl)
    .option('--least <percent>', 'alarm level from the protocol; 80 is common practice', percent)
    .addOption(
      new Option('--state <state>', 'on a target, with free water, or kept here no longer').choices(
        ['restricted', 'free', 'left'],
      ),
    )
    .option('--note <text>');
}

function cardOf(flags: CardFlags): Partial<AnimalCard> {
  const said = {
    sex: flags.sex,
    bornOn: flags.born === undefined ? undefined : checkDay(flags.born, '--born'),
    strain: flags.strain,
    baselineG: flags.baseline,
    baselineOn:
      flags.baselineOn === undefined ? undefined : checkDay(flags.baselineOn, '--baseline-on'),
    implantG: flags.implant,
    implantInBaseline: flags.implantInBaseline,
    protocol: flags.protocol,
    targetUl: flags.target,
    leastPercent: flags.least,
    state: flags.state,
    note: flags.note,
  };
  return Object.fromEntries(Object.entries(said).filter(([, value]) => value !== undefined));
}
