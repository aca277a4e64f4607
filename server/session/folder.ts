import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { LapwingError } from '../errors/codes.js';
import { rfc3339, type StoredFile } from './description.js';
import { whyNotLocal } from './localDisk.js';
import { safeName } from './safeName.js';
import { syncFolder, writeFileWhole } from './writeFileWhole.js';

export interface FolderName {
  readonly subject: string;
  readonly title: string;
  readonly startedAt: Date;
}

/** A file the session is run from, as it was read: what is stored is what was run. */
export interface InputFile {
  readonly role: StoredFile['role'];
  /** For an included file, the path by which the rules file names it. */
  readonly source: string;
  readonly content: Uint8Array;
}

/** The longest name stays far below what any system allows (255 bytes). */
const SUBJECT_MOST = 40;
const TITLE_MOST = 40;

/** `2026-12-01_14-03-22_m31_Induction-with-sham-laps`, local time, safe whatever was typed. */
export function sessionFolderName({ subject, title, startedAt }: FolderName): string {
  const time = rfc3339(startedAt).slice(0, 19).replace('T', '_').replaceAll(':', '-');
  return `${time}${subjectInName(subject)}${safeName(title, TITLE_MOST, 'session')}`;
}

/** How a subject stands in the names of its sessions' folders, between two `_`. */
export function subjectInName(subject: string): string {
  return `_${safeName(subject, SUBJECT_MOST, 'subject')}_`;
}

/**
 * Makes a new folder for one session below `root` (made as well if need be) and returns its path. A
 * folder that is there already is never used: the new one gets a number. `live: false` is for a
 * rehearsal, which may write anywhere. Throws `RECORD_FOLDER_REMOTE` or `RECORD_FOLDER_BAD`.
 */
export function createSessionFolder(root: string, name: FolderName, { live = true } = {}): string {
  const base = sessionFolderName(name);
  try {
    fs.mkdirSync(root, { recursive: true });
    const why = live ? whyNotLocal(root) : undefined;
    if (why !== undefined) throw new LapwingError('recordFolderRemote', `${root}: ${why}.`);
    for (let n = 1; ; n++) {
      const folder = path.join(root, n === 1 ? base : `${base}_${n}`);
      try {
        fs.mkdirSync(folder);
      } catch (error) {
        if ((error as NodeJS.ErrnoException).code === 'EEXIST') continue;
        throw error;
      }
      syncFolder(root);
      return folder;
    }
  } catch (error) {
    if (error instanceof LapwingError) throw error;
    throw new LapwingError('recordFolderBad', `${root}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

/**
 * Stores exact copies of the rig file, the rules file and what the rules file includes, and returns
 * what `session.json` says of them. An included file keeps the path the rules file gives it, so that
 * the copy can be run as it stands, unless that would lead out of the folder or onto a file of the
 * session's own.
 */
export function storeInputFiles(folder: string, files: readonly InputFile[]): StoredFile[] {
  const taken = new Set<string>();
  return files.map(({ role, source, content }) => {
    const stored = placeFor(role, source, taken);
    taken.add(stored.toLowerCase());
    const file = path.join(folder, ...stored.split('/'));
    try {
      fs.mkdirSync(path.dirname(file), { recursive: true });
      writeFileWhole(file, content);
    } catch (error) {
      throw new LapwingError('recordFolderBad', `${file}: ${(error as Error).message}`, {
        cause: error,
      });
    }
    const sha256 = createHash('sha256').update(content).digest('hex');
    return { role, stored, source, bytes: content.length, sha256 };
  });
}

/** Names at the top of a session folder that an included file must not take. */
const OWN = /^(rig\.yaml|rules\.yaml|session\.json.*|record.*|included|derived)$/i;

function placeFor(role: InputFile['role'], source: string, taken: ReadonlySet<string>): string {
  if (role !== 'included' && role !== 'calibration') return `${role}.yaml`;
  const parts = source.split(/[\\/]/).filter((part) => part !== '' && part !== '.');
  const kept = parts.length > 0 && parts.every((part) => safeName(part, 80, '') === part);
  const place = parts.join('/');
  if (kept && !OWN.test(parts[0]!) && !path.isAbsolute(source) && !clashes(place, taken))
    return place;
  const name = safeName(parts.at(-1) ?? '', 80, 'file');
  for (let n = 1; ; n++) {
    const other = `included/${n}-${name}`;
    if (!taken.has(other.toLowerCase())) return other;
  }
}

/** The same file where case does not count, or a file where the other wants a folder. */
function clashes(place: string, taken: ReadonlySet<string>): boolean {
  const low = place.toLowerCase();
  for (const other of taken)
    if (other === low || other.startsWith(low + '/') || low.startsWith(other + '/')) return true;
  return false;
}
