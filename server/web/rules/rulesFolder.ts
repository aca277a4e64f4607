/** The rules files that the page may open and save: those in the rig's rules folder, or below it. */
import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { LapwingError } from '../../errors/codes.js';
import { LONGEST_FILE, LONGEST_TABLE } from '../../rules/text/caps.js';
import { pathBeside } from '../../rules/text/paths.js';
import { writeFileWhole } from '../../session/writeFileWhole.js';

/** A UTF-8 file of so many characters is at most three bytes for each. */
const MOST_BYTES = 3 * LONGEST_FILE;
const MOST_TABLE_BYTES = 3 * LONGEST_TABLE;
const MOST_FILES = 500;
const DEEPEST = 4;

/** A rules file as it was read; `version` tells later whether it is still the same. */
export interface RulesText {
  readonly path: string;
  readonly text: string;
  readonly version: string;
}

/**
 * A folder that nothing leads out of. Every path is given as below the folder, with `/`.
 *
 * It reads synchronously, as the rules' checks do: the files are small and on a local disk.
 */
export class RulesFolder {
  /** @param folder absolute */
  constructor(readonly folder: string) {}

  /** The rules files there are, sorted. */
  list(): string[] {
    const found: string[] = [];
    const look = (below: string, depth: number): void => {
      let entries: fs.Dirent[];
      try {
        entries = fs.readdirSync(path.join(this.folder, below), { withFileTypes: true });
      } catch {
        return;
      }
      for (const entry of entries) {
        const name = below === '' ? entry.name : `${below}/${entry.name}`;
        if (found.length >= MOST_FILES) return;
        if (entry.isDirectory() && depth < DEEPEST && entry.name !== 'node_modules') {
          look(name, depth + 1);
        } else if (entry.isFile() && /\.ya?ml$/i.test(entry.name)) {
          found.push(name);
        }
      }
    };
    look('', 1);
    return found.sort();
  }

  /** @throws LapwingError WEB_RULES_PATH, WEB_RULES_UNWRITABLE, WEB_NOT_FOUND */
  read(name: string): RulesText {
    const full = this.#inside(name, ['.yaml', '.yml']);
    const bytes = readWhole(full, MOST_BYTES, name);
    return { path: name, text: new TextDecoder().decode(bytes), version: versionOf(bytes) };
  }

  /**
   * The full path of a rules file that there is.
   * @throws LapwingError WEB_RULES_PATH, WEB_NOT_FOUND
   */
  pathOf(name: string): string {
    const full = this.#inside(name, ['.yaml', '.yml']);
    if (fs.existsSync(full)) return full;
    throw new LapwingError('webNotFound', `There is no file ${JSON.stringify(name)}.`);
  }

  /** For what a rules file brings in: included files and tables. Throws what people can read. */
  readIncluded(name: string): Uint8Array {
    return readWhole(this.#inside(name, ['.yaml', '.yml', '.csv']), MOST_TABLE_BYTES, name);
  }

  /**
   * Puts a text in the place of a file, whole; what it replaces stays beside it as `NAME.bak`. A
   * running session has a copy of its own and is not touched.
   * @param version of the file as it was opened; without it the file must not exist yet
   * @returns the version now
   * @throws LapwingError WEB_RULES_PATH, WEB_RULES_CHANGED, WEB_RULES_UNWRITABLE
   */
  write(name: string, text: string, version?: string): string {
    const full = this.#inside(name, ['.yaml', '.yml']);
    const bytes = Buffer.from(text, 'utf8');
    const before = fs.existsSync(full) ? readWhole(full, MOST_BYTES, name) : undefined;
    const present = before && versionOf(before);
    if (present !== version) {
      const why = before ? 'there is another text in it' : 'it is no longer there';
      throw new LapwingError('webRulesChanged', `${name}: ${why}.`);
    }
    try {
      if (before && present !== versionOf(bytes)) writeFileWhole(`${full}.bak`, before);
      writeFileWhole(full, bytes);
    } catch (error) {
      throw unwritable(name, error);
    }
    return versionOf(bytes);
  }

  /** The full path of a file that is, or would be, inside the folder: no link on the way to it. */
  #inside(name: string, ending: readonly string[]): string {
    const found = pathBeside('', name, ending);
    if ('why' in found) throw refused(name, found.why);
    const parts = found.path.split('/');
    if (parts.length > DEEPEST) throw refused(name, `at most ${DEEPEST - 1} folders deep`);
    let full = this.folder;
    for (const [index, part] of parts.entries()) {
      full = path.join(full, part);
      const stat = fs.lstatSync(full, { throwIfNoEntry: false });
      const last = index === parts.length - 1;
      if (!stat && last) break;
      if (!stat) throw refused(name, 'there is no such folder');
      if (stat.isSymbolicLink()) throw refused(name, 'it is a link, or lies behind one');
      if (last ? !stat.isFile() : !stat.isDirectory()) throw refused(name, 'it is no plain file');
    }
    return full;
  }
}

function readWhole(full: string, most: number, name: string): Buffer {
  const stat = fs.lstatSync(full, { throwIfNoEntry: false });
  if (!stat) throw new LapwingError('webNotFound', `There is no file ${JSON.stringify(name)}.`);
  if (stat.size > most) throw refused(name, `it has more than ${most / 1024} KiB`);
  try {
    return fs.readFileSync(full);
  } catch (error) {
    throw unwritable(name, error);
  }
}

function versionOf(bytes: Uint8Array): string {
  return createHash('sha256').update(bytes).digest('hex').slice(0, 32);
}

function refused(name: string, why: string): LapwingError {
  return new LapwingError('webRulesPath', `${JSON.stringify(name.slice(0, 200))}: ${why}.`);
}

/** Without the full path: what is outside of the folder is nobody's business. */
function unwritable(name: string, error: unknown): LapwingError {
  const code = (error as NodeJS.ErrnoException).code ?? 'unknown';
  return new LapwingError('webRulesUnwritable', `${name}: ${code}.`, { cause: error });
}
