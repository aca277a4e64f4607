import type { LapwingError } from '../errors/codes.js';

/** `serial` is a real device or a pseudo-terminal; only there may real stimulus outputs be driven. */
export type Transport = 'serial' | 'tcp' | 'in process';

export interface PortListener {
  /** `bytes` is reused by the port: take what is needed before returning. */
  bytes(bytes: Uint8Array): void;
  /** The port is gone by itself; told once, and never after `close()`. */
  closed(why: LapwingError): void;
}

/**
 * An open way to move bytes. One object is one connection: once closed it stays closed, so that a
 * write which waited can never come out of the next connection.
 */
export interface BytePort {
  /** As shown to the user: a device path or `tcp://host:port`. */
  readonly name: string;
  readonly transport: Transport;
  /** Begins delivery; called once, before anything else. */
  listen(listener: PortListener): void;
  /**
   * Writes at once, without waiting. False: not every byte was taken, and the connection is over;
   * the caller closes it.
   */
  write(bytes: Uint8Array): boolean;
  /** Drops what is not yet sent and lets go of the device; resolves once it can be opened anew. */
  close(): Promise<void>;
}

/** Opens a fresh port for one connection, or says why not with a LapwingError. */
export type OpenPort = () => Promise<BytePort>;
