import type { Sealed } from '../../rules/sealed.js';
import type { StampedDecision } from '../decisions.js';
import { Mask } from './mask.js';

/**
 * A real firing is told when the board reports it, a sham when it is decided: both are shown this
 * long after their time, on the board's clock, which is longer than any report takes.
 */
const HELD_US = 250_000;

/** The mask of a running session: also hides in *when* a firing is shown what it was. */
export class LiveMask {
  readonly mask: Mask;
  /** Masked already, waiting for their time. */
  readonly #held: StampedDecision[] = [];
  readonly #shown = new Map<string, number>();

  constructor(
    sealed: Sealed,
    private readonly show: (decision: StampedDecision) => void,
  ) {
    this.mask = new Mask(sealed);
  }

  /** Firings of a blinded rule that have been shown. */
  firings(rule: string): number {
    return this.#shown.get(rule) ?? 0;
  }

  take(decision: StampedDecision): void {
    const shown = this.mask.shown(decision);
    if (shown === undefined) return;
    if (shown.kind === 'fired' && this.mask.hidesRule(shown.rule)) this.#held.push(shown);
    else this.show(shown);
  }

  /** Shows what has waited long enough; called often, whether or not anything happens. */
  tick(nowUs: number): void {
    while (this.#held.length > 0 && nowUs - this.#held[0]!.boardUs >= HELD_US) {
      const decision = this.#held.shift()!;
      if (decision.kind === 'fired') {
        this.#shown.set(decision.rule, this.firings(decision.rule) + 1);
      }
      this.show(decision);
    }
  }

  /** At the session's end nothing is waited for any more. */
  flush(): void {
    this.tick(Number.POSITIVE_INFINITY);
  }
}
