/** What the big figures say of the phase, and of what comes next. */
import type { Setup, Snapshot } from '../../server/loop/protocol.js';
import { clock, fixed } from './format.js';
import { shown, shownUnit } from './units.js';

/** `3 of 10`, `2:05 of 15:00`, `120 of 400 µL`; undefined where it cannot be told. */
export function progressWords(state: Snapshot | undefined): string | undefined {
  const progress = state?.progress;
  if (!progress) return undefined;
  const { done, of, unit } = progress;
  // JSON has no NaN: what is not known is null.
  if ((done as number | null) === null || (of as number | null) === null) return undefined;
  if (unit === 'us') return `${clock(done / 1e6)} of ${clock(of / 1e6)}`;
  const { word } = shownUnit(unit);
  const number = (value: number) => {
    const seen = shown(value, unit) as number;
    return Number.isInteger(seen) ? String(seen) : fixed(seen, 1);
  };
  return `${number(done)} of ${number(of)}${word === '' ? '' : ` ${word}`}`;
}

/** What the next stimulus waits for: `armed`, `asked for, lap 31`, `held`. */
export function nextWords(
  state: Snapshot | undefined,
  setup: Setup | undefined,
): string | undefined {
  const names = setup?.session?.stimuli ?? [];
  if (state?.session !== 'running' || names.length === 0) return undefined;
  if (state.held.stimulus !== null) return 'held';
  const rules = state.rules.filter(({ name }) => names.includes(name));
  if (rules.some(({ armed }) => armed)) return 'armed';
  const asked = rules.find((rule) => rule.asked !== null)?.asked;
  if (asked) return askedWords(asked, state.lap);
  return 'not armed';
}

/** `asked for now`, `asked for lap 31`, `asked for laps 31 to 33`, `asked for, until lap 33`. */
export function askedWords(asked: { fromLap: number; toLap: number }, lap: number): string {
  const { fromLap, toLap } = asked;
  if (fromLap === 0) return 'asked for now';
  if (fromLap === toLap) return `asked for lap ${toLap}`;
  return fromLap > lap ? `asked for laps ${fromLap} to ${toLap}` : `asked for until lap ${toLap}`;
}

/** When the session ends by itself: `in 12 laps`, `in about 12 laps, 3 min`. */
export function endWords(
  end: Pick<NonNullable<Snapshot['end']>, 'laps' | 's' | 'exact'> | null,
): string | undefined {
  if (!end) return undefined;
  const { laps, s, exact } = end;
  const time =
    s === null ? '' : s < 90 ? `${Math.max(0, Math.round(s))} s` : `${Math.round(s / 60)} min`;
  const inLaps =
    laps === null ? '' : laps <= 1 ? 'with this lap' : `in ${exact ? '' : 'about '}${laps} laps`;
  return [inLaps, laps === null ? `in ${time}` : time]
    .filter((word) => word !== '' && word !== 'in ')
    .join(', ');
}
