/** What the form that begins a session makes of the pre-flight. Nothing here touches the screen. */
import type { Preflight } from '../../server/session/preflight.js';
import type { Level } from './health.js';

export interface PreflightStanding {
  readonly level: Level;
  readonly words: string;
  /** It will want a reason; the loop decides, this only says it beforehand. */
  readonly against: boolean;
}

/**
 * @param preflight the newest of the last hours; null where there is none, undefined until it is known
 * @param simulated no animal hangs on a simulated board, which needs none
 */
export function preflightStanding(
  preflight: Preflight | null | undefined,
  simulated: boolean,
): PreflightStanding {
  if (preflight === undefined) return { level: 'off', words: '', against: false };
  if (preflight === null) {
    const words = 'No pre-flight in the last 12 hours.';
    return { level: simulated ? 'off' : 'warn', words, against: !simulated };
  }
  const at = `Pre-flight of ${preflight.madeAt.slice(11, 16)}`;
  const named = (result: string) =>
    preflight.checks.filter((check) => check.result === result).map(({ title }) => title);
  if (!preflight.passed) {
    return { level: 'bad', words: `${at} failed: ${named('failed').join(', ')}.`, against: true };
  }
  const overridden = named('overridden');
  if (overridden.length === 0) return { level: 'good', words: `${at} passed.`, against: false };
  const words = `${at} passed, overridden: ${overridden.join(', ')}.`;
  return { level: 'warn', words, against: false };
}
