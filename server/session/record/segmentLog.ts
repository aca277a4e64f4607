import path from 'node:path';
import type { RecordFile, RecordFiles } from './recordFile.js';

/**
 * What befell the recording: the disk is full; a write or a sync failed; messages were lost for want
 * of memory to hold them; all that was held has been written after all.
 */
export type TroubleKind = 'full' | 'io' | 'sync' | 'lost' | 'recovered';
export type OnTrouble = (kind: TroubleKind, error: Error) => void;

export interface SegmentLogOptions {
  readonly folder: string;
  /** The number of the first file to write. */
  readonly segment: number;
  readonly files: RecordFiles;
  /** False for a rehearsal: nothing is synced, nothing is kept once written. */
  readonly sync: boolean;
  /** The first bytes of a file. */
  readonly opening: (segment: number, reason: string) => Uint8Array;
  readonly onTrouble: OnTrouble;
}

/** How often what was written is synced, and a failed write tried again. */
const SYNC_MS = 1000;
const RETRY_MS = 1000;
/** After syncs that failed one after another, the next waits longer, up to this. */
const SYNC_MOST_MS = 60_000;
/** Held for a disk that takes nothing: above 20 minutes of a live session at 1 kHz. */
const HELD_MOST = 16 << 20;

/** `record.mcap`, `record-2.mcap`, ... */
export function segmentName(segment: number): string {
  return segment === 1 ? 'record.mcap' : `record-${segment}.mcap`;
}

/**
 * Appends chunks to the files of a record, and never throws.
 *
 * What has been written but not yet synced is held in memory: after a failed sync the kernel may have
 * dropped it (https://www.usenix.org/conference/atc20/presentation/rebello), so it is written again,
 * to a new file. A write that fails leaves its chunk held, and is tried again each second.
 */
export class SegmentLog {
  /** Bytes in all files. */
  bytes = 0;
  /** Chunks dropped because too much was held already. */
  lostChunks = 0;
  state: 'writing' | 'failed' | 'closed' = 'writing';
  reason = '';
  segment: number;
  readonly #options: SegmentLogOptions;
  #file: RecordFile | undefined;
  #fileBytes = 0;
  #held = new Uint8Array(1 << 16);
  /** Of the bytes held: the end of those written, and of all. */
  #written = 0;
  #end = 0;
  #retryAt = 0;
  #syncAt: number;
  #syncing = false;
  #syncBeganAt = 0;
  #syncFailures = 0;

  /** Creates the first file; this alone throws, before a session begins. */
  constructor(options: SegmentLogOptions, now: number) {
    this.#options = options;
    this.segment = options.segment;
    this.#syncAt = now + SYNC_MS;
    this.#open('begun');
  }

  /** How long the disk has been at a sync that has not come back, milliseconds. */
  syncingMs(now: number): number {
    return this.#syncing ? now - this.#syncBeganAt : 0;
  }

