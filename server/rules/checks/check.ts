import type { RulesFile } from '../ast.js';
import type { RigFacts } from '../facts.js';
import type { ProblemList } from '../problems.js';
import type { Symbols } from './symbols.js';

/** What every check works on. */
export interface CheckContext {
  readonly file: RulesFile;
  readonly rig: RigFacts | undefined;
  readonly symbols: Symbols;
  readonly problems: ProblemList;
}

/** One check: reports everything of its kind, and nothing else. */
export type Check = (context: CheckContext) => void;
