/** The host's monotonic clock and its timers; tests inject virtual ones. */
export interface Timers {
  /** Monotonic, milliseconds. */
  now(): number;
  /** Calls once after `delayMs`. */
  set(delayMs: number, callback: () => void): Timer;
  clear(timer: Timer): void;
}
export type Timer = unknown;

export const hostTimers: Timers = {
  now: () => performance.now(),
  set: (delayMs, callback) => setTimeout(callback, delayMs),
  clear: (timer) => clearTimeout(timer as NodeJS.Timeout),
};
