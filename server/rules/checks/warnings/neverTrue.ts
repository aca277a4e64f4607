import type { Condition, RuleDecl, SourceSpan } from '../../ast.js';
import type { Check, CheckContext } from '../check.js';
import { contradictory, type Known, positionAt, termsOf } from '../contradiction.js';
import { mostInSession, phasesOf } from '../course.js';

/** Conditions that can never be true, alone or with the moment they belong to. */
export const neverTrue: Check = (context) => {
  const { file, symbols, problems } = context;
  const most = mostInSession(file, symbols);
  for (const rule of file.rules) checkRule(context, rule, most);
  if (file.end && contradictory([file.end], symbols)) {
    problems.report(
      'neverTrue',
      file.end.at,
      'this can never be true, so nothing ends the session',
    );
  }
};

function checkRule(context: CheckContext, rule: RuleDecl, most: ReadonlyMap<string, number>): void {
  const { file, symbols, problems } = context;
  const { when, if: asked, sham, chance } = rule;
  const known: Known = {
    most,
    ...(when.kind === 'reaches' ? positionAt(when.place, symbols) : {}),
  };
  const moment = when.kind === 'becomes' ? [when.condition] : [];
  const all = [...moment, ...(asked ? [asked] : [])];
  const report = (at: SourceSpan, message: string): void => {
    problems.report('neverTrue', at, message, {
      expected: 'something that can come true',
      also: [{ at: rule.name.at, note: `the rule \`${rule.name.name}\` can never fire` }],
    });
  };
  if (all.length > 0 && contradictory(all, symbols, known)) {
    report(culprit(all, context, known), 'this can never be true');
    return;
  }
  if (chance?.value === 0) report(chance.at, 'a chance of nothing');
  if (file.phases.length > 0 && phasesOf(rule, file).length === 0) {
    report((asked ?? when).at, 'no phase is left in which this could be true');
  }
  if (sham && contradictory([...all, sham], symbols, known)) {
    problems.report(
      'neverTrue',
      sham.at,
      'this can never be true when the rule fires: it is no sham',
      {},
    );
  }
  for (const { body } of rule.do) {
    const until =
      body.kind === 'hold' ? body.until : body.kind === 'pulse' ? body.train?.until : undefined;
    if (until?.while && contradictory([until.while], symbols, { most })) {
      problems.report('neverTrue', until.while.at, 'this can never be true: it stops at once');
    }
  }
}

/** The one term that is impossible by itself, or all of them. */
function culprit(all: readonly Condition[], { symbols }: CheckContext, known: Known): SourceSpan {
  const alone = all.flatMap(termsOf).find((term) => contradictory([term], symbols, known));
  return (alone ?? all.at(-1)!).at;
}
