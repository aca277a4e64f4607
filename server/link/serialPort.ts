import fs from 'node:fs';
import tty from 'node:tty';
import { SerialPort } from 'serialport';
import { LapwingError } from '../errors/codes.js';
import type { BytePort, PortListener } from './bytePort.js';
import { openError } from './openError.js';
import { PrefixViews } from './prefixViews.js';
import { openSerialStream } from './serialStreamPort.js';

/** A terminal hands over at most 4 kB at once on Linux. (from memory) */
const READ_BYTES = 4_096;

export interface SerialOptions {
  /** Line speed, bits a second; a pseudo-terminal ignores it. */
  readonly baudRate: number;
  /**
   * `terminal` reads with a libuv terminal stream and writes with one system call; `stream` is
   * serialport's own stream, slower by about 100 us a round trip. Chosen by platform if absent.
   */
  readonly means?: 'terminal' | 'stream';
}

/**
 * Opens and configures a serial device or a pseudo-terminal, locked against a second Lapwing.
 * Never resets a board that resets as its port is let go of (`hupcl: false`).
 */
export async function openSerial(path: string, options: SerialOptions): Promise<BytePort> {
  const means = options.means ?? (process.platform === 'win32' ? 'stream' : 'terminal');
  return means === 'stream'
    ? openSerialStream(path, options.baudRate)
    : TerminalPort.open(path, options.baudRate);
}

/** What serialport's binding gives on Linux and macOS. */
interface Binding {
  readonly fd: number | null;
  flush(): Promise<void>;
  close(): Promise<void>;
}

/**
 * Three descriptors of one device, each closed exactly once by its owner:
 *
 * - the binding's, which configured the line and holds the lock. Kept open to the last, because
 *   libuv opens a terminal anew over the descriptor it is given, which would drop the lock;
 * - our own, given to libuv and written to;
 * - libuv's, made from ours, read from, and closed by `destroy()`.
 */
class TerminalPort implements BytePort {
  readonly transport = 'serial';
  readonly name: string;
  readonly #binding: Binding;
  readonly #fd: number;
  readonly #stream: tty.ReadStream;
  /** libuv kept to our descriptor, and so closes it. */
  readonly #streamOwnsFd: boolean;
  #listener: PortListener | undefined;
  #open = true;
  #released: Promise<void> | undefined;

  static async open(path: string, baudRate: number): Promise<TerminalPort> {
    let binding: Binding;
    try {
      const opening = { path, baudRate, hupcl: false, lock: true };
      binding = (await SerialPort.binding.open(opening)) as unknown as Binding;
    } catch (error) {
      throw openError(path, error as Error);
    }
    let fd: number | undefined;
    try {
      const { O_RDWR, O_NOCTTY, O_NONBLOCK } = fs.constants;
      fd = fs.openSync(path, O_RDWR | O_NOCTTY | O_NONBLOCK);
      // What came before this connection is of no interest.
      await binding.flush();
      return new TerminalPort(path, binding, fd);
    } catch (error) {
      if (fd !== undefined) fs.closeSync(fd);
      await binding.close().catch(() => {});
      throw openError(path, error as Error);
    }
  }

  private constructor(name: string, binding: Binding, fd: number) {
    this.name = name;
    this.#binding = binding;
    this.#fd = fd;
    // One buffer for every read, where a stream would take a new one of 64 kB each time.
    const views = new PrefixViews(READ_BYTES);
    const onread = {
      buffer: views.buffer,
      callback: (length: number) => this.#received(views.of(length)),
    };
    this.#stream = new tty.ReadStream(fd, { onread } as object);
    const handle = (this.#stream as unknown as { _handle: { fd?: number } })._handle;
    this.#streamOwnsFd = handle.fd === fd;
    this.#stream.on('error', (error) => this.#gone(error.message));
    this.#stream.on('close', () => this.#gone('the device is gone'));
  }

  listen(listener: PortListener): void {
    this.#listener = listener;
    this.#stream.resume();
  }

  write(bytes: Uint8Array): boolean {
    if (!this.#open) return false;
    try {
      return fs.writeSync(this.#fd, bytes) === bytes.length;
    } catch {
      // EAGAIN: the device takes no more; EIO: it is gone. Either way the connection is over.
      return false;
    }
  }

  close(): Promise<void> {
    this.#open = false;
    this.#released ??= this.#release();
    return this.#released;
  }

  #received(bytes: Uint8Array): boolean {
    if (this.#open) this.#listener?.bytes(bytes);
    return true;
  }

  #gone(why: string): void {
    if (!this.#open) return;
    void this.close();
    this.#listener?.closed(new LapwingError('linkUnplugged', `${this.name}: ${why}.`));
  }

  async #release(): Promise<void> {
    const ended = new Promise((resolve) => {
      if (this.#stream.closed) resolve(undefined);
      else this.#stream.once('close', resolve);
    });
    this.#stream.destroy();
    if (!this.#streamOwnsFd) fs.closeSync(this.#fd);
    await ended;
    // Without this the last close may wait half a minute for bytes that no board takes, and a
    // board that comes back could be given them. It fails where the device is gone.
    await this.#binding.flush().catch(() => {});
    await this.#binding.close().catch(() => {});
  }
}
