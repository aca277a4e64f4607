import { randomBytes } from 'node:crypto';
import { readFileSync, realpathSync, statSync } from 'node:fs';
import { dirname, sep } from 'node:path';
import { LapwingError } from '../errors/codes.js';
import type { RulesFile } from '../rules/ast.js';
import { compile } from '../rules/engine/compile.js';
import type { Program } from '../rules/engine/program.js';
import { formatProblems, type Problem } from '../rules/problems.js';
import { type Checked, checkText } from '../rules/readRules.js';
import { parseRules } from '../rules/text/parseRules.js';
import { type ChoiceView, choicesOf } from './choices.js';
import { factsOf, type Rig } from './rig/rig.js';

/** A rules file that may run on a rig. */
export interface PreparedRules {
  readonly path: string;
  readonly file: RulesFile;
  readonly program: Program;
  /** What the operator may choose. */
  readonly choices: readonly ChoiceView[];
  /** What is legal and suspicious. */
  readonly warnings: readonly Problem[];
}

/** Reads a rules file and everything that it brings in; every problem at once, with its place. */
export function readRules(path: string, rig: Rig | undefined): Checked {
  return checkText(path, (name) => readInside(path, name), rig && factsOf(rig));
}

/** Larger than any file that the reader accepts; what it refuses for its size need not be read. */
const MOST_BYTES = 4 << 20;

/** Reads the rules file or what it brings in; a link that leads out of its folder is refused. */
function readInside(rulesPath: string, name: string): Buffer {
  const folder = dirname(realpathSync(rulesPath));
  const real = realpathSync(name);
  if (!real.startsWith(folder + sep)) throw new Error('it is a link that leads out of the folder');
  if (statSync(real).size > MOST_BYTES) throw new Error('it is larger than 4 MiB');
  return readFileSync(real);
}

/**
 * Makes a rules file ready to run on a rig.
 * @throws LapwingError RULES_INVALID with every error, formatted for people
 */
export function prepareRules(path: string, rig: Rig): PreparedRules {
  const { file, problems, sources } = readRules(path, rig);
  if (file === undefined) {
    const errors = problems.filter(({ severity }) => severity === 'error');
    throw new LapwingError('rulesInvalid', formatProblems(errors, sources, {}));
  }
  const program = compile(file, factsOf(rig));
  return { path, file, program, choices: choicesOf(file, program), warnings: problems };
}

/** A seed for a session that was given none: short enough to be read aloud and typed again. */
export function newSeed(): string {
  return randomBytes(5).toString('hex');
}

/** Rules that do nothing: what runs between sessions. */
export function idleRules(rig: Rig): Program {
  const { file } = parseRules(
    'idle',
    `title: none\nbelt: ${rig.belt.lengthCm} cm\nrules:\n  none:\n    when: session begins\n    do: note\n`,
  );
  return compile(file!, factsOf(rig));
}
