import net from 'node:net';
import type { ByteLine } from './byteLine.js';

/** Bytes that may wait for a slow host before they are dropped. */
const MOST_WAITING_BYTES = 65_536;

/** The board's end of a TCP connection, for machines without pseudo-terminals. One host at a time. */
export class TcpLine implements ByteLine {
  readonly #heard: (bytes: Uint8Array) => void;
  #number: number;
  #server: net.Server | undefined;
  #host: net.Socket | undefined;
  #paused = false;

  /** @param port 0 takes any free one */
  static async create(heard: (bytes: Uint8Array) => void, port: number): Promise<TcpLine> {
    const line = new TcpLine(heard, port);
    await line.replug();
    return line;
  }

  private constructor(heard: (bytes: Uint8Array) => void, port: number) {
    this.#heard = heard;
    this.#number = port;
  }

  get port(): string {
    return `tcp://127.0.0.1:${this.#number}`;
  }

  write(bytes: Uint8Array): void {
    const host = this.#host;
    if (host === undefined || host.writableLength > MOST_WAITING_BYTES) return;
    // The socket keeps what it is given; the caller's buffer is used again.
    host.write(Buffer.from(bytes));
  }

  pause(paused: boolean): void {
    this.#paused = paused;
    if (paused) this.#host?.pause();
    else this.#host?.resume();
  }

  unplug(): void {
    this.#host?.destroy();
    this.#host = undefined;
    this.#server?.close();
    this.#server = undefined;
  }

  async replug(): Promise<string> {
    this.unplug();
    const server = net.createServer({ noDelay: true }, (socket) => this.#came(socket));
    this.#server = server;
    await new Promise<void>((resolve, reject) => {
      server.once('error', reject);
      server.listen(this.#number, '127.0.0.1', resolve);
    });
    this.#number = (server.address() as net.AddressInfo).port;
    return this.port;
  }

  #came(socket: net.Socket): void {
    socket.on('error', () => {});
    if (this.#host !== undefined && !this.#host.destroyed) {
      socket.destroy();
      return;
    }
    this.#host = socket;
    if (this.#paused) socket.pause();
    socket.on('data', (bytes) => {
      if (this.#host === socket) this.#heard(bytes);
    });
    socket.on('close', () => {
      if (this.#host === socket) this.#host = undefined;
    });
  }
}
