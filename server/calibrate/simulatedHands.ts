import { connect, type Socket } from 'node:net';
import { LineReader } from '../loop/lines.js';
import type { Hands } from './guides/guide.js';

const LONGEST_LINE_BYTES = 64 * 1024;

/** The hands of a simulated rig that was started beside the loop: commands over its local socket. */
export class SimulatedHands {
  readonly #socket: Socket;
  readonly #waiting: {
    resolve(answer: Readonly<Record<string, unknown>>): void;
    reject(error: Error): void;
  }[] = [];

  private constructor(socket: Socket) {
    this.#socket = socket;
    const lines = new LineReader(LONGEST_LINE_BYTES, (line) => {
      this.#waiting.shift()?.resolve(JSON.parse(line) as Readonly<Record<string, unknown>>);
    });
    socket.on('data', (bytes) => lines.push(bytes));
    const gone = () => {
      for (const one of this.#waiting.splice(0)) one.reject(new Error('the simulated rig is gone'));
    };
    socket.on('error', gone);
    socket.on('close', gone);
  }

  /** @returns undefined where no simulated rig listens */
  static open(path: string): Promise<SimulatedHands | undefined> {
    return new Promise((resolve) => {
      const socket = connect(path);
      socket.once('connect', () => resolve(new SimulatedHands(socket)));
      socket.once('error', () => resolve(undefined));
    });
  }

  readonly say: Hands = (command) =>
    new Promise((resolve, reject) => {
      this.#waiting.push({ resolve, reject });
      this.#socket.write(`${command}\n`);
    });

  close(): void {
    this.#socket.destroy();
  }
}
