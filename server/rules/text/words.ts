import { UNITS } from '../units.js';

/** The words of the grammar. A name may be none of these, nor a unit. */
const GRAMMAR_WORDS =
  'to but in or every lap laps phase cell session visit firing of weighted shuffled blocks at most ' +
  'a row least from the steps for until after reaches enters leaves begins fires rises falls lick ' +
  'licks this within operator presses give times hold go while up per apart and not still is ' +
  'multiple position speed time share mean given done firings since over predicted learned sealed';

export const RESERVED: ReadonlySet<string> = new Set([
  ...GRAMMAR_WORDS.split(' '),
  ...Object.keys(UNITS),
]);

/** Words of the grammar that may be names too. */
export const FREE_WORDS: readonly string[] = [
  'water',
  'now',
  'first',
  'last',
  'next',
  'real',
  'sham',
  'pulse',
  'note',
  'start',
  'end',
  'stop',
  'width',
  'centre',
  'shift',
  'asymmetry',
];

export const NAME_PATTERN = /^[A-Za-z][A-Za-z0-9_]*$/;

/** Ordinals that people spell; the language writes `3rd`. */
export const SPELLED_ORDINALS: ReadonlyMap<string, string> = new Map([
  ['first', '1st'],
  ['second', '2nd'],
  ['third', '3rd'],
  ['fourth', '4th'],
  ['fifth', '5th'],
  ['sixth', '6th'],
  ['seventh', '7th'],
  ['eighth', '8th'],
  ['ninth', '9th'],
  ['tenth', '10th'],
]);

/** `1st`, `2nd`, `3rd`, `4th`, ... `11th`, `12th`, `13th`. */
export function ordinal(n: number): string {
  const teens = n % 100 >= 11 && n % 100 <= 13;
  const suffix = teens ? 'th' : (['th', 'st', 'nd', 'rd'][n % 10] ?? 'th');
  return `${n}${suffix}`;
}
