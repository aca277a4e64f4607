import { createHash, randomBytes, randomUUID } from 'node:crypto';
import { chmodSync, existsSync, mkdirSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import { connect, type Server } from 'node:net';
import { tmpdir, userInfo } from 'node:os';
import { join } from 'node:path';
import { LapwingError } from '../errors/codes.js';

/** Where the loop of one rig is reached, and what proves the right to. */
export interface RigAddress {
  /** A Unix socket's path, or a named pipe on Windows. */
  readonly socketPath: string;
  readonly tokenFile: string;
  /** The session that runs, so that a restarted loop finds it. */
  readonly currentFile: string;
  /** Where the simulated rig takes orders for its hands; nobody listens there on a real one. */
  readonly handsPath: string;
}

/**
 * The address of a rig, from its rig file's name: the same for every command of the same user.
 * The folder is the user's own (`XDG_RUNTIME_DIR`, else below the temporary folder, mode 0700).
 */
export function rigAddress(rigName: string, folder = runtimeFolder()): RigAddress {
  // A socket's path may not pass about 100 bytes, so the name goes in as a hash.
  const key = createHash('sha256').update(rigName).digest('hex').slice(0, 12);
  const base = join(folder, `rig-${key}`);
  const pipe = (name: string) =>
    process.platform === 'win32' ? `\\\\.\\pipe\\lapwing-${key}${name}` : `${base}${name}.sock`;
  return {
    ...{ socketPath: pipe(''), tokenFile: `${base}.token`, currentFile: `${base}.json` },
    handsPath: pipe('-hands'),
  };
}

function runtimeFolder(): string {
  const own = process.env.LAPWING_RUNTIME ?? process.env.XDG_RUNTIME_DIR;
  const folder = own ? join(own, 'lapwing') : join(tmpdir(), `lapwing-${userInfo().uid}`);
  mkdirSync(folder, { recursive: true, mode: 0o700 });
  if (process.platform !== 'win32') chmodSync(folder, 0o700);
  return folder;
}

/**
 * Listens at the rig's address: holding the socket is holding the rig. A socket left by a loop that
 * was killed is taken over; a living loop is left alone.
 * @throws LapwingError LOOP_RIG_TAKEN when another loop answers there
 */
export async function takeRig(server: Server, address: RigAddress): Promise<void> {
  for (let attempt = 0; attempt < 3; attempt++) {
    try {
      await listen(server, address.socketPath);
      writeFileSync(address.tokenFile, randomBytes(24).toString('base64url'), { mode: 0o600 });
      return;
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code !== 'EADDRINUSE') throw error;
      if (await answers(address.socketPath)) break;
      setAside(address.socketPath);
    }
  }
  throw new LapwingError('loopRigTaken', `A loop answers at ${address.socketPath}.`);
}

function listen(server: Server, path: string): Promise<void> {
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(path, () => {
      server.off('error', reject);
      resolve();
    });
  });
}

function answers(path: string): Promise<boolean> {
  return new Promise((resolve) => {
    const probe = connect(path);
    const say = (yes: boolean) => {
      probe.destroy();
      resolve(yes);
    };
    probe.once('connect', () => say(true));
    probe.once('error', () => say(false));
  });
}

/**
 * Removes a socket that nobody answers. Renamed first: of two loops that find it dead at once only
 * one can move it, and the other cannot remove what the first has begun to listen on.
 */
function setAside(path: string): void {
  const aside = `${path}.${randomUUID()}`;
  try {
    renameSync(path, aside);
  } catch {
    return;
  }
  rmSync(aside, { force: true });
}

/** Removes the token; the socket goes with its server. */
export function leaveRig(address: RigAddress): void {
  if (existsSync(address.tokenFile)) rmSync(address.tokenFile, { force: true });
}
