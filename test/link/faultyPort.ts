import type { BytePort, PortListener } from '../../server/link/bytePort.js';

/**
 * A port between the link and another port that breaks up, corrupts, loses and holds back what the
 * board sends. Every piece comes in the same buffer, as real ports do it.
 */
export class FaultyPort implements BytePort {
  readonly name: string;
  readonly transport: BytePort['transport'];
  readonly #inner: BytePort;
  readonly #pieces: readonly number[];
  readonly #piece = new Uint8Array(4096);
  readonly #held: Uint8Array[] = [];
  readonly #heldWrites: Uint8Array[] = [];
  #listener!: PortListener;
  #flips: ReadonlySet<number> = new Set();
  #losses: ReadonlySet<number> = new Set();
  #position = 0;
  #turn = 0;
  /** True: bytes are kept back until `release()`. */
  holding = false;
  /** True: what the host writes is taken and kept back until `releaseWrites()`. */
  holdingWrites = false;

  /** `pieces` are the lengths in which bytes arrive, used in turn. */
  constructor(inner: BytePort, pieces: readonly number[]) {
    this.#inner = inner;
    this.#pieces = pieces;
    this.name = inner.name;
    this.transport = inner.transport;
  }

  listen(listener: PortListener): void {
    this.#listener = listener;
    this.#inner.listen({
      bytes: (bytes) => {
        if (this.holding) this.#held.push(bytes.slice());
        else this.#arrive(bytes);
      },
      closed: (why) => listener.closed(why),
    });
  }

  write(bytes: Uint8Array): boolean {
    if (!this.holdingWrites) return this.#inner.write(bytes);
    this.#heldWrites.push(bytes.slice());
    return true;
  }

  /** Lets out what the host wrote meanwhile, as a line does once it moves again. */
  releaseWrites(): void {
    this.holdingWrites = false;
    for (const bytes of this.#heldWrites.splice(0)) this.#inner.write(bytes);
  }

  close(): Promise<void> {
    return this.#inner.close();
  }

  /** From now on flips a bit at some byte positions and loses others, counted from here. */
  damage(flips: ReadonlySet<number>, losses: ReadonlySet<number>): void {
    this.#flips = flips;
    this.#losses = losses;
    this.#position = 0;
  }

  release(): void {
    this.holding = false;
    for (const bytes of this.#held.splice(0)) this.#arrive(bytes);
  }

  #arrive(bytes: Uint8Array): void {
    let length = 0;
    const pieces = this.#pieces;
    let room = pieces[this.#turn % pieces.length]!;
    const flush = () => {
      if (length > 0) this.#listener.bytes(this.#piece.subarray(0, length));
      length = 0;
      this.#turn++;
      room = pieces[this.#turn % pieces.length]!;
    };
    for (const byte of bytes) {
      const at = this.#position++;
      if (this.#losses.has(at)) continue;
      this.#piece[length++] = this.#flips.has(at) ? byte ^ (1 << (at & 7)) : byte;
      if (length >= room) flush();
    }
    flush();
  }
}
