import fs from 'node:fs/promises';
import path from 'node:path';
import { setTimeout } from 'node:timers/promises';
import { LapwingError } from '../../errors/codes.js';
import { recordingProcess } from '../../session/record/recordLock.js';
import type { SessionRow } from './recordsMessages.js';
import { badRow, rowOf } from './sessionRow.js';

/** A folder is looked through this often at most; what is asked in between is told the same. */
const FRESH_MS = 1_000;
/** Who asks waits so long for a look at a folder that was looked at before. */
const WAIT_MS = 150;
/** Files looked at together: libuv has four threads, and others need them too. */
const AT_ONCE = 3;
/** A description has some kilobytes. */
const MOST_BYTES = 1 << 20;

/** What was read, and by what it is known to be unchanged. */
interface Known {
  readonly stamp: string;
  /** Undefined: no session's folder. */
  readonly row: SessionRow | undefined;
}

/**
 * The sessions in a records folder. Descriptions are read once and again when their files change, so
 * that a folder of many thousands costs one look at each. Names that are asked for are looked up
 * here: no name from a request becomes a path.
 */
export class SessionIndex {
  #known = new Map<string, Known>();
  #rows: readonly SessionRow[] = [];
  #lookedMs = Number.NEGATIVE_INFINITY;
  #looked = false;
  #looking: Promise<void> | undefined;

  /** @param folder absolute; it need not exist yet */
  constructor(readonly folder: string) {}

  /**
   * All sessions as they are, or were a second ago; of a folder so large that looking it through takes
   * longer than anybody wants to wait, as they were the last time.
   */
  async rows(): Promise<readonly SessionRow[]> {
    if (performance.now() - this.#lookedMs > FRESH_MS) {
      const look = this.look();
      await (this.#looked ? Promise.race([look, setTimeout(WAIT_MS)]) : look);
    }
    return this.#rows;
  }

  /**
   * One session as it is now.
   * @throws LapwingError WEB_SESSION_UNKNOWN
   */
  async find(name: string): Promise<{ readonly row: SessionRow; readonly folder: string }> {
    if (!this.#known.has(name)) await this.look();
    // Only a name that the folder itself was seen to hold becomes part of a path.
    const { row } = this.#known.has(name) ? await this.#lookAt(name) : {};
    if (row) return { row: this.#now(row), folder: path.join(this.folder, name) };
    throw new LapwingError('webSessionUnknown', `There is no session ${JSON.stringify(name)}.`);
  }

  /** Looks the folder through now; who asks meanwhile waits for the same look. */
  look(): Promise<void> {
    this.#looking ??= this.#look().finally(() => {
      this.#looking = undefined;
      this.#looked = true;
      this.#lookedMs = performance.now();
    });
    return this.#looking;
  }

  async #look(): Promise<void> {
    const entries = await fs.readdir(this.folder, { withFileTypes: true }).catch(() => []);
    // A link is no folder here: it could lead anywhere.
    const folders = entries.filter((entry) => entry.isDirectory() && !entry.name.startsWith('.'));
    const known = new Map<string, Known>();
    let next = 0;
    const lookOn = async (): Promise<void> => {
      for (let entry = folders[next++]; entry; entry = folders[next++]) {
        known.set(entry.name, await this.#lookAt(entry.name));
      }
    };
    await Promise.all(Array.from({ length: AT_ONCE }, lookOn));
    this.#known = known;
    this.#rows = [...known.values()].flatMap(({ row }) => (row ? [this.#now(row)] : []));
  }

  /** Whether a session that was not ended is being recorded can change with no file changing. */
  #now(row: SessionRow): SessionRow {
    if (row.ended !== null) return row;
    const folder = path.join(this.folder, row.name);
    const recording = recordingProcess(folder) !== undefined;
    return recording === row.recording ? row : { ...row, recording };
  }

  async #lookAt(name: string): Promise<Known> {
    const folder = path.join(this.folder, name);
    const file = path.join(folder, 'session.json');
    const before = this.#known.get(name);
    const stat = await fs.stat(file).catch(() => undefined);
    if (!stat) return this.#without(name, folder);
    const stamp = `${stat.mtimeMs} ${stat.size} ${stat.ino}`;
    if (before?.stamp === stamp) return before;
    try {
      if (stat.size > MOST_BYTES) throw new Error(`session.json has ${stat.size} bytes`);
      const row = rowOf(name, JSON.parse(await fs.readFile(file, 'utf8')));
      return { stamp, row };
    } catch (error) {
      return { stamp, row: badRow(name, (error as Error).message) };
    }
  }

  /** A record without a description is a session all the same; a folder without either is not. */
  async #without(name: string, folder: string): Promise<Known> {
    const files = await fs.readdir(folder).catch(() => []);
    const recorded = files.some((file) => /^record.*\.mcap$/.test(file));
    return { stamp: '', row: recorded ? badRow(name, 'session.json is missing') : undefined };
  }
}
