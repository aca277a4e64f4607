import type { RulesFile, Source } from './ast.js';
import { checkRules } from './checks/checkRules.js';
import type { RigFacts } from './facts.js';
import { inOrder, type Problem } from './problems.js';
import { parseRules, type ReadFile } from './text/parseRules.js';

export interface Checked {
  /** The rules; absent when there is an error. */
  readonly file?: RulesFile;
  /** What could be read, mistakes and all: to show an outline while someone types, never to run. */
  readonly draft?: RulesFile;
  /** Names that are declared, though their phrase could not be read. */
  readonly broken: ReadonlySet<string>;
  readonly problems: readonly Problem[];
  readonly sources: readonly Source[];
}

/**
 * Parses and checks in one step, so that mistakes of form and of meaning come at once. Never throws.
 * @param content the file's text, or how files are read
 */
export function checkText(path: string, content: string | ReadFile, rig?: RigFacts): Checked {
  const parsed = parseRules(path, content);
  const { draft, broken, sources } = parsed;
  const failed = parsed.file === undefined;
  const checked = draft ? checkRules(draft, rig, broken) : [];
  // Of a file that is only half read, what looks suspicious may be what is missing.
  const meant = failed ? checked.filter(({ severity }) => severity === 'error') : checked;
  const problems = inOrder([...parsed.problems, ...meant]);
  const right = parsed.file && !problems.some(({ severity }) => severity === 'error');
  return {
    ...(right ? { file: parsed.file } : {}),
    ...(draft ? { draft } : {}),
    ...{ broken, problems, sources },
  };
}
