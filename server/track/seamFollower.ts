import type { Trust } from '../rules/instant.js';
import { SEAM_DEFAULTS, type SeamConfig } from './beltConfig.js';
import type { TrackEvent } from './events.js';

const AS_EXPECTED = 'the seam mark came where expected';

/**
 * What the seam mark says about position: where each mark should come, how far off it came, and
 * how far position can be trusted.
 *
 * Mark n lies at travel `n * lapCounts + offset`. The follower knows between which two marks the
 * belt is, so a bouncing edge is no second mark, and a mark that does not come is noticed whichever
 * way the belt moves.
 */
export class SeamFollower {
  /** `unknown` until the first mark. */
  trust: Trust = 'unknown';
  reason = 'waiting for the first seam mark';
  /** Beyond these travels a mark has been missed; infinite while position is unknown. */
  missedBelow = Number.NEGATIVE_INFINITY;
  missedAbove = Number.POSITIVE_INFINITY;
  /** Slip at the newest accepted mark, counts. */
  slipCounts = 0;

  readonly #lapCounts: number;
  readonly #offsetCounts: number;
  readonly #warnCounts: number;
  readonly #stopCounts: number;
  readonly #bounceCounts: number;
  readonly #mmPerCount: number;
  readonly #events: TrackEvent[];
  /** The belt is between this mark and the next. */
  #mark = 0;
  /** The sensor's last edge. */
  #edgeRose = false;
  #edgeForwards = true;
  #edgeMoved = Number.NEGATIVE_INFINITY;
  /** The last mark accepted. */
  #lastMet = Number.NaN;
  /** Where the last mark that was not believed was met; NaN when there is none. */
  #surpriseTravel = Number.NaN;
  #surpriseSlip = 0;

  constructor(config: SeamConfig, lapCounts: number, cmPerCount: number, events: TrackEvent[]) {
    this.#lapCounts = lapCounts;
    this.#mmPerCount = cmPerCount * 10;
    this.#offsetCounts = Math.round(config.offsetCm / cmPerCount);
    this.#warnCounts = (config.warnCm ?? SEAM_DEFAULTS.warnCm) / cmPerCount;
    this.#stopCounts = (config.stopCm ?? SEAM_DEFAULTS.stopCm) / cmPerCount;
    this.#bounceCounts = SEAM_DEFAULTS.bounceCm / cmPerCount;
    this.#events = events;
  }

  /** Position is lost: the next mark met forwards is a first one. */
  lost(reason: string): void {
    this.missedBelow = Number.NEGATIVE_INFINITY;
    this.missedAbove = Number.POSITIVE_INFINITY;
    this.#lastMet = Number.NaN;
    this.#edgeMoved = Number.NEGATIVE_INFINITY;
    this.#trustNow('unknown', reason);
  }

