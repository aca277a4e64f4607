import { mkdirSync, readdirSync, readFileSync } from 'node:fs';
import { dirname, join, resolve } from 'node:path';
import { LapwingError } from '../errors/codes.js';
import { rfc3339 } from './description.js';
import type { Rig } from './rig/rig.js';
import { writeFileWhole } from './writeFileWhole.js';

/** What a check found; `overridden` failed, and somebody says why the session may go on. */
export type CheckResult = 'passed' | 'failed' | 'overridden' | 'not possible';

export interface CheckedItem {
  readonly id: string;
  readonly title: string;
  readonly result: CheckResult;
  /** What was found. */
  readonly detail: string;
  /** What to do about it; empty where it passed. */
  readonly remedy: string;
  /** Why it was overridden. */
  readonly reason?: string;
}

/** One pre-flight: a file of the day and time beside the rig file, in `preflights`. */
export interface Preflight {
  readonly format: 1;
  readonly rig: string;
  /** RFC 3339. */
  readonly madeAt: string;
  readonly by: string;
  readonly board: { readonly model: string; readonly boardId: number; readonly simulated: boolean };
  /** Nothing failed that was not overridden. */
  readonly passed: boolean;
  readonly checks: readonly CheckedItem[];
}

/** Older than this it says nothing about a session that begins now. */
export const PREFLIGHT_HOURS = 12;

/** Where a rig's pre-flights are kept. */
export function preflightFolder(rig: Rig): string {
  return join(dirname(resolve(rig.path)), 'preflights');
}

/** @throws LapwingError PREFLIGHT_UNSTORED */
export function keepPreflight(rig: Rig, preflight: Preflight): string {
  const folder = preflightFolder(rig);
  const name = preflight.madeAt.slice(0, 19).replace('T', '_').replaceAll(':', '-');
  const file = join(folder, `${name}.json`);
  try {
    mkdirSync(folder, { recursive: true });
    writeFileWhole(file, `${JSON.stringify(preflight, undefined, 2)}\n`);
    return file;
  } catch (error) {
    throw new LapwingError('preflightUnstored', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

/** The newest pre-flight of a rig that is not too old; undefined where there is none. */
export function latestPreflight(rig: Rig, now: Date): Preflight | undefined {
  const folder = preflightFolder(rig);
  // Named by the local day: yesterday's may still be young enough.
  const since = new Date(now.getTime() - PREFLIGHT_HOURS * 3_600_000);
  const from = rfc3339(since).slice(0, 10);
  let names: string[];
  try {
    names = readdirSync(folder).filter((name) => name.endsWith('.json') && name >= from);
  } catch {
    return undefined;
  }
  for (const name of names.sort().reverse()) {
    const preflight = readPreflight(join(folder, name));
    if (preflight === undefined || preflight.rig !== rig.name) continue;
    const madeMs = Date.parse(preflight.madeAt);
    if (madeMs <= now.getTime() && madeMs >= since.getTime()) return preflight;
  }
  return undefined;
}

/**
 * What a rig's pre-flight has against a session that begins now; undefined where it has nothing. No
 * animal hangs on a simulated board, so that one needs none; but one that failed counts there too.
 */
export function preflightAgainst(rig: Rig, simulated: boolean, now: Date): string | undefined {
  const preflight = latestPreflight(rig, now);
  if (preflight?.passed) return undefined;
  if (preflight !== undefined) {
    const failed = preflight.checks.filter(({ result }) => result === 'failed');
    const what = failed.map(({ title }) => title.toLowerCase()).join(', ') || 'not all was passed';
    return `the pre-flight of ${preflight.madeAt.slice(11, 16)} failed: ${what}`;
  }
  if (simulated) return undefined;
  return `no pre-flight of this rig was made in the last ${PREFLIGHT_HOURS} hours`;
}

/** undefined for a file that is none: it is of no use to a session, and no harm. */
function readPreflight(file: string): Preflight | undefined {
  try {
    const value = JSON.parse(readFileSync(file, 'utf8')) as Partial<Preflight> | null;
    const whole = value?.format === 1 && Array.isArray(value.checks);
    return whole && typeof value.madeAt === 'string' ? (value as Preflight) : undefined;
  } catch {
    return undefined;
  }
}
