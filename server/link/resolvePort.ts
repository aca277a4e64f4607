import fs from 'node:fs';
import { LapwingError } from '../errors/codes.js';
import type { OpenPort } from './bytePort.js';
import { realPath, stableNames } from './serialPaths.js';
import { openSerial, type SerialOptions } from './serialPort.js';
import { openTcp } from './tcpPort.js';

export type PortAddress =
  | { readonly kind: 'serial'; readonly path: string }
  | { readonly kind: 'tcp'; readonly host: string; readonly port: number };

/** Reads a port as a rig file or the command line gives it: a path, or `tcp://host:port`. */
export function parseAddress(text: string): PortAddress {
  const address = text.trim();
  if (/^[a-z]+:\/\//i.test(address)) return parseTcp(address);
  if (address === '') throw new LapwingError('linkBadAddress', 'The port is empty.');
  return { kind: 'serial', path: address };
}

function parseTcp(address: string): PortAddress {
  const found = /^tcp:\/\/(?:\[([0-9a-f:.]+)\]|([^\s:/[\]]+)):(\d{1,5})\/?$/i.exec(address);
  const port = Number(found?.[3]);
  if (found === null || port < 1 || port > 65_535) {
    const expected = 'expected tcp://host:port, such as tcp://127.0.0.1:7001';
    throw new LapwingError('linkBadAddress', `"${address}" is no address; ${expected}.`);
  }
  return { kind: 'tcp', host: (found[1] ?? found[2])!, port };
}

export interface OpenerOptions extends SerialOptions {
  readonly devRoot?: string;
}

/**
 * Opens the port at `address` anew for each connection, finding the device again each time: a board
 * that comes back under another name is followed by its stable one.
 */
export function portOpener(address: string, options: OpenerOptions): OpenPort {
  const target = parseAddress(address);
  if (target.kind === 'tcp') return () => openTcp(target.host, target.port);
  let stable: string | undefined;
  return async () => {
    const known = stable !== undefined && fs.existsSync(stable) ? stable : target.path;
    const port = await openSerial(known, options);
    stable ??= stableName(known, options.devRoot);
    return port;
  };
}

/** The path below /dev/serial/by-id that leads to this device; undefined where there is none. */
export function stableName(path: string, devRoot?: string): string | undefined {
  const device = realPath(path);
  for (const [link, target] of stableNames(devRoot)) if (target === device) return link;
  return undefined;
}
