import { LapwingError } from '../errors/codes.js';
import type { SessionCore } from '../session/core/sessionCore.js';
import type { OperatorAct } from '../session/inputs.js';
import type { PreparedRules } from '../session/prepare.js';

const LONGEST_TEXT = 2_000;

/**
 * Refuses an act that the session does not allow, before it becomes an input: what is recorded is
 * what was done.
 * @param rules undefined while no session runs: only stopping everything makes sense then
 * @throws LapwingError LOOP_BAD_ACT or LOOP_NO_SESSION
 */
export function checkAct(
  act: OperatorAct,
  core: SessionCore,
  rules: PreparedRules | undefined,
): void {
  const { act: name } = (act ?? {}) as { act?: unknown };
  if (name === 'stop everything') return;
  if (rules === undefined) throw new LapwingError('loopNoSession', 'There is nothing to act on.');
  const { program, choices } = rules;
  switch (act.act) {
    case 'press':
      if (core.handOnBelt) throw bad('a hand is on the belt: take it off first');
      oneOf('button', act.button, program.buttons);
      return;
    case 'choose':
      checkChoice(act.name, act.value, choices);
      return;
    case 'hold':
      oneOf('hold', act.what, ['stimulus', 'water']);
      if (typeof act.on !== 'boolean') throw bad('`on` must be true or false');
      return;
    case 'phase':
      oneOf('phase', act.to, ['next', 'previous', 'repeat', ...program.phases.map((p) => p.name)]);
      return;
    case 'new cell':
      for (const [key, value] of Object.entries(act.fields ?? {})) text(key, value);
      return;
    case 'exclude lap':
      if (!Number.isInteger(act.lap) || act.lap < 0 || act.lap > core.instant.lap) {
        throw bad(`lap ${act.lap} is not one of this session's 0 to ${core.instant.lap}`);
      }
      return;
    case 'note':
      text('note', act.text);
      return;
    case 'allow stimulation':
      return;
    case 'hand on belt':
      if (typeof act.on !== 'boolean') throw bad('`on` must be true or false');
      return;
    case 'controls':
      for (const name of [act.holder, act.before]) if (name !== null) text('name', name);
      return;
    case 'end':
      text('reason', act.reason);
      return;
    default:
      throw bad(`\`${String(name)}\` is no act`);
  }
}

function checkChoice(name: unknown, value: unknown, choices: PreparedRules['choices']): void {
  const choice = choices.find((one) => one.name === name);
  if (choice === undefined) {
    const names = choices.map((one) => one.name);
    oneOf('choice', name, names);
    return;
  }
  if (choice.options !== undefined) {
    oneOf(choice.name, value, choice.options);
    return;
  }
  const { least, most, unit } = choice;
  if (typeof value !== 'number' || !(value >= least! && value <= most!)) {
    throw bad(`${choice.name} ${String(value)} is not within ${least} to ${most} ${unit}`);
  }
}

function oneOf(what: string, value: unknown, allowed: readonly (string | number)[]): void {
  if (allowed.includes(value as string)) return;
  const known = allowed.length === 0 ? 'this session has none' : `expected ${allowed.join(', ')}`;
  throw bad(`${what} \`${String(value)}\`: ${known}`);
}

function text(what: string, value: unknown): void {
  if (typeof value !== 'string' || value.length > LONGEST_TEXT) {
    throw bad(`${what} must be text of at most ${LONGEST_TEXT} characters`);
  }
}

function bad(particulars: string): LapwingError {
  return new LapwingError('loopBadAct', particulars);
}
