import { SerialPort } from 'serialport';
import { LapwingError } from '../errors/codes.js';
import type { BytePort, PortListener } from './bytePort.js';
import { openError } from './openError.js';

/** About 80 ms of line at 500 kbaud: more than this waiting means that nothing is being sent. */
const MOST_WAITING_BYTES = 4_096;

/**
 * The port by serialport's own stream, for platforms without terminals (Windows). A fresh object
 * for each connection and never reopened: version 13 keeps a write made after `close()` and would
 * send it on reopening.
 */
export function openSerialStream(path: string, baudRate: number): Promise<BytePort> {
  return new Promise((resolve, reject) => {
    const port = new SerialPort({ path, baudRate, hupcl: false, lock: true, autoOpen: false });
    port.open((error) => {
      if (error) reject(openError(path, error));
      else port.flush(() => resolve(new SerialStreamPort(path, port)));
    });
  });
}

class SerialStreamPort implements BytePort {
  readonly transport = 'serial';
  readonly #port: SerialPort;
  #listener: PortListener | undefined;
  #open = true;
  #released: Promise<void> | undefined;

  constructor(
    readonly name: string,
    port: SerialPort,
  ) {
    this.#port = port;
    port.on('error', (error) => this.#gone(error.message));
    port.on('close', () => this.#gone('the device is gone'));
  }

  listen(listener: PortListener): void {
    this.#listener = listener;
    this.#port.on('data', (bytes: Buffer) => {
      if (this.#open) listener.bytes(bytes);
    });
  }

  write(bytes: Uint8Array): boolean {
    if (!this.#open || !this.#port.isOpen) return false;
    if (this.#port.writableLength + bytes.length > MOST_WAITING_BYTES) return false;
    // The caller uses its buffer again; the stream keeps what it is given.
    this.#port.write(Buffer.from(bytes));
    return true;
  }

  close(): Promise<void> {
    this.#open = false;
    this.#released ??= new Promise((resolve) => {
      if (!this.#port.isOpen) return resolve();
      this.#port.flush(() => this.#port.close(() => resolve()));
    });
    return this.#released;
  }

  #gone(why: string): void {
    if (!this.#open) return;
    void this.close();
    this.#listener?.closed(new LapwingError('linkUnplugged', `${this.name}: ${why}.`));
  }
}
