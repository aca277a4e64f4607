/**
 * Stop-everything as the page sees it. Two paths carry it (HTTP, then the stream), and only the
 * loop's own word counts as confirmed: whatever else happens, the page says that it is not.
 */
export type Stop =
  | { readonly is: 'idle' }
  | {
      readonly is: 'asking';
      readonly sinceMs: number;
      readonly tries: number;
      readonly trouble: string;
    }
  | { readonly is: 'confirmed'; readonly at: string; readonly afterMs: number };

export const stopIdle: Stop = { is: 'idle' };

/** After this long without the loop's word, the page says loudly that nothing is confirmed. */
export const STOP_ALARM_MS = 700;
export const STOP_RETRY_MS = 1000;

export function stopAsked(stop: Stop, nowMs: number): Stop {
  if (stop.is === 'asking') return { ...stop, tries: stop.tries + 1 };
  return { is: 'asking', sinceMs: nowMs, tries: 1, trouble: '' };
}

export function stopConfirmed(stop: Stop, nowMs: number, wallClock: string): Stop {
  if (stop.is !== 'asking') return stop;
  return { is: 'confirmed', at: wallClock, afterMs: nowMs - stop.sinceMs };
}

export function stopFailed(stop: Stop, trouble: string): Stop {
  return stop.is === 'asking' ? { ...stop, trouble } : stop;
}

/** Whether the page must shout: something failed, or it has taken too long. */
export function stopAlarm(stop: Stop, nowMs: number): boolean {
  return stop.is === 'asking' && (stop.trouble !== '' || nowMs - stop.sinceMs > STOP_ALARM_MS);
}
