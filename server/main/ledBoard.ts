import { Board } from '../../hardware-sim/board/board.js';
import type { Hear, LedBoard } from '../session/whatIf.js';
import type { HostMessageName, Identity, MessageOf } from '../wire/messages.js';
import { PROTOCOL_VERSION } from '../wire/messages.js';
import { extend32, fromWraps } from '../wire/time.js';

const TAG = 1;

/** The simulated board on a recorded belt: limits, slots and outcomes are the wire page's. */
export class SimulatedLedBoard implements LedBoard {
  readonly #hear: Hear;
  #board: Board | undefined;
  #identity: Identity | undefined;
  /** The board's clock, and the count, counted on beyond 32 bits, of the frame followed last. */
  #atUs = 0;
  #count = 0;

  constructor(hear: Hear) {
    this.#hear = hear;
  }

  connect(identity: Identity, sameBoot: boolean): Identity {
    this.#identity = undefined;
    if (!sameBoot || this.#board === undefined) this.#boot(identity);
    const board = this.#board!;
    board.receive('identify', { nonce: 1, protocol: PROTOCOL_VERSION, newTag: TAG }, 0);
    const { outcomesKept } = this.#identity ?? identity;
    return { ...identity, outcomesKept };
  }

  receive<N extends HostMessageName>(name: N, message: MessageOf[N]): void {
    // The sync train in the record is the board's own; it decides nothing.
    if (name !== 'sync') this.#board?.receive(name, message, TAG);
  }

  /** Between two frames the belt is taken to have moved evenly, so that slots fire in between. */
  follow(boardUs: number, count: number): void {
    const board = this.#board;
    if (board === undefined) return;
    const toUs = extend32(this.#atUs, boardUs);
    const by = (count - this.#count) | 0;
    if (toUs < this.#atUs) return;
    const direction = by > 0 ? 1 : -1;
    const lastUs = this.#atUs;
    let moved = 0;
    while (moved !== by) {
      const gap = board.countsToSlot(direction);
      const step = direction * Math.min(Math.abs(by - moved), gap);
      moved += step;
      board.advanceTo(Math.floor(lastUs + ((toUs - lastUs) * moved) / by));
      board.move(step);
    }
    board.advanceTo(toUs);
    this.#atUs = toUs;
    this.#count = count;
  }

  #boot(identity: Identity): void {
    const startUs = fromWraps(identity.wraps, identity.boardUs);
    const { slots, bootId: seed, boardId } = identity;
    this.#atUs = startUs;
    this.#board = new Board({
      ...{ startUs, startCount: this.#count, slots, seed, boardId },
      ...{ outputs: 16, inputs: 16 },
    });
    this.#board.connect({
      identity: (message) => {
        this.#identity = { ...message };
      },
      sample: () => {},
      edge: () => {},
      clock: () => {},
      fault: (message) => this.#hear('fault', message),
      outcome: (message) => this.#hear('outcome', message),
    });
  }
}
