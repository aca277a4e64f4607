import { blank } from '../../server/wire/codec.js';
import type { Outcome } from '../../server/wire/messages.js';

/** The newest outcomes, kept until reset and told again after every identity. */
export class OutcomeRing {
  readonly #ring: Outcome[];
  #next = 0;
  #kept = 0;

  constructor(size: number) {
    this.#ring = Array.from({ length: size }, () => blank('outcome'));
  }

  get kept(): number {
    return this.#kept;
  }

  keep(outcome: Outcome): void {
    Object.assign(this.#ring[this.#next]!, outcome);
    this.#next = (this.#next + 1) % this.#ring.length;
    if (this.#kept < this.#ring.length) this.#kept++;
  }

  clear(): void {
    this.#kept = 0;
  }

  /** Oldest first. */
  each(visit: (outcome: Outcome) => void): void {
    const size = this.#ring.length;
    for (let n = this.#kept; n > 0; n--) visit(this.#ring[(this.#next - n + size) % size]!);
  }
}
