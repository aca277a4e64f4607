/** What was made from a session's record and lies in its `derived`. */
import fs from 'node:fs/promises';
import path from 'node:path';
import { rfc3339 } from '../../session/description.js';
import type { Download, Made, SessionTold, SummaryTold } from './recordsMessages.js';

/** Where each lies, below the session's folder. */
const WHERE: Readonly<Record<Exclude<Download, 'session'>, string>> = {
  report: 'derived/report.html',
  tables: 'derived/tables',
  parquet: 'derived/parquet',
  nwb: 'derived/session.nwb',
};
const SUMMARY = 'derived/summary.json';
const MOST_SUMMARY_BYTES = 8 << 20;

/** What a summary was made from: made by another version or of another record it is made again. */
export interface SummaryStamp {
  readonly version: string;
  readonly recordBytes: number;
  readonly recordMs: number;
  /** The description says whether the arm of a blinded session may be shown. */
  readonly descriptionMs: number;
}
export interface KeptSummary {
  readonly of: SummaryStamp;
  readonly summary: SummaryTold;
}

export function madePath(folder: string, what: keyof typeof WHERE): string {
  return path.join(folder, ...WHERE[what].split('/'));
}

export function summaryPath(folder: string): string {
  return path.join(folder, ...SUMMARY.split('/'));
}

/** The record's own files together: their bytes, and when the newest of them was changed. */
export async function recordStat(folder: string): Promise<{ bytes: number; ms: number }> {
  let bytes = 0;
  let ms = 0;
  for (const name of await fs.readdir(folder).catch(() => [])) {
    if (!/^record.*\.mcap$/.test(name)) continue;
    const stat = await fs.stat(path.join(folder, name)).catch(() => undefined);
    if (!stat) continue;
    bytes += stat.size;
    ms = Math.max(ms, stat.mtimeMs);
  }
  return { bytes, ms };
}

/** The stamp that a summary of the record as it is now would carry. */
export async function summaryStamp(folder: string, version: string): Promise<SummaryStamp> {
  const { bytes, ms } = await recordStat(folder);
  const description = await fs.stat(path.join(folder, 'session.json')).catch(() => undefined);
  const descriptionMs = description?.mtimeMs ?? 0;
  return { version, recordBytes: bytes, recordMs: ms, descriptionMs };
}

/** What there is, and whether it is older than what it was made from. */
export async function madeOf(
  folder: string,
  version: string,
): Promise<Pick<SessionTold, 'recordBytes' | 'made' | 'summary'>> {
  const stamp = await summaryStamp(folder, version);
  const fromMs = Math.max(stamp.recordMs, stamp.descriptionMs);
  const look = (what: keyof typeof WHERE) => lookAt(madePath(folder, what), fromMs);
  const [report, tables, parquet, nwb] = await Promise.all([
    ...[look('report'), look('tables'), look('parquet'), look('nwb')],
  ]);
  return {
    recordBytes: stamp.recordBytes,
    made: { report: report!, tables: tables!, parquet: parquet!, nwb: nwb! },
    summary: await keptSummary(folder, stamp),
  };
}

async function lookAt(file: string, fromMs: number): Promise<Made | null> {
  const stat = await fs.lstat(file).catch(() => undefined);
  if (!stat || stat.isSymbolicLink()) return null;
  let bytes = stat.size;
  if (stat.isDirectory()) {
    bytes = 0;
    for (const name of await fs.readdir(file).catch(() => [])) {
      bytes += (await fs.stat(path.join(file, name)).catch(() => undefined))?.size ?? 0;
    }
  }
  return { bytes, at: rfc3339(stat.mtime), old: stat.mtimeMs < fromMs };
}

async function keptSummary(folder: string, stamp: SummaryStamp): Promise<SummaryTold | null> {
  const file = summaryPath(folder);
  try {
    const { size } = await fs.stat(file);
    if (size > MOST_SUMMARY_BYTES) return null;
    const { of, summary } = JSON.parse(await fs.readFile(file, 'utf8')) as KeptSummary;
    return JSON.stringify(of) === JSON.stringify(stamp) ? summary : null;
  } catch {
    // None was made, or it was cut short: it is made again.
    return null;
  }
}

/** Takes away what a process that was stopped left half made; an export put aside comes back. */
export async function tidyDerived(folder: string, pid: number): Promise<void> {
  const derived = path.join(folder, 'derived');
  for (const name of await fs.readdir(derived).catch(() => [])) {
    const left = path.join(derived, name);
    if (name.endsWith(`.${pid}.new`)) await fs.rm(left, { recursive: true, force: true });
    if (!name.endsWith(`.${pid}.old`)) continue;
    const whole = left.slice(0, -`.${pid}.old`.length);
    const replaced = await fs.lstat(whole).catch(() => undefined);
    if (replaced) await fs.rm(left, { recursive: true, force: true });
    else await fs.rename(left, whole);
  }
}
