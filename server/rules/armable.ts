import type { Action, RuleDecl } from './ast.js';
import type { RigFacts } from './facts.js';

/**
 * May the board start this rule by itself, in the encoder's own interrupt? Yes when it waits for a
 * place or one edge of a span and has exactly one bounded `give` or `pulse`, now and without
 * `while`; pulses on lines that the rig calls marks do not count. A pure function of the syntax
 * tree: the engine and `explain` ask the same one.
 */
export function isArmable(rule: RuleDecl, rig?: Pick<RigFacts, 'outputs'>): boolean {
  return whyNotArmed(rule, rig) === undefined;
}

/** Why the host must start this rule; undefined when the board may. */
export function whyNotArmed(rule: RuleDecl, rig?: Pick<RigFacts, 'outputs'>): string | undefined {
  if (rule.when.kind === 'after') return 'it waits a time after its moment';
  if (!['reaches', 'enters', 'leaves'].includes(rule.when.kind)) return 'its moment is no place';
  const driving = rule.do.filter((action) => !isMark(action, rig));
  if (driving.length === 0) return 'it drives no output but marks';
  if (driving.length > 1) return 'it has more than one action besides marks';
  return whyNotBounded(driving[0]!);
}

function whyNotBounded({ delay, body }: Action): string | undefined {
  if (delay) return 'its action is delayed';
  if (body.kind !== 'give' && body.kind !== 'pulse') return `\`${body.kind}\` is done by the host`;
  if (body.kind === 'pulse' && body.train?.until?.while) return 'its `while` must be watched';
  return undefined;
}

/** A pulse on a mark line is done when it can be and holds nothing back. */
function isMark({ body }: Action, rig: Pick<RigFacts, 'outputs'> | undefined): boolean {
  if (body.kind !== 'pulse' && body.kind !== 'hold') return false;
  const name = body.output.name;
  return rig?.outputs.find((output) => output.name === name)?.kind === 'mark';
}
