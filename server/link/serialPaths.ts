import fs from 'node:fs';
import path from 'node:path';

/** Names of devices that a board's port can have on Linux and macOS. */
const DEVICE = /^(ttyUSB|ttyACM|ttyAMA|ttyTHS|rfcomm|cu\.(usb|wch|SLAB))/;

/** Paths at which a board could be now, the stable ones first; [] on Windows. */
export function serialPaths(devRoot = '/dev'): string[] {
  const stable = stableNames(devRoot);
  const plain = list(devRoot)
    .filter((name) => DEVICE.test(name))
    .map((name) => path.join(devRoot, name));
  return [...stable.keys(), ...plain];
}

/** Each path below /dev/serial/by-id, and the device that it leads to now. */
export function stableNames(devRoot = '/dev'): Map<string, string> {
  const folder = path.join(devRoot, 'serial', 'by-id');
  const found = new Map<string, string>();
  for (const name of list(folder)) {
    const link = path.join(folder, name);
    const target = realPath(link);
    if (target !== undefined) found.set(link, target);
  }
  return found;
}

/** The device itself, behind every link; undefined where there is none. */
export function realPath(file: string): string | undefined {
  try {
    return fs.realpathSync(file);
  } catch {
    return undefined;
  }
}

/** The names in a folder in order; [] where it does not exist or may not be read. */
export function list(folder: string): string[] {
  try {
    return fs.readdirSync(folder).sort();
  } catch {
    return [];
  }
}
