import { readFileSync } from 'node:fs';
import { isMap, isScalar, LineCounter, parseDocument } from 'yaml';
import {
  ANIMAL,
  type AnimalParameters,
  PARAMETERS,
  type Parameter,
} from '../../hardware-sim/animal/parameters.js';
import { LapwingError } from '../errors/codes.js';
import { nearestName } from '../rules/nearestName.js';

/** A simulated animal as a file describes it. */
export interface AnimalFile {
  /** What it is called, for whoever reads a report. */
  readonly name: string;
  readonly parameters: AnimalParameters;
}

/** What stands above the usual values, where they are printed. */
export const USUAL_HEAD: readonly string[] = [
  'The simulated animal of a rehearsal: `lapwing rehearse RULES --rig RIG --animal THIS`.',
  'Common practice, no source: no measurement. `lapwing animal fit RECORDS` makes one from sessions.',
];

type Key = keyof AnimalParameters;
const KEYS = new Map(Object.entries(PARAMETERS).map(([key, { name }]) => [name, key as Key]));
const LONGEST_BYTES = 64 * 1024;
const LONGEST_NAME = 100;

/** Pairs of which the first may not be more than the second. */
const ORDERED: readonly (readonly [Key, Key])[] = [
  ['slowestCruiseCmPerS', 'fastestCruiseCmPerS'],
  ['fastestCruiseCmPerS', 'burstCmPerS'],
  ['groomLeastMs', 'groomMostMs'],
  ['slowestLickHz', 'fastestLickHz'],
  ['shortestContactMs', 'longestContactMs'],
  ['trainedBoutsPerS', 'naiveBoutsPerS'],
  ['trainedMissChance', 'naiveMissChance'],
];

/**
 * Reads a file of animal parameters; what it leaves out is as usual.
 * @throws LapwingError REHEARSE_ANIMAL_BAD with every problem and its line
 */
export function readAnimal(path: string): AnimalFile {
  let text: string;
  try {
    text = readFileSync(path, 'utf8');
  } catch (error) {
    throw new LapwingError('rehearseAnimalBad', `${path}: ${(error as Error).message}.`);
  }
  const { animal, problems } = parseAnimal(text);
  if (animal !== undefined) return animal;
  throw new LapwingError(
    'rehearseAnimalBad',
    problems.map(({ line, message }) => `${path}:${line}: ${message}`).join('\n'),
  );
}

interface AnimalProblem {
  readonly line: number;
  readonly message: string;
}

/** Every problem at once. */
export function parseAnimal(text: string): {
  readonly animal?: AnimalFile;
  readonly problems: readonly AnimalProblem[];
} {
  if (text.length > LONGEST_BYTES)
    return { problems: [{ line: 1, message: 'longer than 64 KiB' }] };
  const lines = new LineCounter();
  const document = parseDocument(text, { schema: 'failsafe', lineCounter: lines });
  const problems: AnimalProblem[] = [];
  const report = (offset: number, message: string) =>
    problems.push({ line: lines.linePos(offset).line, message });
  for (const error of document.errors) report(error.pos[0], error.message.split('\n')[0]!);
  const { contents } = document;
  if (problems.length === 0 && !isMap(contents)) {
    report(0, 'expected lines such as `bout: 9 s`');
  }
  if (problems.length > 0 || !isMap(contents)) return { problems };
  let name = 'unnamed';
  const parameters: Record<Key, number> = { ...ANIMAL };
  const offsets = new Map<Key, number>();
  for (const { key, value } of contents.items) {
    const offset = (isScalar(key) ? key.range?.[0] : undefined) ?? 0;
    const word = isScalar(key) ? String(key.value) : '';
    const given = isScalar(value) ? String(value.value) : undefined;
    if (word === 'animal') {
      if (given !== undefined && given.length <= LONGEST_NAME) name = given;
      else report(offset, `expected a name of at most ${LONGEST_NAME} letters`);
      continue;
    }
    const known = KEYS.get(word);
    if (known === undefined) {
      const nearest = nearestName(word, ['animal', ...KEYS.keys()]);
      report(offset, `unknown line \`${word}\`${nearest ? `: nearest is \`${nearest}\`` : ''}`);
      continue;
    }
    offsets.set(known, offset);
    const read = amountOf(PARAMETERS[known], given);
    if (typeof read === 'number') parameters[known] = read;
    else report(offset, read);
  }
  for (const [less, more] of ORDERED) {
    if (parameters[less] <= parameters[more]) continue;
    const offset = offsets.get(less) ?? offsets.get(more) ?? 0;
    report(offset, `${PARAMETERS[less].name} is more than ${PARAMETERS[more].name}`);
  }
  return problems.length > 0 ? { problems } : { animal: { name, parameters }, problems };
}

/** The number in the parameter's unit (a share for `%`), or what is wrong with it. */
function amountOf(
  { name, unit, least, most }: Parameter,
  text: string | undefined,
): number | string {
  const size = unit === '%' ? 100 : 1;
  const expected = `expected ${name} from ${round(least * size)} to ${round(most * size)} ${unit}`;
  const found = /^(\d+(?:\.\d+)?) ?(.*)$/.exec(text ?? '');
  if (found === null || found[2] !== unit) return `found \`${text ?? 'lines'}\`: ${expected}`;
  const value = Number(found[1]) / size;
  return value >= least && value <= most ? value : `found \`${text}\`: ${expected}`;
}

/** The file's text, each line with what it means. @param head comment lines, without `#` */
export function animalText({ name, parameters }: AnimalFile, head: readonly string[] = []): string {
  const lines = Object.entries(PARAMETERS).map(([key, parameter]) => {
    const amount = amountText(parameter, parameters[key as Key]);
    return `${parameter.name}: ${amount} # ${parameter.meaning}\n`;
  });
  const comments = head.map((line) => `# ${line}\n`).join('');
  const plain = /^\w(?:[\w .,()-]*[\w.)])?$/.test(name);
  return `${comments}animal: ${plain ? name : JSON.stringify(name)}\n${lines.join('')}`;
}

/** A parameter's value as it stands in a file, four significant digits. */
export function amountText({ unit }: Parameter, value: number): string {
  return `${round(unit === '%' ? value * 100 : value)} ${unit}`;
}

function round(value: number): number {
  return Number(value.toPrecision(4));
}

/** The JSON Schema of such a file, made from the table of parameters. */
export function animalSchema(): object {
  const properties = Object.values<Parameter>(PARAMETERS).map((parameter) => [
    parameter.name,
    {
      type: 'string',
      pattern: `^\\d+(\\.\\d+)? ?${parameter.unit}$`,
      description: `${parameter.meaning}; ${amountText(parameter, parameter.least)} to ${amountText(parameter, parameter.most)}, ${amountText(parameter, parameter.value)} where nothing is said`,
    },
  ]);
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    $id: 'lapwing:animal',
    title: 'Lapwing animal file',
    description: 'How the simulated animal of a rehearsal behaves. Amounts are text with a unit.',
    type: 'object',
    additionalProperties: false,
    properties: {
      animal: { type: 'string', maxLength: LONGEST_NAME, description: 'what it is called' },
      ...Object.fromEntries(properties),
    },
  };
}
