import { readdirSync } from 'node:fs';
import { basename, dirname, join, relative } from 'node:path';
import { packageVersion } from '../packageRoot.js';
import type { Identity } from '../wire/messages.js';
import type { Blinding } from './blinding/arms.js';
import type { SessionCore } from './core/sessionCore.js';
import {
  type AnimalBefore,
  describeBoard,
  readDescription,
  rfc3339,
  type SessionDescription,
  type SessionEnd,
  updateDescription,
  writeDescription,
} from './description.js';
import { createSessionFolder, type InputFile, storeInputFiles, subjectInName } from './folder.js';
import { latestPreflight } from './preflight.js';
import type { PreparedRules } from './prepare.js';
import { Recorder, type RecorderOptions, type RecordHeader } from './record/recorder.js';
import type { Rig } from './rig/rig.js';

/** Who and what a session is for. */
export interface SessionCard {
  readonly subject: string;
  readonly experimenter: string;
  /** Of the animal protocol under which it is done, as the committee numbers it. */
  readonly protocolNumber?: string;
  /** Which session of this subject; counted on from the subject's last where nothing is said. */
  readonly sessionNumber?: number;
  readonly preflightOverride?: SessionDescription['preflightOverride'];
  readonly seed: string;
  readonly startedAt: Date;
  /** Given to this animal earlier today. */
  readonly waterTodayNl: number;
  /** What the animals folder says; undefined where none is kept for the rig. */
  readonly animal?: AnimalBefore;
  /** Of a session whose arm is sealed. */
  readonly blinding?: Blinding;
}

/** Makes a session's folder: copies of its files, its description, and a recorder ready to write. */
export function openSession(
  root: string,
  rig: Rig,
  rules: PreparedRules,
  card: SessionCard,
  board: Identity | null,
  options: RecorderOptions,
): { readonly folder: string; readonly recorder: Recorder } {
  const { title } = rules.file;
  const { subject, startedAt, seed } = card;
  const live = options.mode !== 'bulk';
  const sessionNumber = card.sessionNumber ?? (live ? nextSessionNumber(root, subject) : null);
  const folder = createSessionFolder(root, { subject, title, startedAt }, { live });
  const preflight = live ? latestPreflight(rig, startedAt) : undefined;
  const files = storeInputFiles(folder, inputFiles(rig, rules));
  writeDescription(folder, {
    format: 1,
    name: basename(folder),
    subject,
    experimenter: card.experimenter || null,
    protocolNumber: card.protocolNumber || card.animal?.protocol || null,
    sessionNumber,
    title,
    startedAt: rfc3339(startedAt),
    software: {
      name: 'lapwing',
      version: packageVersion,
      node: process.version,
      platform: process.platform,
    },
    board: board && describeBoard(board),
    seed,
    calibrations: calibrationsOf(rig),
    ...(preflight === undefined ? {} : { preflight }),
    ...(card.preflightOverride === undefined ? {} : { preflightOverride: card.preflightOverride }),
    files,
    ended: null,
    waterEarlierUl: card.waterTodayNl / 1_000,
    ...(card.animal === undefined ? {} : { animal: card.animal }),
    ...(card.blinding === undefined ? {} : { blinding: card.blinding }),
  });
  return { folder, recorder: Recorder.create(folder, recordHeaderOf(folder), options) };
}

/** What the record's files say of their session, from its description. */
export function recordHeaderOf(folder: string): RecordHeader {
  const { name, startedAt, seed } = readDescription(folder);
  const software = `lapwing ${packageVersion}`;
  return { session: name, startedAtMs: Date.parse(startedAt), software, seed };
}

/** Writes into the description how a session ended and what water it gave. */
export function describeEnd(folder: string, core: SessionCore, how: SessionEnd['how']): void {
  updateDescription(folder, {
    ended: { how, at: rfc3339(new Date()), reason: core.endReason },
    water: waterOf(core),
  });
}

/** What a session gave, for the water book; the uncertain is what nobody can account for. */
export function waterOf(core: SessionCore): NonNullable<SessionDescription['water']> {
  return {
    givenUl: core.guard.waterGivenNl / 1_000,
    uncertainUl: core.guard.waterUncertainNl / 1_000,
  };
}

/** Water that the records say a subject was given on the day of `now`, uncertain drops included. */
export function waterTodayNl(root: string, subject: string, now: Date): number {
  const today = rfc3339(now).slice(0, 10);
  let nl = 0;
  for (const name of namesBelow(root)) {
    // A session's folder begins with its day, so other days need not be opened.
    if (!name.startsWith(today)) continue;
    try {
      const { subject: whose, water } = readDescription(join(root, name));
      if (whose === subject && water) nl += (water.givenUl + water.uncertainUl) * 1_000;
    } catch {
      // A folder without a readable description is no session of anybody's.
    }
  }
  return nl;
}

/**
 * One more than the subject's last session below `root`; 1 for the first. Sessions that were recorded
 * without a number are counted.
 */
export function nextSessionNumber(root: string, subject: string): number {
  const who = subjectInName(subject);
  let uncounted = 0;
  // Names begin with the time, so the last comes first, and usually no other need be opened.
  for (const name of namesBelow(root).sort().reverse()) {
    if (!name.includes(who)) continue;
    try {
      const { subject: whose, sessionNumber } = readDescription(join(root, name));
      if (whose !== subject) continue;
      if (sessionNumber !== null) return sessionNumber + uncounted + 1;
      uncounted++;
    } catch {
      // As above.
    }
  }
  return uncounted + 1;
}

function namesBelow(root: string): string[] {
  try {
    return readdirSync(root);
  } catch {
    return [];
  }
}

function inputFiles(rig: Rig, rules: PreparedRules): InputFile[] {
  const base = dirname(rules.path);
  const bytes = (text: string) => Buffer.from(text, 'utf8');
  const [main, ...included] = rules.file.sources;
  return [
    { role: 'rig', source: rig.path, content: bytes(rig.text) },
    ...rig.calibrations.map(
      ({ calibration, source }): InputFile => ({
        role: 'calibration',
        source,
        content: bytes(`${JSON.stringify(calibration, undefined, 2)}\n`),
      }),
    ),
    { role: 'rules', source: rules.path, content: bytes(main!.text) },
    ...included.map(
      (file): InputFile => ({
        role: 'included',
        source: relative(base, file.path),
        content: bytes(file.text),
      }),
    ),
  ];
}

function calibrationsOf(rig: Rig): SessionDescription['calibrations'] {
  const stored = (of: string) => {
    const used = rig.calibrations.find(({ calibration }) => calibration.of === of);
    if (used === undefined) return { of };
    const { name, madeAt } = used.calibration;
    return { of, name, madeAt };
  };
  const valves = rig.outputs.flatMap(({ name, valve }) =>
    valve === undefined ? [] : [{ ...stored(name), values: { ...valve } }],
  );
  const { lengthCm, countsPerCm } = rig.belt;
  return [{ ...stored('belt'), values: { lengthCm, countsPerCm } }, ...valves];
}
