import fs from 'node:fs';
import { LapwingError } from '../errors/codes.js';
import { nearestNames } from './nearestNames.js';
import { serialPaths } from './serialPaths.js';

/**
 * What a failed opening means to the user. The binding gives only the C library's English text,
 * so the file itself is asked first.
 */
export function openError(path: string, error: Error): LapwingError {
  const options = { cause: error };
  if (process.platform !== 'win32') {
    if (!fs.existsSync(path)) return missingError(path, options);
    if (!canOpen(path)) {
      return new LapwingError('linkPermission', permissionText(path), options);
    }
  }
  const text = error.message;
  if (/no such|not found|cannot find/i.test(text)) return missingError(path, options);
  if (/lock|busy|access denied/i.test(text)) {
    return new LapwingError('linkPortBusy', `${path} is open in another program.`, options);
  }
  if (/permission/i.test(text)) {
    return new LapwingError('linkPermission', permissionText(path), options);
  }
  return new LapwingError('linkOpenFailed', `${path}: ${text.replace(/^Error:? */, '')}.`, options);
}

function missingError(path: string, options: ErrorOptions): LapwingError {
  const near = nearestNames(path, serialPaths());
  const there =
    near.length === 0 ? 'no serial device is connected' : `connected now: ${near.join(', ')}`;
  return new LapwingError('linkPortMissing', `There is no ${path}; ${there}.`, options);
}

/** Whether this user may read and write `path`. */
export function canOpen(path: string): boolean {
  try {
    fs.accessSync(path, fs.constants.R_OK | fs.constants.W_OK);
    return true;
  } catch {
    return false;
  }
}

/** Names the group that owns a device, which on Debian and Ubuntu is `dialout`. */
export function permissionText(path: string): string {
  return `This user may not open ${path}, which belongs to the group ${groupOf(path)}.`;
}

/** The name of the group that owns `path`; its number where it has none. */
export function groupOf(path: string, groupFile = '/etc/group'): string {
  try {
    const { gid } = fs.statSync(path);
    const line = fs
      .readFileSync(groupFile, 'utf8')
      .split('\n')
      .find((each) => each.split(':')[2] === String(gid));
    return line?.split(':')[0] ?? String(gid);
  } catch {
    return 'dialout';
  }
}