  /**
   * Whether an edge of the sensor is the mark's leading edge: it rises under a belt that moves
   * forwards and falls under one that backs. The trailing edge's chatter does so too, and is told
   * by the edge before it: the trailing edge, met the same way, and nearer than any mark is wide.
   * Two rises or two falls in a row near each other mean that a frame was lost: neither can be told.
   */
  leads(rose: boolean, forwards: boolean, moved: number): boolean {
    const apart = Math.abs(moved - this.#edgeMoved);
    const chatter =
      this.#edgeRose === rose
        ? apart < this.#lapCounts / 2
        : this.#edgeForwards === forwards && apart < this.#bounceCounts;
    this.#edgeRose = rose;
    this.#edgeForwards = forwards;
    this.#edgeMoved = moved;
    return rose === forwards && !chatter;
  }

  /**
   * The first mark, met forwards: it begins the lap after `lap`.
   * @returns the travel at the mark
   */
  first(lap: number): number {
    const mark = lap + 1;
    this.#between(mark);
    this.#lastMet = mark;
    this.#surpriseTravel = Number.NaN;
    this.#tell('first', null);
    this.#trustNow('trusted', AS_EXPECTED);
    return mark * this.#lapCounts + this.#offsetCounts;
  }

  /**
   * The mark's leading edge was met at `travel`.
   * @returns what is to be added to travel: 0 when the mark changes nothing
   */
  met(travel: number, forwards: boolean): number {
    const mark = Math.round((travel - this.#offsetCounts) / this.#lapCounts);
    const slip = travel - (mark * this.#lapCounts + this.#offsetCounts);
    const beyond = forwards ? mark : mark - 1;
    if (Math.abs(slip) > this.#stopCounts) return this.#surprised(travel, slip, beyond);
    // Already past it: the edge bounces.
    if (this.#mark === beyond) return 0;
    const good = Math.abs(slip) <= this.#warnCounts;
    const again = mark === this.#lastMet;
    this.#between(beyond);
    this.#lastMet = mark;
    this.#surpriseTravel = Number.NaN;
    if (good) this.#trustNow('trusted', AS_EXPECTED);
    // The same mark met on the way back agrees: nothing to correct, nothing to tell. Otherwise a
    // belt that rocks on its mark would fill the record.
    if (again && good) return 0;
    this.slipCounts = slip;
    this.#tell('accepted', slip);
    return -slip;
  }

  /** Movement went beyond `missedBelow` or `missedAbove`. */
  missed(travel: number): void {
    this.#between(this.#markBelow(travel));
    this.#tell('missed', null);
    this.#trustNow('doubtful', 'the seam mark did not come where expected');
  }

  /** Frames were lost while the belt moved to `travel`: marks on the way went by unseen. */
  unseen(travel: number): void {
    if (travel >= this.missedBelow && travel <= this.missedAbove) return;
    this.#between(this.#markBelow(travel));
    this.#trustNow('doubtful', 'the seam mark went by while no frames came');
  }

  /** Two marks in a row that agree with each other, a lap apart, outvote what was believed. */
  #surprised(travel: number, slip: number, beyond: number): number {
    const apart = Math.abs(travel - this.#surpriseTravel);
    if (apart <= this.#stopCounts) return 0;
    const lapCounts = this.#lapCounts;
    const difference = slip - this.#surpriseSlip;
    const disagree = Math.abs(difference - Math.round(difference / lapCounts) * lapCounts);
    if (apart > lapCounts / 2 && disagree <= this.#warnCounts) {
      this.#between(beyond);
      this.#surpriseTravel = Number.NaN;
      this.#lastMet = Number.NaN;
      this.slipCounts = slip;
      this.#tell('rehomed', slip);
      this.#trustNow('doubtful', 'position moved to where two marks agree; waiting for a third');
      return -slip;
    }
    this.#surpriseTravel = travel;
    this.#surpriseSlip = slip;
    this.#tell('ignored', slip);
    const mm = Math.round(Math.abs(slip) * this.#mmPerCount);
    this.#trustNow('doubtful', `a seam mark came ${mm} mm from where it should be`);
    return 0;
  }

  /** The mark that the belt must have passed last if it has come to `travel`. */
  #markBelow(travel: number): number {
    return Math.floor((travel - this.#offsetCounts) / this.#lapCounts);
  }

  #between(mark: number): void {
    this.#mark = mark;
    this.missedBelow = mark * this.#lapCounts + this.#offsetCounts - this.#stopCounts;
    this.missedAbove = (mark + 1) * this.#lapCounts + this.#offsetCounts + this.#stopCounts;
  }

  #tell(event: 'first' | 'accepted' | 'ignored' | 'missed' | 'rehomed', slip: number | null): void {
    const slipMm = slip === null ? null : slip * this.#mmPerCount;
    this.#events.push({ kind: 'seam', event, slipMm });
  }

  #trustNow(trust: Trust, reason: string): void {
    const told = this.trust === trust && this.reason === reason;
    if (!told) this.#events.push({ kind: 'trust', trust, reason });
    this.trust = trust;
    this.reason = reason;
  }
}
