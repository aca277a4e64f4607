import { randomBytes } from 'node:crypto';
import { readFileSync, writeFileSync } from 'node:fs';
import { Command } from 'commander';
import { LapwingError } from '../../errors/codes.js';
import { inBlocks, newKey, type Slot, sealAllocation } from '../../session/blinding/allocation.js';
import { rfc3339 } from '../../session/description.js';
import { loginName, wholeNumber } from '../arguments.js';

interface SealFlags {
  readonly key: string;
  readonly list?: string;
  readonly animals?: string;
  readonly arms?: string;
  readonly sessions?: number;
  readonly blocks?: number;
  readonly seed?: string;
  readonly by: string;
  readonly json?: boolean;
}

/** `lapwing seal ALLOCATION --key KEY`: by whoever will not be at the rig. */
export function sealCommand(): Command {
  return new Command('seal')
    .description('seal which animal or session has which arm, for rules files with a sealed draw')
    .argument('<allocation>', 'the file to write; it may be shown to anybody')
    .requiredOption('--key <file>', 'the key to write; whoever has it can read every arm')
    .option(
      '--list <file>',
      'the arms as you decided them: lines of `animal,arm` or `animal,session,arm`',
    )
    .option('--animals <names>', 'or the animals, with commas, allotted by chance')
    .option('--arms <words>', 'the words of the rules file, with commas: stim,sham')
    .option(
      '--sessions <n>',
      'an arm for each of so many sessions; else one an animal',
      wholeNumber(1, 1000),
    )
    .option('--blocks <n>', 'balance the arms within blocks of so many', wholeNumber(2, 1000))
    .option('--seed <text>', 'of the allotment; whoever knows it knows the arms')
    .option('--by <name>', 'who seals it', loginName())
    .option('--json', 'print JSON instead of words')
    .action((file: string, flags: SealFlags) => {
      const { slots, how } = flags.list === undefined ? byChance(flags) : byList(flags.list);
      const key = newKey();
      const about = { madeAt: rfc3339(new Date()), by: flags.by, how };
      const allocation = sealAllocation(slots, key, about);
      writeNew(flags.key, `${key}\n`, 0o600);
      writeNew(file, `${JSON.stringify(allocation, undefined, 2)}\n`, 0o644);
      const { id, commitment } = allocation;
      const words = [
        `${slots.length} arms are sealed in ${file}, ${how}.`,
        `commitment ${commitment}`,
        'Write the commitment into the study plan: it shows later that nothing was changed.',
        `${flags.key} opens every arm: it stays with somebody who is not at the rig, but for the copy`,
        'that the rig reads, which the experimenter has no reason to look at. Lost, it cannot be made again.',
      ];
      const told = { allocation: file, key: flags.key, id, commitment, slots: slots.length, how };
      process.stdout.write(`${flags.json ? JSON.stringify(told) : words.join('\n')}\n`);
    });
}

function byChance({ animals, arms, sessions, blocks, seed }: SealFlags) {
  if (animals === undefined || arms === undefined) {
    throw bad('expected --list, or --animals with --arms');
  }
  const words = split(arms);
  const size = blocks ?? 2 * words.length;
  const own = seed ?? randomBytes(16).toString('hex');
  const slots = inBlocks(split(animals), sessions ?? null, words, size, own);
  return { slots, how: `by chance in permuted blocks of ${size}` };
}

function byList(file: string): { slots: Slot[]; how: string } {
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (error) {
    throw bad(`${file}: ${(error as Error).message}`);
  }
  const slots = text.split(/\r?\n/).flatMap((line, n): Slot[] => {
    if (line.trim() === '') return [];
    const cells = line.split(',').map((cell) => cell.trim());
    const [subject = '', second = '', third] = cells;
    const session = third === undefined ? null : Number(second);
    const arm = third ?? second;
    const whole = session === null || (Number.isInteger(session) && session > 0);
    if (cells.length > 3 || subject === '' || arm === '' || !whole) {
      throw bad(`${file}, line ${n + 1}: expected \`animal,arm\` or \`animal,session,arm\``);
    }
    return [{ subject, session, arm }];
  });
  return { slots, how: 'by a list' };
}

function split(text: string): string[] {
  return text.split(',').flatMap((part) => (part.trim() === '' ? [] : [part.trim()]));
}

/** An allocation, and above all a key, is never written over. */
function writeNew(file: string, text: string, mode: number): void {
  try {
    writeFileSync(file, text, { flag: 'wx', mode });
  } catch (error) {
    throw bad(`${file}: ${(error as Error).message}`);
  }
}

function bad(what: string): LapwingError {
  return new LapwingError('blindingBad', `${what}.`);
}
