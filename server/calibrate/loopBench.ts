import { LapwingError } from '../errors/codes.js';
import { LocalClient } from '../loop/localClient.js';
import type { BenchItem, BenchNow, Snapshot, Tried, TryRequest } from '../loop/protocol.js';
import type { RigAddress } from '../loop/rigLock.js';
import type { GuideBench } from './guides/guide.js';

/** The board has to be answering within this, or there is nothing to talk to. */
const BOARD_MS = 8_000;

/** The bench of a running loop, over the loop's local socket. */
export class LoopBench implements GuideBench {
  readonly #client: LocalClient;
  readonly #listeners = new Set<(item: BenchItem) => void>();
  readonly #changed = new Set<() => void>();
  #now: BenchNow = { atUs: 0, count: 0, board: null };
  #state: Snapshot | undefined;
  #lost: ((why: LapwingError) => void) | undefined;

  private constructor(address: Pick<RigAddress, 'socketPath' | 'tokenFile'>) {
    const { socketPath, tokenFile } = address;
    this.#client = new LocalClient({
      ...{ socketPath, tokenFile, client: 'bench', reconnect: false },
      callbacks: {
        bench: (now, items) => {
          this.#now = now;
          for (const item of items) for (const take of this.#listeners) take(item);
        },
        state: (state) => {
          this.#state = state;
          for (const look of this.#changed) look();
        },
        down: (why) => this.#lost?.(why),
      },
    });
  }

  /**
   * Connects, and waits until the board answers and the bench shows.
   * @throws LapwingError LOOP_AWAY without a loop, LOOP_NO_BOARD without a board
   */
  static async open(
    address: Pick<RigAddress, 'socketPath' | 'tokenFile'>,
    withinMs = BOARD_MS,
  ): Promise<LoopBench> {
    const bench = new LoopBench(address);
    bench.#client.start();
    try {
      await bench.#client.ready();
      bench.#client.watch(10);
      await bench.#client.bench(true);
      await bench.#until(() => bench.#state?.link.state === 'up' && bench.#now.atUs > 0, withinMs);
      return bench;
    } catch (error) {
      bench.close();
      throw error;
    }
  }

  get now(): BenchNow {
    return this.#now;
  }

  get board(): GuideBench['board'] {
    return this.#now.board ?? { model: '', boardId: 0, firmware: 0, simulated: false };
  }

  /** The loop's state now. */
  get state(): Snapshot | undefined {
    return this.#state;
  }

  /** Told when the connection ends by itself. */
  onLost(lost: (why: LapwingError) => void): void {
    this.#lost = lost;
  }

  listen(take: (item: BenchItem) => void): () => void {
    this.#listeners.add(take);
    return () => this.#listeners.delete(take);
  }

  attempt(request: TryRequest): Promise<Tried> {
    return this.#client.tryOutput(request);
  }

  timeFrames(on: boolean): Promise<void> {
    return this.#client.bench(true, on);
  }

  /** Lets the loop read its rig file again. */
  reload(): Promise<void> {
    return this.#client.reload();
  }

  close(): void {
    this.#client.close();
  }

  #until(holds: () => boolean, withinMs: number): Promise<void> {
    return new Promise((resolve, reject) => {
      const done = (error?: Error) => {
        clearInterval(looking);
        clearTimeout(late);
        this.#changed.delete(look);
        if (error) reject(error);
        else resolve();
      };
      const look = () => {
        if (holds()) done();
      };
      const looking = setInterval(look, 20);
      const late = setTimeout(() => {
        const why = this.#state?.link.reason || 'It has said nothing yet.';
        done(new LapwingError('loopNoBoard', why));
      }, withinMs);
      this.#changed.add(look);
      look();
    });
  }
}
