import { type ChildProcess, spawn } from 'node:child_process';
import { createInterface } from 'node:readline';

/** The board's input that rises as the cause of a reply. */
export const PROBE_INPUT = 2;

export interface Block {
  /** Round trips in microseconds, of the causes that were answered. */
  readonly tripsUs: readonly number[];
  readonly unanswered: number;
  /** Frames that a full pseudo-terminal did not take. */
  readonly dropped: number;
  /** Replies that fit no cause. */
  readonly unmatched: number;
}

/** The C peer as a child process: one pseudo-terminal, and blocks of causes on demand. */
export class Peer {
  pty = '';
  identified = 0;
  readonly #child: ChildProcess;
  #trips: number[] = [];
  #onBlock: ((block: Block) => void) | undefined;
  #onPty: (() => void) | undefined;

  static async start(program: string, kind: 'bare' | 'board'): Promise<Peer> {
    const peer = new Peer(program, kind);
    await new Promise<void>((resolve) => {
      peer.#onPty = resolve;
    });
    return peer;
  }

  private constructor(program: string, kind: 'bare' | 'board') {
    const options = { stdio: ['pipe', 'pipe', 'inherit'] as ['pipe', 'pipe', 'inherit'] };
    const child = spawn(program, [kind, String(PROBE_INPUT)], options);
    this.#child = child;
    createInterface({ input: child.stdout }).on('line', (line) => this.#line(line));
  }

  /** Sends so many causes, 10 ms apart, and gives what came back. */
  block(causes: number): Promise<Block> {
    return new Promise((resolve) => {
      this.#trips = [];
      this.#onBlock = resolve;
      this.#child.stdin!.write(`block ${causes}\n`);
    });
  }

  stop(): Promise<void> {
    return new Promise((resolve) => {
      this.#child.once('exit', () => resolve());
      this.#child.stdin!.end();
    });
  }

  #line(line: string): void {
    const [word, first, second] = line.split(' ');
    if (word === 'rtt') {
      this.#trips.push(Number(first) / 1000);
    } else if (word === 'pty') {
      this.pty = first!;
      this.#onPty?.();
    } else if (word === 'identified') {
      this.identified++;
    } else if (word === 'end') {
      const tripsUs = this.#trips.filter((trip) => trip >= 0);
      const unanswered = this.#trips.length - tripsUs.length;
      const counts = { unanswered, dropped: Number(first), unmatched: Number(second) };
      this.#onBlock?.({ tripsUs, ...counts });
    }
  }
}
