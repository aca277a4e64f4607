import fs from 'node:fs';
import type tty from 'node:tty';
import * as pty from '@lydell/node-pty';

/** The private parts of node-pty's `open()` that a board on a pseudo-terminal needs. */
interface OpenedPty {
  readonly _fd: number;
  readonly _pty: string;
  readonly _master: tty.ReadStream;
  readonly _slave: tty.ReadStream;
}

/** A real pseudo-terminal: the board's end here, and a path for the link to open. */
export class PseudoTerminal {
  readonly path: string;
  readonly #pty: OpenedPty;
  #open = true;

  constructor(onBytes: (bytes: Uint8Array) => void) {
    this.#pty = (pty as unknown as { open(options: object): OpenedPty }).open({ encoding: null });
    this.path = this.#pty._pty;
    // Otherwise this end would eat half of what is meant for the link.
    this.#pty._slave.destroy();
    this.#pty._master.on('data', (bytes: Buffer) => onBytes(bytes));
    this.#pty._master.on('error', () => {});
  }

  write(bytes: Uint8Array): void {
    if (this.#open) fs.writeSync(this.#pty._fd, bytes);
  }

  /** Stops or goes on reading what the link writes. */
  pause(paused: boolean): void {
    if (paused) this.#pty._master.pause();
    else this.#pty._master.resume();
  }

  /** Pulls the cable. */
  unplug(): void {
    this.#open = false;
    this.#pty._master.destroy();
  }
}
