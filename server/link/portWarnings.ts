import fs from 'node:fs';
import path from 'node:path';
import { canOpen, permissionText } from './openError.js';
import { list, realPath } from './serialPaths.js';

/** Where the kernel shows its devices and programs; tests give folders of their own. */
export interface SystemRoots {
  readonly dev: string;
  readonly sys: string;
  readonly proc: string;
  readonly canOpen: (path: string) => boolean;
}
export const systemRoots: SystemRoots = { dev: '/dev', sys: '/sys', proc: '/proc', canOpen };

export interface PortWarning {
  readonly text: string;
  readonly remedy: string;
}

/** An FTDI adapter holds short frames back this long; its driver begins with 16 ms. */
const LATENCY_MOST_MS = 1;

/**
 * Programs that open new serial devices to see what they are, and talk to them.
 * (common practice, no source)
 */
const GRABBERS: Readonly<Record<string, string>> = {
  ModemManager:
    'Keep it off this board: a udev rule with ENV{ID_MM_DEVICE_IGNORE}="1", or ' +
    '`sudo systemctl disable --now ModemManager` on a machine without a modem.',
  brltty:
    'Remove it where no braille display is used: `sudo apt-get remove brltty`; it takes adapters ' +
    'with a CH340 chip for displays.',
};

/** What may go wrong with this device, before it does. Linux only; [] elsewhere. */
export function portWarnings(device: string, roots: SystemRoots = systemRoots): PortWarning[] {
  const real = realPath(device) ?? device;
  return [...latencyWarning(real, roots), ...permissionWarning(real, roots)];
}

function latencyWarning(device: string, roots: SystemRoots): PortWarning[] {
  const name = path.basename(device);
  const file = path.join(roots.sys, 'bus/usb-serial/devices', name, 'latency_timer');
  const latencyMs = Number(readLine(file) ?? 0);
  if (!(latencyMs > LATENCY_MOST_MS)) return [];
  return [
    {
      text: `The FTDI adapter holds short frames back for ${latencyMs} ms (latency_timer).`,
      remedy:
        `\`echo 1 | sudo tee ${file}\` until it is unplugged; for good, a udev rule: ` +
        'ACTION=="add", SUBSYSTEM=="usb-serial", DRIVER=="ftdi_sio", ATTR{latency_timer}="1".',
    },
  ];
}

function permissionWarning(device: string, roots: SystemRoots): PortWarning[] {
  if (!fs.existsSync(device) || roots.canOpen(device)) return [];
  return [
    {
      text: permissionText(device),
      remedy:
        'Join the group, `sudo usermod -aG dialout $USER` on Debian and Ubuntu, then log out and ' +
        'in again.',
    },
  ];
}

/** Programs running now that are known to open serial devices unasked. */
export function grabberWarnings(roots: SystemRoots = systemRoots): PortWarning[] {
  const running = new Set(
    list(roots.proc)
      .filter((name) => /^\d+$/.test(name))
      .map((pid) => readLine(path.join(roots.proc, pid, 'comm'))),
  );
  return Object.entries(GRABBERS)
    .filter(([program]) => running.has(program))
    .map(([program, remedy]) => ({
      text: `${program} is running; it opens new serial devices and may write to a board.`,
      remedy,
    }));
}

/** The first line of a small file; undefined where it cannot be read. */
export function readLine(file: string): string | undefined {
  try {
    return fs.readFileSync(file, 'utf8').split('\n')[0]!.trim();
  } catch {
    return undefined;
  }
}
