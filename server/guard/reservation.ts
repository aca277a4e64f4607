import type { OutputOrder } from '../rules/instant.js';

/** One order under an id: what it may do at most, until the board has said how it ended. */
export class Reservation {
  id = 0;
  output = 0;
  widthUs = 0;
  periodUs = 0;
  rises = 0;
  /** All of its on-time, and from its first rise to its last fall. */
  onUs = 0;
  spanUs = 0;
  volumeNl = 0;
  /** When its first rise may be; `latestUs` is infinite while it waits in a slot. */
  earliestUs = 0;
  latestUs = 0;
  /** Board time of the first rise; NaN until the board reports it. */
  firedUs = Number.NaN;

  set(id: number, order: OutputOrder, volumeNl: number, nowUs: number, latestUs: number): this {
    this.id = id;
    this.output = order.output;
    this.widthUs = order.widthUs;
    this.periodUs = order.repeats > 1 ? order.periodUs : order.widthUs;
    this.rises = order.repeats;
    this.onUs = order.widthUs * order.repeats;
    this.spanUs = this.periodUs * (order.repeats - 1) + order.widthUs;
    this.volumeNl = volumeNl;
    this.earliestUs = nowUs + order.delayUs;
    this.latestUs = Math.max(latestUs, this.earliestUs);
    this.firedUs = Number.NaN;
    return this;
  }

  /** It waits in a slot, and only the board knows when it will start. */
  get waits(): boolean {
    return this.latestUs === Number.POSITIVE_INFINITY && Number.isNaN(this.firedUs);
  }
  get startsUs(): number {
    return Number.isNaN(this.firedUs) ? this.earliestUs : this.firedUs;
  }
  get endsByUs(): number {
    return (Number.isNaN(this.firedUs) ? this.latestUs : this.firedUs) + this.spanUs;
  }
}
