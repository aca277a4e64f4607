import type { Live } from './live.js';

/** A board that runs sends something every 5 ms; states come every 50: this is well past both. */
export const STALE_MS = 900;

/** The page's own timer runs every 200 ms: more than this between two looks is the page's fault. */
const HELD_UP_MS = 500;
const GRACE_MS = 300;
/** Beyond this age there is no grace: it may be the page's fault, and what it shows is old. */
const GRACE_AGE_MS = 3000;

/**
 * Called at every look. When the page itself was held up, what waited for it in the meantime gets a
 * moment to come in before the board is said to stand still.
 */
export function noteAwake(live: Live, nowMs: number): void {
  if (nowMs - live.awakeMs > HELD_UP_MS) live.graceUntilMs = nowMs + GRACE_MS;
  live.awakeMs = nowMs;
}

export interface Freshness {
  readonly fresh: boolean;
  /** Since board time last moved, ms; NaN when it was never seen. */
  readonly ageMs: number;
  /** What is missing, in words; empty while fresh. */
  readonly why: string;
  readonly remedy: string;
}

const FRESH: Freshness = { fresh: true, ageMs: 0, why: '', remedy: '' };

/** Whether what the page shows is the rig as it is now; the nearest missing part is named. */
export function freshness(live: Live, nowMs: number): Freshness {
  const ageMs = nowMs - live.movedAtMs;
  const stale = (why: string, remedy: string): Freshness => ({ fresh: false, ageMs, why, remedy });
  if (live.stream !== 'open') {
    return live.stream === 'opening' && Number.isNaN(ageMs)
      ? stale('Connecting to the service', '')
      : stale(
          'No connection to the service',
          'It is tried again every second. Is Lapwing running?',
        );
  }
  if (live.loop?.state === 'away') return stale('The loop is away', live.loop.remedy);
  if (!live.state) return stale('No word from the loop yet', '');
  if (live.state.link.state !== 'up') {
    const what = live.state.link.state === 'down' ? 'The board is lost' : 'Connecting to the board';
    return stale(`${what}: ${live.state.link.reason}`, live.state.link.remedy);
  }
  if (ageMs > STALE_MS && !(nowMs < live.graceUntilMs && ageMs < GRACE_AGE_MS))
    return stale('Board time stands still', 'Look at the board and its cable.');
  return FRESH;
}

/** "0.9 s", "12 s", "3 min", "2 h". */
export function ageWords(ageMs: number): string {
  if (Number.isNaN(ageMs)) return 'never';
  const s = ageMs / 1000;
  if (s < 10) return `${s.toFixed(1)} s`;
  if (s < 120) return `${Math.floor(s)} s`;
  if (s < 7200) return `${Math.floor(s / 60)} min`;
  return `${Math.floor(s / 3600)} h`;
}
