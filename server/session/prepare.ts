import { randomBytes } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { LapwingError } from '../errors/codes.js';
import type { RulesFile } from '../rules/ast.js';
import { checkRules } from '../rules/checks/checkRules.js';
import { compile, type Program } from '../rules/engine/program.js';
import { formatProblems, type Problem } from '../rules/problems.js';
import { parseRules } from '../rules/text/parseRules.js';
import { factsOf, type Rig } from './rig/rig.js';

/** A rules file that may run on a rig. */
export interface PreparedRules {
  readonly path: string;
  readonly file: RulesFile;
  readonly program: Program;
  /** What is legal and suspicious. */
  readonly warnings: readonly Problem[];
}

/** Reads a rules file and everything that it brings in; every problem at once, with its place. */
export function readRules(
  path: string,
  rig: Rig | undefined,
): { readonly file?: RulesFile; readonly problems: readonly Problem[] } {
  const read = parseRules(path, (name) => readFileSync(name));
  if (read.file === undefined) return read;
  const checked = checkRules(read.file, rig && factsOf(rig));
  return { file: read.file, problems: [...read.problems, ...checked] };
}

/**
 * Makes a rules file ready to run on a rig.
 * @throws LapwingError RULES_INVALID with every error, formatted for people
 */
export function prepareRules(path: string, rig: Rig): PreparedRules {
  const { file, problems } = readRules(path, rig);
  const errors = problems.filter((problem) => problem.severity === 'error');
  if (file === undefined || errors.length > 0) {
    throw new LapwingError('rulesInvalid', formatProblems(errors, file?.sources ?? [], {}));
  }
  return { path, file, program: compile(file, factsOf(rig)), warnings: problems };
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
