import { execFile } from 'node:child_process';
import { existsSync, readFileSync } from 'node:fs';
import { promisify } from 'node:util';

/** What a check of the computer found. */
export interface Finding {
  readonly result: 'passed' | 'failed' | 'not possible';
  readonly detail: string;
  readonly remedy: string;
}

export const passed = (detail: string): Finding => ({ result: 'passed', detail, remedy: '' });
export const failed = (detail: string, remedy: string): Finding => ({
  ...{ result: 'failed', detail, remedy },
});
export const notPossible = (detail: string, remedy: string): Finding => ({
  ...{ result: 'not possible', detail, remedy },
});

/** What the computer is asked; another one in tests. */
export interface Computer {
  readonly platform: NodeJS.Platform;
  now(): Date;
  /** A file's text; undefined where it is not there. */
  read(path: string): string | undefined;
  /** What a command printed; undefined where it cannot be run. */
  run(command: string, ...args: string[]): Promise<string | undefined>;
}

const COMMAND_MS = 3_000;

export const thisComputer: Computer = {
  platform: process.platform,
  now: () => new Date(),
  read: (path) => (existsSync(path) ? readFileSync(path, 'utf8') : undefined),
  run: async (command, ...args) => {
    try {
      const run = promisify(execFile);
      return (await run(command, args, { timeout: COMMAND_MS })).stdout;
    } catch (error) {
      // `systemctl is-enabled` says `masked` and leaves with 1.
      const { stdout } = error as { stdout?: unknown };
      return typeof stdout === 'string' && stdout !== '' ? stdout : undefined;
    }
  },
};

const SLEEP_REMEDY: Partial<Record<NodeJS.Platform, string>> = {
  darwin:
    'In System Settings, Energy: never sleep on power; or run Lapwing under `caffeinate -dims`.',
  win32: 'In Settings, System, Power: never sleep while plugged in, and no hybrid sleep.',
};
const LINUX_REMEDY =
  'Run Lapwing under `systemd-inhibit --what=sleep:idle`, or `sudo systemctl mask sleep.target suspend.target hibernate.target`; on a laptop keep the lid open.';

/** Whether the machine may go to sleep under a session. */
export async function willNotSleep(computer: Computer): Promise<Finding> {
  if (computer.platform !== 'linux') {
    const remedy = SLEEP_REMEDY[computer.platform] ?? 'Switch sleep off in the power settings.';
    return notPossible('Lapwing cannot tell on this system.', remedy);
  }
  // https://docs.kernel.org/admin-guide/pm/sleep-states.html: empty where the kernel cannot suspend.
  const states = computer.read('/sys/power/state');
  if (states === undefined || states.trim() === '') return passed('This system cannot suspend.');
  const targets = ['sleep.target', 'suspend.target'];
  const enabled = await computer.run('systemctl', 'is-enabled', ...targets);
  const words = enabled?.trim().split('\n') ?? [];
  if (words.length === targets.length && words.every((word) => word === 'masked')) {
    return passed('Sleep is masked.');
  }
  const list = await computer.run('systemd-inhibit', '--list', '--no-legend');
  const blocked = (list ?? '').split('\n').some((line) => /\bsleep\b.*\bblock\b/.test(line));
  if (blocked) return passed('A program holds sleep off.');
  if (enabled === undefined && list === undefined) {
    return notPossible('Nothing here can be asked whether it will sleep.', LINUX_REMEDY);
  }
  return failed('Nothing keeps this computer from sleeping.', LINUX_REMEDY);
}

/** Clocks that were never set stand before this. */
const EARLIEST = Date.parse('2024-01-01T00:00:00Z');
const CLOCK_REMEDY =
  'Set the clock and let it be kept: `sudo timedatectl set-ntp true`. Sessions are named by it, and the water of a day is counted by it.';

/**
 * Whether the computer's clock can be believed.
 * @param newest the newest time that a file of this rig carries; it must lie behind
 */
export async function clockIsSane(computer: Computer, newest: Date | undefined): Promise<Finding> {
  const now = computer.now();
  if (now.getTime() < EARLIEST) return failed(`The clock says ${now.toISOString()}.`, CLOCK_REMEDY);
  if (newest !== undefined && newest.getTime() > now.getTime() + 60_000) {
    return failed(
      `The clock says ${now.toISOString()}, and a file of this rig was made at ${newest.toISOString()}.`,
      CLOCK_REMEDY,
    );
  }
  if (computer.platform !== 'linux') return passed(`The clock says ${now.toISOString()}.`);
  const kept = await computer.run('timedatectl', 'show', '--property=NTPSynchronized', '--value');
  if (kept?.trim() === 'no') return failed('The clock is not kept by a time server.', CLOCK_REMEDY);
  const how = kept?.trim() === 'yes' ? 'kept by a time server' : 'not known to be kept';
  return passed(`The clock says ${now.toISOString()}, ${how}.`);
}

/** An hour's record takes some tens of megabytes: room for two long sessions, their reports too. */
export const LEAST_SESSION_BYTES = 200_000_000;

/** Whether the disk has room for two sessions like the largest so far. */
export function diskHasRoom(freeBytes: number, largestBytes: number): Finding {
  const wanted = 2 * Math.max(LEAST_SESSION_BYTES, largestBytes);
  const gb = (bytes: number) => `${(bytes / 1e9).toFixed(1)} GB`;
  const detail = `${gb(freeBytes)} free; two sessions take up to ${gb(wanted)}.`;
  if (freeBytes >= wanted) return passed(detail);
  return failed(detail, 'Move old sessions away, checked, or record on another disk.');
}
