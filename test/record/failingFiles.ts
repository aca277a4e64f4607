import {
  diskFiles,
  type RecordFile,
  type RecordFiles,
} from '../../server/session/record/recordFile.js';

type Failing = 'write' | 'truncate' | 'sync' | 'create';

/** An error as the system makes it. */
export function systemError(code: string): Error {
  return Object.assign(new Error(`${code}: made to fail`), { code });
}

/**
 * Files on the real disk that fail when told to, and whose syncs end when told to: `finishSyncs`
 * stands for the time the disk takes.
 */
export class FailingFiles implements RecordFiles {
  readonly #failing = new Map<Failing, Error>();
  readonly #syncs: (() => void)[] = [];
  /** At most this many bytes are taken by one write. */
  mostBytes = Number.POSITIVE_INFINITY;
  /** Written before the next failing write throws, as when the last block of a disk fills. */
  partBytes = 0;
  writes = 0;
  syncs = 0;
  created = 0;

  fail(what: Failing, code: string): void {
    this.#failing.set(what, systemError(code));
  }
  heal(): void {
    this.#failing.clear();
  }
  /** Lets every sync begun so far end, as it would with what fails now. */
  finishSyncs(): void {
    for (const finish of this.#syncs.splice(0)) finish();
  }

  create(path: string): RecordFile {
    this.#check('create');
    this.created++;
    const file = diskFiles.create(path);
    return {
      write: (bytes, from, length) => {
        this.writes++;
        if (this.#failing.has('write')) {
          if (this.partBytes > 0) {
            const part = Math.min(this.partBytes, length);
            this.partBytes -= part;
            return file.write(bytes, from, part);
          }
          this.#check('write');
        }
        return file.write(bytes, from, Math.min(length, this.mostBytes));
      },
      truncate: (length) => {
        this.#check('truncate');
        file.truncate(length);
      },
      sync: (done) => {
        this.syncs++;
        this.#syncs.push(() => done(this.#failing.get('sync') ?? null));
      },
      syncNow: () => {
        this.#check('sync');
        file.syncNow();
      },
      close: () => file.close(),
    };
  }

  remove(path: string): void {
    diskFiles.remove(path);
  }

  #check(what: Failing): void {
    const error = this.#failing.get(what);
    if (error !== undefined) throw error;
  }
}
