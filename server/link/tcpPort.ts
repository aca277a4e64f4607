import net from 'node:net';
import { LapwingError } from '../errors/codes.js';
import type { BytePort, PortListener } from './bytePort.js';
import { PrefixViews } from './prefixViews.js';

const CONNECT_MS = 2_000;
const READ_BYTES = 16_384;

/**
 * Connects to a board (a simulated one: real stimulus outputs are refused over a network) at
 * `tcp://host:port`. A numeric host needs no name look-up, which would share libuv's threads.
 */
export function openTcp(host: string, port: number): Promise<BytePort> {
  const name = `tcp://${host.includes(':') ? `[${host}]` : host}:${port}`;
  return new Promise((resolve, reject) => {
    const opened = new TcpPort(name);
    const views = new PrefixViews(READ_BYTES);
    const socket = net.connect({
      host,
      port,
      noDelay: true,
      onread: { buffer: views.buffer, callback: (length) => opened.received(views.of(length)) },
    });
    const fail = (error: LapwingError) => {
      socket.destroy();
      reject(error);
    };
    const late = setTimeout(() => {
      fail(new LapwingError('linkTcpUnreachable', `${name} did not answer within 2 s.`));
    }, CONNECT_MS);
    socket.once('error', (error: NodeJS.ErrnoException) => {
      clearTimeout(late);
      fail(connectError(name, error));
    });
    socket.once('connect', () => {
      clearTimeout(late);
      socket.removeAllListeners('error');
      opened.attach(socket);
      resolve(opened);
    });
  });
}

function connectError(name: string, error: NodeJS.ErrnoException): LapwingError {
  const options = { cause: error };
  if (error.code === 'ECONNREFUSED') {
    return new LapwingError('linkTcpRefused', `Nothing listens at ${name}.`, options);
  }
  return new LapwingError('linkTcpUnreachable', `${name}: ${error.message}.`, options);
}

class TcpPort implements BytePort {
  readonly transport = 'tcp';
  #socket!: net.Socket;
  #listener: PortListener | undefined;
  #open = true;

  constructor(readonly name: string) {}

  attach(socket: net.Socket): void {
    this.#socket = socket;
    socket.pause();
    socket.on('error', (error) => this.#gone(error.message));
    socket.on('close', () => this.#gone('the other side closed the connection'));
  }

  received(bytes: Uint8Array): boolean {
    if (this.#open) this.#listener?.bytes(bytes);
    return true;
  }

  listen(listener: PortListener): void {
    this.#listener = listener;
    this.#socket.resume();
  }

  write(bytes: Uint8Array): boolean {
    if (!this.#open) return false;
    // Written at once where the kernel has room; anything left over means that it had none.
    this.#socket.write(bytes);
    return this.#socket.writableLength === 0;
  }

  close(): Promise<void> {
    this.#open = false;
    const socket = this.#socket;
    if (socket.closed) return Promise.resolve();
    return new Promise((resolve) => {
      socket.once('close', () => resolve());
      socket.destroy();
    });
  }

  #gone(why: string): void {
    if (!this.#open) return;
    this.#open = false;
    this.#socket.destroy();
    this.#listener?.closed(new LapwingError('linkUnplugged', `${this.name}: ${why}.`));
  }
}
