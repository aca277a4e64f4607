import type { Trust } from '../rules/instant.js';
import type { TrackEvent } from './events.js';

/** Trust on a rig without a seam mark: that of the declared start, until the board restarts. */
export class DeclaredStart {
  trust: Trust = 'unknown';
  reason = 'waiting for the board';
  readonly #events: TrackEvent[];

  constructor(events: TrackEvent[]) {
    this.#events = events;
  }

  declared(): void {
    this.#trustNow('trusted', 'start declared; there is no seam mark to check it');
  }

  lost(reason: string): void {
    if (this.trust === 'unknown') return;
    this.#trustNow('unknown', reason);
  }

  #trustNow(trust: Trust, reason: string): void {
    this.trust = trust;
    this.reason = reason;
    this.#events.push({ kind: 'trust', trust, reason });
  }
}