  /** Adds one whole chunk, written at once if the disk takes it. */
  append(chunk: Uint8Array, now: number): void {
    const end = this.#end + chunk.length;
    // Once one chunk is lost all are, until the disk recovers: what is held stays in one piece.
    if (this.state === 'failed' && (this.lostChunks > 0 || end > HELD_MOST)) {
      if (this.lostChunks++ === 0)
        this.#options.onTrouble('lost', new Error(`${this.#end} bytes are held already`));
      this.poll(now);
      return;
    }
    if (end > this.#held.length) {
      const held = new Uint8Array(Math.max(end, this.#held.length * 2));
      held.set(this.#held.subarray(0, this.#end));
      this.#held = held;
    }
    this.#held.set(chunk, this.#end);
    this.#end = end;
    this.poll(now);
  }

  /** Writes what waits, and begins a sync when one is due. */
  poll(now: number): void {
    if (this.state === 'closed') return;
    if (this.#written < this.#end && (this.state === 'writing' || now >= this.#retryAt))
      this.#writeHeld(now);
    if (this.#options.sync && now >= this.#syncAt && !this.#syncing && this.#written > 0)
      this.#beginSync(now);
  }

  /** Writes and syncs all that is left, and closes. False: some of it could not be written. */
  close(lastChunk: Uint8Array, closing: Uint8Array, now: number): boolean {
    if (this.state === 'closed') return true;
    this.#retryAt = 0;
    this.append(lastChunk, now);
    const file = this.#file;
    const whole = this.#written === this.#end && file !== undefined;
    try {
      if (whole) {
        this.#writeAll(file, closing, 0, closing.length);
        if (this.#options.sync) file.syncNow();
      }
    } catch (error) {
      this.#fail(error as Error, now);
    }
    const failed = !whole || this.state === 'failed';
    this.#closeFile();
    this.state = 'closed';
    return !failed;
  }

  #open(reason: string): void {
    const { files, folder, opening } = this.#options;
    const name = path.join(folder, segmentName(this.segment));
    const file = files.create(name);
    this.#fileBytes = 0;
    try {
      const bytes = opening(this.segment, reason);
      this.#writeAll(file, bytes, 0, bytes.length);
    } catch (error) {
      try {
        file.close();
        files.remove(name);
      } catch {}
      throw error;
    }
    this.#file = file;
  }

  #writeHeld(now: number): void {
    try {
      if (this.#file === undefined) this.#open(this.reason);
      const file = this.#file!;
      const before = this.#fileBytes;
      try {
        this.#writeAll(file, this.#held, this.#written, this.#end);
      } catch (error) {
        this.#undo(file, before);
        throw error;
      }
      this.#written = this.#end;
      if (!this.#options.sync) this.#written = this.#end = 0;
      if (this.state === 'failed') this.#recover();
    } catch (error) {
      this.#fail(error as Error, now);
    }
  }

  #writeAll(file: RecordFile, bytes: Uint8Array, from: number, to: number): void {
    for (let at = from; at < to; ) {
      const n = file.write(bytes, at, to - at);
      at += n;
      this.#fileBytes += n;
      this.bytes += n;
    }
  }

  /** A half-written chunk in mid-file would hide what follows from a general reader. */
  #undo(file: RecordFile, length: number): void {
    try {
      file.truncate(length);
      this.bytes -= this.#fileBytes - length;
      this.#fileBytes = length;
    } catch {
      this.#leave();
    }
  }

  #fail(error: Error, now: number): void {
    const code = (error as NodeJS.ErrnoException).code;
    const full = code === 'ENOSPC' || code === 'EDQUOT';
    const first = this.state !== 'failed';
    this.state = 'failed';
    this.reason = error.message;
    this.#retryAt = now + RETRY_MS;
    // A file that failed otherwise than for space is not to be trusted with more.
    if (!full && this.#file !== undefined) this.#leave();
    if (first) this.#options.onTrouble(full ? 'full' : 'io', error);
  }

  #recover(): void {
    const message =
      this.lostChunks > 0 ? `after ${this.lostChunks} chunks were lost` : 'nothing was lost';
    this.state = 'writing';
    this.reason = '';
    this.lostChunks = 0;
    this.#options.onTrouble('recovered', new Error(message));
  }

  /** Gives the file up: all that it may not have kept goes to the next one. */
  #leave(): void {
    this.#closeFile();
    this.segment++;
    this.#written = 0;
  }

  #closeFile(): void {
    try {
      this.#file?.close();
    } catch {
      // Nothing more can be done for this file, and the next one is written all the same.
    }
    this.#file = undefined;
  }

  #beginSync(now: number): void {
    const file = this.#file;
    if (file === undefined) return;
    const upTo = this.#written;
    this.#syncing = true;
    this.#syncBeganAt = now;
    this.#syncAt = now + SYNC_MS;
    file.sync((error) => {
      this.#syncing = false;
      if (this.#file !== file) return;
      if (error === null) {
        this.#syncFailures = 0;
        this.#held.copyWithin(0, upTo, this.#end);
        this.#written -= upTo;
        this.#end -= upTo;
        return;
      }
      this.#syncFailures++;
      this.#syncAt = now + Math.min(SYNC_MOST_MS, SYNC_MS * 2 ** this.#syncFailures);
      this.reason = `a sync failed: ${error.message}`;
      this.#leave();
      this.#options.onTrouble('sync', error);
      this.#writeHeld(now);
    });
  }
}
