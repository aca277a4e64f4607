import { LapwingError } from '../errors/codes.js';
import { MOST_PUT_OFF_LAPS, MOST_PUT_OFF_MIN } from '../rules/engine/ending.js';
import type { Program } from '../rules/engine/program.js';
import { isOnStep } from '../rules/steps.js';
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
  if (act?.act === 'acknowledge') {
    text('alarm', act.alarm);
    return;
  }
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
      for (const [key, value] of Object.entries(act.fields ?? {})) {
        oneOf('field', key, core.rig.cellFields);
        text(key, value);
      }
      return;
    case 'exclude lap':
      if (!Number.isInteger(act.lap) || act.lap < 0 || act.lap > core.instant.lap) {
        throw bad(`lap ${act.lap} is not one of this session's 0 to ${core.instant.lap}`);
      }
      return;
    case 'note':
      text('note', act.text);
      if (act.mark !== undefined) {
        const open = core.marks.open.map(({ mark }) => mark);
        oneOf('mark', act.mark, open);
      }
      return;
    case 'mark':
      return;
    case 'ask':
      checkAsk(act.rule, act.laps, core, program);
      return;
    case 'withdraw':
      oneOf('rule', act.rule, askable(program));
      return;
    case 'put off':
      checkPutOff(act.laps, act.minutes, core);
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

function askable({ rules }: Program): string[] {
  return rules.filter(({ asked }) => asked !== undefined).map(({ name }) => name);
}

function checkAsk(rule: string, laps: number, core: SessionCore, program: Program): void {
  oneOf('rule to ask for', rule, askable(program));
  const { asked, mostAsked } = program.rules.find(({ name }) => name === rule)!;
  if (laps === 0) {
    if (core.handOnBelt) throw bad('a hand is on the belt: take it off first');
    if (!asked!.now) throw bad(`${rule} may not be asked for at once, says the rules file`);
    return;
  }
  if (Number.isInteger(laps) && laps > 0 && laps <= mostAsked) return;
  throw bad(`${rule} may be asked for in the next ${mostAsked} laps at most; ${laps} were asked`);
}

function checkPutOff(laps: number, minutes: number, core: SessionCore): void {
  const { putOff } = core.engine.view();
  const whole = Number.isInteger(laps) && Number.isInteger(minutes) && laps >= 0 && minutes >= 0;
  if (!whole || laps + minutes === 0) throw bad('the end is put off by whole laps or minutes');
  const left = MOST_PUT_OFF_LAPS - putOff.laps;
  const leftMin = MOST_PUT_OFF_MIN - putOff.minutes;
  if (laps <= left && minutes <= leftMin) return;
  throw bad(`the end may be put off by ${left} laps and ${leftMin} min more in this session`);
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
  const { least, most, unit, step } = choice;
  if (typeof value !== 'number' || !(value >= least! && value <= most!)) {
    throw bad(`${choice.name} ${String(value)} is not within ${least} to ${most} ${unit}`);
  }
  if (step !== undefined && !isOnStep(value, least!, step)) {
    throw bad(`${choice.name} ${value} is not a step of ${step} ${unit} from ${least}`);
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
