import type { Source, SourceSpan } from '../../rules/ast.js';
import { resolve } from '../../rules/checks/symbols.js';
import { explain } from '../../rules/explain.js';
import type { RigFacts } from '../../rules/facts.js';
import { lineColumn } from '../../rules/formatProblems.js';
import type { Problem } from '../../rules/problems.js';
import { type Checked, checkText } from '../../rules/readRules.js';
import { outlineOf } from './outline.js';
import type { RulesFolder } from './rulesFolder.js';
import type { CheckAnswer, RulesProblem, TextPlace } from './rulesMessages.js';

/** The name of a text that was never saved. */
export const UNSAVED = 'unsaved.yaml';

/** Checks a text as if it stood in the rules folder under this name. */
export function checkRulesText(
  folder: RulesFolder,
  path: string,
  text: string,
  rig: RigFacts,
): Checked {
  return checkText(path, (name) => (name === path ? text : folder.readIncluded(name)), rig);
}

/** Everything that the editor shows of a text. Never throws, whatever the text. */
export function checkAnswer(checked: Checked, rig: RigFacts): CheckAnswer {
  const { file, draft, broken, problems, sources } = checked;
  // A file whose names go in circles, or name each other too many times over, is not reckoned with.
  const placed = !problems.some(({ code }) => code === 'circle' || code === 'tooLarge');
  const outline = draft ? outlineOf(draft, resolve(draft, rig, broken), placed) : null;
  return {
    right: file !== undefined,
    problems: problems.map((problem) => told(problem, sources)),
    outline,
    explain: file ? explain(file, rig) : '',
  };
}

function told(problem: Problem, sources: readonly Source[]): RulesProblem {
  const { severity, code, message, expected, nearest, at, also = [] } = problem;
  return {
    severity,
    code,
    message,
    ...(expected === undefined ? {} : { expected }),
    ...(nearest === undefined ? {} : { nearest }),
    ...placeOf(at, sources),
    also: also.map((one) => ({ ...placeOf(one.at, sources), note: one.note })),
  };
}

function placeOf(at: SourceSpan, sources: readonly Source[]): TextPlace {
  const { path, text } = sources[at.file] ?? { path: '', text: '' };
  const here = at.file === 0;
  return { path, here, ...lineColumn(text, at.start), from: at.start, to: at.end };
}
