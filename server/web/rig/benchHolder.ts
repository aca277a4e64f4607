import { LoopBench } from '../../calibrate/loopBench.js';
import { SimulatedHands } from '../../calibrate/simulatedHands.js';
import { EventRing } from '../../loop/eventRing.js';
import type { BenchItem } from '../../loop/protocol.js';
import type { RigAddress } from '../../loop/rigLock.js';
import type { BenchTold } from './rigMessages.js';

const ITEMS_KEPT = 5_000;
/** A page asks again by itself. */
const BOARD_MS = 3_000;
/** Nobody has asked for so long: the bench is given back, and outputs that were tried go idle. */
const UNUSED_MS = 6_000;

/** The loop's bench, held while a page looks at it or a guide uses it. */
export class BenchHolder {
  readonly #address: RigAddress;
  #bench: Promise<LoopBench> | undefined;
  #items = new EventRing<BenchItem>(ITEMS_KEPT);
  #hands: SimulatedHands | undefined;
  #askedMs = 0;
  #users = 0;
  #watch: NodeJS.Timeout | undefined;

  constructor(address: RigAddress) {
    this.#address = address;
  }

  /** @throws LapwingError LOOP_AWAY, LOOP_NO_BOARD */
  async bench(): Promise<LoopBench> {
    this.#askedMs = performance.now();
    this.#bench ??= this.#open();
    return this.#bench;
  }

  /** The hands of a simulated rig; undefined on a real one. */
  async hands(): Promise<SimulatedHands | undefined> {
    const bench = await this.bench();
    if (!bench.board.simulated) return undefined;
    this.#hands ??= await SimulatedHands.open(this.#address.handsPath);
    return this.#hands;
  }

  /** What came after number `after`; at first the last ten seconds or so. */
  async itemsAfter(after: number): Promise<BenchTold> {
    const bench = await this.bench();
    const items = this.#items;
    // A number from before the bench was opened anew would hide everything.
    const from = after > items.last ? 0 : after;
    const next = items.after(from, ITEMS_KEPT);
    return { now: bench.now, last: items.last, items: next.map(({ event }) => event) };
  }

  /** A guide uses it: it is kept until `release`, whether anybody looks or not. */
  use(): () => void {
    this.#users++;
    return () => {
      this.#users--;
      this.#askedMs = performance.now();
    };
  }

  close(): void {
    clearInterval(this.#watch);
    void this.#bench?.then(
      (bench) => bench.close(),
      () => {},
    );
    this.#bench = undefined;
    this.#hands?.close();
    this.#hands = undefined;
  }

  async #open(): Promise<LoopBench> {
    try {
      const bench = await LoopBench.open(this.#address, BOARD_MS);
      this.#items = new EventRing<BenchItem>(ITEMS_KEPT);
      bench.listen((item) => {
        if (item.is !== 'frames') this.#items.push(item);
      });
      bench.onLost(() => this.close());
      clearInterval(this.#watch);
      this.#watch = setInterval(() => this.#closeUnused(), 1_000);
      this.#watch.unref();
      return bench;
    } catch (error) {
      this.#bench = undefined;
      throw error;
    }
  }

  #closeUnused(): void {
    if (this.#users === 0 && performance.now() - this.#askedMs > UNUSED_MS) this.close();
  }
}
