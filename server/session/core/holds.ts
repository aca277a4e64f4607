import type { Guard, Holdable } from '../../guard/guard.js';

/** Who holds: the operator, a hand on the belt, or Lapwing until the operator allows it again. */
export type Holder = 'operator' | 'hand' | 'restart';

/** What is held back, and by whom: several may hold at once, and each lets go for itself. */
export class Holds {
  readonly #guard: Guard;
  readonly #reasons: Record<Holdable, Map<Holder, string>> = {
    stimulus: new Map(),
    water: new Map(),
  };

  constructor(guard: Guard) {
    this.#guard = guard;
  }

  set(what: Holdable, holder: Holder, reason: string): void {
    this.#reasons[what].set(holder, reason);
    this.#tellGuard(what);
  }

  release(what: Holdable, holder: Holder): void {
    this.#reasons[what].delete(holder);
    this.#tellGuard(what);
  }

  isHeldBy(what: Holdable, holder: Holder): boolean {
    return this.#reasons[what].has(holder);
  }

  /** Why it is held now, or null. */
  reason(what: Holdable): string | null {
    return this.#guard.heldBecause(what) ?? null;
  }

  #tellGuard(what: Holdable): void {
    const reasons = [...this.#reasons[what].values()];
    if (reasons.length === 0) this.#guard.unhold(what);
    else this.#guard.hold(what, reasons.join('; '));
  }
}
