import fs from 'node:fs';
import path from 'node:path';

/**
 * Replaces a file's content so that whoever looks, after a crash or a power cut too, finds the old
 * content or the new, whole: a temporary name beside it, fsync, rename, fsync of the folder.
 * @param mode who may read it: 0o600 for what is nobody else's business
 */
export function writeFileWhole(file: string, content: string | Uint8Array, mode = 0o644): void {
  const temporary = `${file}.${process.pid}.new`;
  try {
    const fd = fs.openSync(temporary, 'w', mode);
    try {
      fs.writeFileSync(fd, content);
      fs.fsyncSync(fd);
    } finally {
      fs.closeSync(fd);
    }
    fs.renameSync(temporary, file);
  } catch (error) {
    fs.rmSync(temporary, { force: true });
    throw error;
  }
  syncFolder(path.dirname(file));
}

/** Waits until a file that was written by its name is on the disk. */
export function syncFile(file: string): void {
  const fd = fs.openSync(file, 'r+');
  try {
    fs.fsyncSync(fd);
  } finally {
    fs.closeSync(fd);
  }
}

/** Makes a new name in the folder last over a power cut; Windows has no such call and needs none. */
export function syncFolder(folder: string): void {
  if (process.platform === 'win32') return;
  const fd = fs.openSync(folder, 'r');
  try {
    fs.fsyncSync(fd);
  } finally {
    fs.closeSync(fd);
  }
}
