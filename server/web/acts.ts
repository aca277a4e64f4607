import { LapwingError } from '../errors/codes.js';
import type { Setup } from '../loop/protocol.js';
import type { OperatorAct } from '../session/inputs.js';

const PHASE_WORDS = new Set(['next', 'previous', 'repeat']);

/**
 * Refuses an act that the running session does not offer, before it goes near the loop (which checks
 * again). Throws WEB_ACT_UNKNOWN with what was expected.
 */
export function checkAct(act: OperatorAct, setup: Setup | undefined): void {
  const session = setup?.session;
  // An alarm can be there without a session.
  if (act.act === 'acknowledge') return;
  if (!session) throw new LapwingError('webActUnknown', 'No session is running.');
  if (act.act === 'press' && !session.buttons.includes(act.button)) {
    throw unknown('button', act.button, session.buttons);
  }
  if (act.act === 'phase' && !PHASE_WORDS.has(act.to) && !session.phases.includes(act.to)) {
    throw unknown('phase', act.to, session.phases);
  }
  if (act.act === 'choose') checkChoice(act.name, act.value, session);
}

function checkChoice(
  name: string,
  value: number | string,
  session: NonNullable<Setup['session']>,
): void {
  const choice = session.choices.find((one) => one.name === name);
  if (!choice) {
    const names = session.choices.map((one) => one.name);
    throw unknown('choice', name, names);
  }
  if (choice.options) {
    if (!choice.options.includes(value)) throw unknown(`value of ${name}`, value, choice.options);
    return;
  }
  const least = choice.least ?? Number.NEGATIVE_INFINITY;
  const most = choice.most ?? Number.POSITIVE_INFINITY;
  if (typeof value !== 'number' || !(value >= least && value <= most)) {
    throw new LapwingError(
      'webActUnknown',
      `${name} must be from ${least} to ${most} ${choice.unit}; ${value} was asked for.`,
    );
  }
}

function unknown(what: string, found: unknown, known: readonly unknown[]): LapwingError {
  const expected = known.length === 0 ? 'none' : known.join(', ');
  return new LapwingError(
    'webActUnknown',
    `No ${what} is ${String(found)}; there is: ${expected}.`,
  );
}
