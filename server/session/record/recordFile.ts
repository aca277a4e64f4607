import fs from 'node:fs';
import path from 'node:path';
import { syncFolder } from '../writeFileWhole.js';

/** One file being written at its end; a test can put one here that fails as a disk does. */
export interface RecordFile {
  /** Appends `length` bytes from `from`; may write fewer. Throws the system's error. */
  write(bytes: Uint8Array, from: number, length: number): number;
  /** Cuts off what a failed write left behind. */
  truncate(length: number): void;
  /** Sends what was written to the disk, without holding up the caller. */
  sync(done: (error: Error | null) => void): void;
  /** The same at once: at the end of a session. */
  syncNow(): void;
  close(): void;
}

export interface RecordFiles {
  /** Creates a file; throws `EEXIST` rather than touch one that is there. */
  create(path: string): RecordFile;
  remove(path: string): void;
}

export const diskFiles: RecordFiles = {
  create(file) {
    // Append mode: a write after a truncation goes to the new end.
    const fd = fs.openSync(file, 'ax', 0o644);
    syncFolder(path.dirname(file));
    return {
      write: (bytes, from, length) => fs.writeSync(fd, bytes, from, length),
      truncate: (length) => fs.ftruncateSync(fd, length),
      sync: (done) => fs.fdatasync(fd, done),
      syncNow: () => fs.fdatasyncSync(fd),
      close: () => fs.closeSync(fd),
    };
  },
  remove: (file) => fs.rmSync(file, { force: true }),
};
