import type { FiringRequest, OutputOrder } from '../../rules/instant.js';
import type { Arm, Pulse } from '../../wire/messages.js';

/** One id sent to the board whose end has not been reported. */
export interface LiveId {
  readonly id: number;
  readonly firing: LiveFiring;
  readonly order: OutputOrder;
  /** What was sent, to ask again under the same id when no answer comes. */
  readonly command:
    | { readonly name: 'pulse'; readonly message: Pulse }
    | { readonly name: 'arm'; readonly message: Arm };
  /** When its first rise may be at the latest; infinite while it waits in a slot. */
  readonly latestUs: number;
  /** Its rise was reported; its fall was not. */
  risen: boolean;
  /** When the board should have answered, microseconds; asked again then. */
  answerDueUs: number;
  asked: number;
}

/** One firing whose ids are not all accounted for. */
export interface LiveFiring {
  readonly request: FiringRequest;
  readonly armed: boolean;
  readonly ids: LiveId[];
  /** The engine has been told how it went. */
  settled: boolean;
}

/** More than any board keeps outcomes of. */
const CLOSED_KEPT = 512;

/**
 * Every id from the moment it is sent until its end is known. Ids rise through the whole session and
 * over every connection, so that an outcome told late can never be taken for another's.
 */
export class Ledger {
  readonly #live = new Map<number, LiveId>();
  /**
   * Ids that have ended lately and whether they stay charged, since the board tells its outcomes
   * again at each handshake.
   */
  readonly #closed = new Map<number, boolean>();
  #nextId = 1;

  get size(): number {
    return this.#live.size;
  }

  takeId(): number {
    return this.#nextId++;
  }

  idsFrom(id: number): void {
    this.#nextId = id;
  }

  /** Leaves room for ids that a loop sent and could not record before it was killed. */
  skipIds(count: number): void {
    this.#nextId += count;
  }

  add(live: LiveId): void {
    this.#live.set(live.id, live);
    live.firing.ids.push(live);
  }

  find(id: number): LiveId | undefined {
    return this.#live.get(id);
  }

  /** The id has ended: charged to the limits, or given back. */
  close(live: LiveId, charged: boolean): void {
    this.#live.delete(live.id);
    this.closed(live.id, charged);
    const { ids } = live.firing;
    ids.splice(ids.indexOf(live), 1);
  }

  /** The id has ended and is charged already. */
  isCharged(id: number): boolean {
    return this.#closed.get(id) === true;
  }

  closed(id: number, charged: boolean): void {
    this.#closed.set(id, charged);
    if (this.#closed.size <= CLOSED_KEPT) return;
    // A map keeps the order of insertion, so its first is its oldest.
    for (const oldest of this.#closed.keys()) {
      this.#closed.delete(oldest);
      break;
    }
  }

  all(): IterableIterator<LiveId> {
    return this.#live.values();
  }
}
