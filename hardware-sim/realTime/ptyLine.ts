import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import type tty from 'node:tty';
import type { ByteLine } from './byteLine.js';

/**
 * What node-pty's `open()` really gives: a pseudo-terminal without a program in it. Its methods
 * must not be used: `kill` and `destroy` would signal process -1, which is every process.
 */
interface OpenPty {
  readonly _fd: number;
  readonly _pty: string;
  readonly _master: tty.ReadStream;
  readonly _slave: tty.ReadStream;
}

const ADVICE = 'Use --tcp 0 instead, and put the tcp:// address that it prints into the rig file.';

/** Opens pseudo-terminals. Fails with a sentence that says what to do where there are none. */
async function ptyOpener(): Promise<() => OpenPty> {
  let open: ((options: object) => OpenPty) | undefined;
  try {
    const pty = await import('@lydell/node-pty');
    const exported = ('open' in pty ? pty : (pty as { default: object }).default) as object;
    open = (exported as { open?: (options: object) => OpenPty }).open;
  } catch (error) {
    throw new Error(`There is no pseudo-terminal here (${(error as Error).message}). ${ADVICE}`);
  }
  return () => {
    if (open === undefined) throw new Error(`This node-pty opens no pseudo-terminal. ${ADVICE}`);
    const pty = open({ encoding: null });
    // These fields are private: another release of the package may name them otherwise.
    const asExpected =
      typeof pty._fd === 'number' &&
      typeof pty._pty === 'string' &&
      typeof pty._master?.on === 'function' &&
      typeof pty._slave?.setRawMode === 'function';
    if (!asExpected) throw new Error(`This release of node-pty is not the one expected. ${ADVICE}`);
    return pty;
  };
}

/** The board's end of a pseudo-terminal; the other end looks like a serial port to a host. */
export class PtyLine implements ByteLine {
  readonly #open: () => OpenPty;
  readonly #heard: (bytes: Uint8Array) => void;
  readonly #link: string | undefined;
  #pty: OpenPty | undefined;
  #lastPath = '';
  #paused = false;

  /** @param link a symbolic link that is kept pointing at the port while it is plugged in */
  static async create(heard: (bytes: Uint8Array) => void, link?: string): Promise<PtyLine> {
    const line = new PtyLine(await ptyOpener(), heard, link);
    await line.replug();
    return line;
  }

  private constructor(open: () => OpenPty, heard: (bytes: Uint8Array) => void, link?: string) {
    this.#open = open;
    this.#heard = heard;
    this.#link = link;
  }

  get port(): string {
    return this.#link ?? this.#lastPath;
  }

  write(bytes: Uint8Array): void {
    if (this.#pty === undefined) return;
    try {
      fs.writeSync(this.#pty._fd, bytes);
    } catch (error) {
      const { code } = error as NodeJS.ErrnoException;
      // Full, or going away: a UART would have sent it to nobody.
      if (code !== 'EAGAIN' && code !== 'EIO' && code !== 'EBADF') throw error;
    }
  }

  pause(paused: boolean): void {
    this.#paused = paused;
    if (paused) this.#pty?._master.pause();
    else this.#pty?._master.resume();
  }

  unplug(): void {
    const pty = this.#pty;
    if (pty === undefined) return;
    this.#pty = undefined;
    if (this.#link !== undefined) fs.rmSync(this.#link, { force: true });
    pty._master.destroy();
    pty._slave.destroy();
  }

  replug(): Promise<string> {
    this.unplug();
    let pty = this.#open();
    if (pty._pty === this.#lastPath) {
      // A device that comes back gets another name here, so that a host must cope with it.
      const other = this.#open();
      pty._master.destroy();
      pty._slave.destroy();
      pty = other;
    }
    this.#pty = pty;
    this.#lastPath = pty._pty;
    makeRaw(pty);
    // The slave stays open so that a host may come and go; reading it would steal the host's bytes.
    pty._slave.pause();
    pty._slave.on('error', () => {});
    pty._master.on('error', () => {});
    pty._master.on('data', (bytes: Buffer) => {
      if (this.#pty === pty) this.#heard(bytes);
    });
    if (this.#paused) pty._master.pause();
    if (this.#link !== undefined) pointLink(this.#link, pty._pty);
    return Promise.resolve(this.port);
  }
}

/** No echo and no translation, even before a host has set the port up. */
function makeRaw(pty: OpenPty): void {
  pty._slave.setRawMode(true);
  // Node's raw mode still turns newlines into two bytes; a host's own set-up undoes that, too.
  const flag = process.platform === 'darwin' ? '-f' : '-F';
  spawnSync('stty', [flag, pty._pty, 'raw', '-echo'], { stdio: 'ignore' });
}

/** Replaces the link in one step, so that nobody finds it missing in between. */
function pointLink(link: string, path: string): void {
  const beside = `${link}.${process.pid}`;
  fs.rmSync(beside, { force: true });
  fs.symlinkSync(path, beside);
  fs.renameSync(beside, link);
}
