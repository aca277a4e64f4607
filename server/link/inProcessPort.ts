import { LapwingError } from '../errors/codes.js';
import type { BytePort, PortListener } from './bytePort.js';

export interface InProcessOptions {
  readonly name?: string;
  /**
   * Runs what the host wrote outside any delivery a little later, never within the write; a
   * microtask where nothing else is given.
   */
  readonly defer?: (task: () => void) => void;
}

/** The board's end of an in-process port. */
export interface InProcessBoard {
  /** Called with what the host wrote; `bytes` may be kept. */
  onBytes: (bytes: Uint8Array) => void;
  /** The host closed its end. */
  onClosed: () => void;
  /** Sends to the host at once. Nothing is copied unless a delivery is under way. */
  send(bytes: Uint8Array): void;
  /** Hands on what waits in either direction, now. */
  pump(): void;
  /** The cable is pulled: what waits is lost, and the host's end closes. */
  unplug(): void;
}

/**
 * Two ends that deliver in order and never one inside the other: what is written during a delivery
 * follows it. So a virtual-time session sees the same order as one on a wire, and neither side
 * need be re-entrant.
 */
export function inProcessPair(options: InProcessOptions = {}): {
  host: BytePort;
  board: InProcessBoard;
} {
  const name = options.name ?? 'in process';
  const defer = options.defer ?? queueMicrotask;
  const queue: { toHost: boolean; bytes: Uint8Array }[] = [];
  let listener: PortListener | undefined;
  let open = true;
  let delivering = false;
  let deferred = false;

  function deliver(toHost: boolean, bytes: Uint8Array): void {
    if (!open) return;
    if (toHost) listener?.bytes(bytes);
    else board.onBytes(bytes);
  }

  function pump(): void {
    if (delivering) return;
    delivering = true;
    try {
      for (let item = queue.shift(); item !== undefined; item = queue.shift()) {
        deliver(item.toHost, item.bytes);
      }
    } finally {
      delivering = false;
    }
  }

  function pumpLater(): void {
    if (deferred) return;
    deferred = true;
    defer(() => {
      deferred = false;
      pump();
    });
  }

  const board: InProcessBoard = {
    onBytes: () => {},
    onClosed: () => {},
    send(bytes) {
      if (!open) return;
      if (delivering || queue.length > 0) {
        queue.push({ toHost: true, bytes: bytes.slice() });
        pump();
        return;
      }
      delivering = true;
      try {
        listener?.bytes(bytes);
      } finally {
        delivering = false;
      }
      if (queue.length > 0) pump();
    },
    pump,
    unplug() {
      if (!open) return;
      open = false;
      queue.length = 0;
      listener?.closed(new LapwingError('linkUnplugged', `${name} was unplugged.`));
    },
  };

  const host: BytePort = {
    name,
    transport: 'in process',
    listen(given) {
      listener = given;
    },
    write(bytes) {
      if (!open) return false;
      queue.push({ toHost: false, bytes: bytes.slice() });
      if (!delivering) pumpLater();
      return true;
    },
    async close() {
      if (!open) return;
      open = false;
      queue.length = 0;
      board.onClosed();
    },
  };
  return { host, board };
}
