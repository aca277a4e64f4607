import { existsSync, mkdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { type Document, parseDocument } from 'yaml';
import { LapwingError } from '../errors/codes.js';
import { rfc3339 } from '../session/description.js';
import type { Calibration } from '../session/rig/calibration.js';
import { parseRig } from '../session/rig/readRig.js';
import type { Rig } from '../session/rig/rig.js';
import { safeName } from '../session/safeName.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import type { Draft, GuideBench } from './guides/guide.js';

/**
 * Keeps what a guide found as a new file in the rig's calibrations folder, under the part's name and
 * the day: `valve-2026-11-30`, and `valve-2026-11-30-2` where that is taken.
 * @throws LapwingError CALIBRATION_UNSTORED when the folder cannot be written
 */
export function keepCalibration(
  rig: Rig,
  draft: Draft,
  board: GuideBench['board'],
  by: string,
  now: Date,
): Calibration {
  const { kind, of, warnAfterDays, values, uncertainty, method, measured } = draft;
  const folder = rig.calibrationsFolder;
  const madeAt = rfc3339(now);
  const what = kind === 'valve check' ? `${of}-check` : kind === 'latency' ? 'latency' : of;
  const base = `${safeName(what, 40, kind)}-${madeAt.slice(0, 10)}`;
  const { model, boardId, simulated } = board;
  try {
    mkdirSync(folder, { recursive: true });
    let name = base;
    for (let n = 2; existsSync(join(folder, `${name}.json`)); n++) name = `${base}-${n}`;
    const calibration: Calibration = {
      ...{ format: 1, name, kind, of, rig: rig.name, madeAt, by },
      board: { model, boardId, simulated },
      ...{ warnAfterDays, values, uncertainty, method, measured },
    };
    const text = JSON.stringify(calibration, undefined, 2);
    writeFileWhole(join(folder, `${name}.json`), `${text}\n`);
    return calibration;
  } catch (error) {
    throw new LapwingError('calibrationUnstored', `${folder}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

/**
 * Puts a calibration in force: the rig file refers to it from now on, in place of the numbers or of
 * another calibration. Comments and order are kept, and so is the file as it was, as `NAME.bak`.
 * @throws LapwingError CALIBRATION_UNSTORED where the file would no longer describe a rig
 */
export function useCalibration(rigPath: string, { name, kind, of }: Calibration): void {
  const before = readFileSync(rigPath, 'utf8');
  const document = parseDocument(before, { schema: 'failsafe' });
  if (kind === 'belt') useForBelt(document, name);
  else if (kind === 'valve') document.setIn(['outputs', of, 'calibration'], name);
  else if (kind === 'lick') useForLick(document, of, name);
  else {
    throw new LapwingError('calibrationUnstored', `A ${kind} puts no numbers into a rig file.`);
  }
  // Lines are left as long as they were.
  const text = document.toString({ lineWidth: 0 });
  const { problems } = parseRig(rigPath, text);
  if (problems.length > 0) {
    const [first] = problems;
    throw new LapwingError(
      'calibrationUnstored',
      `${rigPath} would be wrong: ${first!.message} (its line ${first!.line}).`,
    );
  }
  writeFileWhole(`${rigPath}.bak`, before);
  writeFileWhole(rigPath, text);
}

function useForBelt(document: Document, name: string): void {
  for (const key of ['length', 'counts_per_cm', 'direction']) document.deleteIn(['belt', key]);
  document.deleteIn(['belt', 'seam', 'offset']);
  document.setIn(['belt', 'calibration'], name);
}

function useForLick(document: Document, of: string, name: string): void {
  for (const key of ['lockout', 'stuck']) document.deleteIn(['inputs', of, key]);
  document.setIn(['inputs', of, 'calibration'], name);
}
