import { BoardLink, type LinkOptions } from '../../server/link/boardLink.js';
import type { BytePort } from '../../server/link/bytePort.js';
import { type InProcessBoard, inProcessPair } from '../../server/link/inProcessPort.js';
import { Recorder } from './recorder.js';
import { ScriptedBoard } from './scriptedBoard.js';
import { VirtualTimers } from './virtualTimers.js';

/** A link to a scripted board in virtual time, with a cable that can be pulled and put back. */
export class VirtualLink {
  readonly timers = new VirtualTimers();
  readonly handler = new Recorder();
  readonly board = new ScriptedBoard();
  readonly link: BoardLink;
  /** Undefined: opening works. */
  refuse: Error | undefined;
  /** Virtual times at which the port was opened or refused. */
  readonly attempts: number[] = [];
  /** Put between the link and the port, when a test wants to meddle. */
  wrap: (port: BytePort) => BytePort = (port) => port;
  cable!: InProcessBoard;
  #sampling: unknown;
  #boardUs = 0;

  constructor(options: Partial<LinkOptions> = {}) {
    let seed = 1;
    this.link = new BoardLink({
      openPort: async () => {
        this.attempts.push(this.timers.now());
        if (this.refuse) throw this.refuse;
        return this.wrap(this.#open());
      },
      handler: this.handler,
      timers: this.timers,
      // Numbers that differ from call to call; what they are does not matter here.
      random: () => {
        seed = Math.imul(seed, 1_664_525) + 1_013_904_223;
        return seed >>> 0;
      },
      ...options,
    });
  }

  #open(): BytePort {
    const defer = (task: () => void) => void this.timers.set(0, task);
    const { host, board } = inProcessPair({ name: 'virtual', defer });
    this.cable = board;
    board.onBytes = (bytes) => this.board.receive(bytes);
    this.board.write = (bytes) => board.send(bytes);
    return host;
  }

  /** Lets the board send a sample every 5 ms, as the wire asks, until it is told to stop. */
  sample(on: boolean): void {
    if (this.#sampling !== undefined) this.timers.clear(this.#sampling);
    this.#sampling = undefined;
    if (!on) return;
    this.#boardUs += 5_000;
    this.board.say('sample', { boardUs: this.#boardUs });
    this.#sampling = this.timers.set(5, () => this.sample(true));
  }

  /** Starts the link and goes on until it is up, with samples flowing. */
  async up(): Promise<void> {
    this.link.start();
    await this.timers.advance(1);
    this.sample(true);
    await this.timers.advance(10);
    if (this.link.state !== 'up') throw new Error(`the link is ${this.link.state}`);
  }
}
