/**
 * Sign-ins and who holds the controls, in a private file: a web process that is started again signs
 * nobody out in mid-session.
 */
import { mkdirSync, readFileSync } from 'node:fs';
import { dirname } from 'node:path';
import { writeFileWhole } from '../../session/writeFileWhole.js';
import type { Held } from './accessMessages.js';
import type { KeptSignIn } from './signIns.js';

export interface KeptAccess {
  readonly signIns: readonly KeptSignIn[];
  readonly held: Held;
}

const NOTHING: KeptAccess = { signIns: [], held: { change: 0, holder: null } };
const FORMAT = 1;

/** What the process before this one kept; a file that cannot be read signs everybody out, no more. */
export function readKept(file: string): KeptAccess {
  try {
    const { format, ...kept } = JSON.parse(readFileSync(file, 'utf8'));
    return format === FORMAT ? (kept as KeptAccess) : NOTHING;
  } catch {
    return NOTHING;
  }
}

export function writeKept(file: string, kept: KeptAccess): void {
  mkdirSync(dirname(file), { recursive: true, mode: 0o700 });
  writeFileWhole(file, JSON.stringify({ format: FORMAT, ...kept }), 0o600);
}
