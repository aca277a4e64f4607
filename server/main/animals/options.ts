import { resolve } from 'node:path';
import { type Command, InvalidArgumentError, Option } from 'commander';
import { AnimalsDesk } from '../../animals/animalsDesk.js';
import { AnimalsFolder } from '../../animals/animalsFolder.js';
import { LapwingError } from '../../errors/codes.js';
import { parseQuantity } from '../../rules/units.js';
import { readRig } from '../../session/rig/readRig.js';
import { loginName } from '../arguments.js';

/** The limits come from elsewhere; said wherever one is shown. */
export const CAUTION =
  'The approved protocol decides these limits, and the veterinarian when an animal is near one.';

/** Where the animals are kept, and who writes. */
export interface WhereFlags {
  readonly animals?: string;
  readonly rig?: string;
  readonly by?: string;
  readonly json?: boolean;
}

/** Adds the options that say where the animals are kept. */
export function whereAnimals(command: Command): Command {
  return command
    .addOption(new Option('--animals <folder>', 'the animals folder').env('LAPWING_ANIMALS'))
    .option('--rig <file>', 'or the rig file that names it')
    .option('--json', 'print JSON instead of words');
}

/** As `whereAnimals`, for what writes. */
export function whereAndWho(command: Command): Command {
  return whereAnimals(command).option('--by <name>', 'who writes it down', loginName());
}

/** @throws LapwingError ANIMALS_NO_FOLDER */
export function deskAt({ animals, rig }: WhereFlags): AnimalsDesk {
  const folder = animals ?? (rig === undefined ? undefined : readRig(rig).animalsFolder);
  if (folder === undefined) {
    const what =
      rig === undefined ? 'Neither --animals nor --rig was given.' : `${rig} names none.`;
    throw new LapwingError('animalsNoFolder', what);
  }
  return new AnimalsDesk(new AnimalsFolder(resolve(folder)));
}

/** `23.4`, `23.4 g` in grams. */
export function grams(text: string): number {
  const found = /^\s*(\d+(?:\.\d+)?)\s*g?\s*$/.exec(text);
  if (found === null) throw new InvalidArgumentError('expected grams, such as 23.4');
  return Number(found[1]);
}

/** `400 uL`, `0.4 mL` in microlitres. */
export function volumeUl(text: string): number {
  const nl = parseQuantity(text, 'volume');
  if (nl !== undefined && nl >= 0) return nl / 1_000;
  throw new InvalidArgumentError('expected a volume with its unit, such as 400uL or 0.4mL');
}

/** `80`, `80 %`. */
export function percent(text: string): number {
  const found = /^\s*(\d+(?:\.\d+)?)\s*%?\s*$/.exec(text);
  if (found === null) throw new InvalidArgumentError('expected percent, such as 80');
  return Number(found[1]);
}

export function print(flags: WhereFlags, value: unknown, words: string): void {
  process.stdout.write(`${flags.json ? JSON.stringify(value, undefined, 2) : words}\n`);
}
