import fs from 'node:fs';
import net from 'node:net';
import tty from 'node:tty';
import { blank, FrameEncoder } from '../../server/wire/codec.js';
import { FrameDecoder } from '../../server/wire/frameDecoder.js';
import type { HostMessageName, MessageName, MessageOf } from '../../server/wire/messages.js';

const PATIENCE_MS = 20_000;
const ASK_AGAIN_MS = 300;

export interface HeardFrame {
  readonly name: MessageName;
  readonly tag: number;
  readonly message: Record<string, number | string>;
}

/** Opens a port with nothing of Lapwing's link in between: bytes in and out. */
export class RawHost {
  readonly heard: HeardFrame[] = [];
  closed = false;
  bad = 0;
  readonly #encoder = new FrameEncoder();
  readonly #write: (bytes: Uint8Array) => void;
  readonly #close: () => void;
  #wake: () => void = () => {};

  constructor(port: string) {
    const decoder = new FrameDecoder({
      frame: (frame) => {
        const message = blank(frame.shape.name) as never;
        frame.read(message);
        this.heard.push({ name: frame.shape.name, tag: frame.tag, message });
      },
      bad: () => this.bad++,
    });
    const bytes = (chunk: Uint8Array) => {
      decoder.push(chunk);
      this.#wake();
    };
    const gone = () => {
      this.closed = true;
      this.#wake();
    };
    const { stream, write } = port.startsWith('tcp:') ? openTcp(port) : openTty(port);
    stream.on('data', bytes).on('error', gone).on('close', gone).on('end', gone);
    this.#write = write;
    this.#close = () => stream.destroy();
  }

  send<N extends HostMessageName>(name: N, message: MessageOf[N], tag: number): void {
    this.#write(this.#encoder.encode(name, message, tag));
  }

  /** Waits until a frame comes that passes. */
  async until(
    passes: (frame: HeardFrame) => boolean,
    what: string,
    patienceMs = PATIENCE_MS,
  ): Promise<HeardFrame> {
    let looked = 0;
    let found: HeardFrame | undefined;
    await this.#wait(
      () => {
        while (looked < this.heard.length && found === undefined) {
          const frame = this.heard[looked++]!;
          if (passes(frame)) found = frame;
        }
        return found !== undefined;
      },
      what,
      patienceMs,
    );
    return found!;
  }

  untilClosed(): Promise<void> {
    return this.#wait(() => this.closed, 'the port to close');
  }

  /**
   * Asks who is there until an answer comes: the first may be lost in a buffer that is full of what
   * was said before this host came. @returns the identity's fields
   */
  async handshake(tag: number): Promise<Record<string, number | string>> {
    const nonce = tag + 1000;
    const ask = () => {
      this.#write(Uint8Array.of(0));
      this.send('identify', { nonce, protocol: 1, newTag: tag }, tag);
    };
    const again = setInterval(ask, ASK_AGAIN_MS);
    ask();
    try {
      const frame = await this.until(
        ({ name, message }) => name === 'identity' && message.nonce === nonce,
        'identity',
      );
      return frame.message;
    } finally {
      clearInterval(again);
    }
  }

  close(): void {
    this.#close();
  }

  #wait(done: () => boolean, what: string, patienceMs = PATIENCE_MS): Promise<void> {
    return new Promise((resolve, reject) => {
      const late = setTimeout(() => reject(new Error(`waited too long for ${what}`)), patienceMs);
      this.#wake = () => {
        if (!done()) return;
        clearTimeout(late);
        this.#wake = () => {};
        resolve();
      };
      this.#wake();
    });
  }
}

interface Opened {
  readonly stream: net.Socket;
  readonly write: (bytes: Uint8Array) => void;
}

function openTcp(port: string): Opened {
  const { hostname, port: number } = new URL(port);
  const stream = net.connect({ host: hostname, port: Number(number), noDelay: true });
  return { stream, write: (bytes) => stream.write(bytes.slice()) };
}

function openTty(path: string): Opened {
  const { O_RDWR, O_NOCTTY, O_NONBLOCK } = fs.constants;
  const fd = fs.openSync(path, O_RDWR | O_NOCTTY | O_NONBLOCK);
  return { stream: new tty.ReadStream(fd), write: (bytes) => fs.writeSync(fd, bytes) };
}
