import fs from 'node:fs';
import path from 'node:path';
import { LapwingError } from '../errors/codes.js';
import { packageRoot } from '../packageRoot.js';
import { CAPABILITY, type Identity } from '../wire/messages.js';
import type { Blinding } from './blinding/arms.js';
import type { Preflight } from './preflight.js';
import { writeFileWhole } from './writeFileWhole.js';

const NAME = 'session.json';

/** `session.json`; each field is explained in `session.schema.json`. */
export interface SessionDescription {
  readonly format: 1;
  readonly name: string;
  readonly subject: string;
  readonly experimenter: string | null;
  readonly protocolNumber: string | null;
  readonly sessionNumber: number | null;
  readonly title: string;
  /** RFC 3339 with the zone's offset, as `rfc3339` makes it. */
  readonly startedAt: string;
  readonly software: {
    readonly name: 'lapwing';
    readonly version: string;
    readonly node?: string;
    readonly platform?: string;
  };
  readonly board: BoardDescription | null;
  readonly seed: string;
  readonly calibrations: readonly {
    readonly of: string;
    /** Its file's name; none where the rig file has the numbers written out. */
    readonly name?: string;
    readonly madeAt?: string;
    readonly values: Readonly<Record<string, number | string>>;
  }[];
  /** The newest pre-flight of the rig, if one was made in the twelve hours before. */
  readonly preflight?: Preflight;
  /** What the pre-flight, or the lack of one, had against the session, and why it was begun. */
  readonly preflightOverride?: { readonly against: string; readonly reason: string };
  readonly files: readonly StoredFile[];
  readonly ended: SessionEnd | null;
  /** Given earlier that day, which the day's limit counts. */
  readonly waterEarlierUl?: number;
  /** What was given, by the board's word; uncertain: drops that nobody can account for. */
  readonly water?: { readonly givenUl: number; readonly uncertainUl: number };
  readonly animal?: AnimalBefore;
  /** The arm of a sealed draw, sealed; and who opened it. */
  readonly blinding?: Blinding;
  readonly record?: {
    readonly state: 'whole' | 'open' | 'torn' | 'damaged';
    readonly messages: number;
    readonly lastInput: number;
    readonly bytes: number;
    readonly missing: readonly string[];
  };
  /** The record fed through the engine again after the end, every decision compared. */
  readonly replay?: {
    readonly identical: boolean;
    readonly inputs: number;
    readonly decisions: number;
    readonly commands: number;
    readonly difference?: {
      readonly input: number;
      readonly recorded: string | null;
      readonly replayed: string | null;
    };
    /** Why the check could not be made. */
    readonly failed?: string;
  };
}

/** What the animals folder said of the subject when the session began. */
export interface AnimalBefore {
  readonly folder: string;
  readonly rig: string;
  /** Its water goes into the book. */
  readonly kept: boolean;
  readonly weightG: number | null;
  readonly percent: number | null;
  readonly leastPercent: number | null;
  readonly protocol: string;
  readonly targetUl: number | null;
  /** What spoke against the session, and why it was begun all the same. */
  readonly against: readonly string[];
  readonly despite?: string;
}

export interface SessionEnd {
  readonly how: 'rules' | 'operator' | 'signal' | 'error' | 'mended';
  readonly at: string;
  readonly reason: string;
}

export interface BoardDescription {
  readonly model: string;
  readonly boardId: number;
  readonly firmware: number;
  readonly protocol: number;
  readonly simulated: boolean;
}

export interface StoredFile {
  readonly role: 'rig' | 'rules' | 'included' | 'calibration';
  /** Path in the session folder, with `/`. */
  readonly stored: string;
  /** What it was called where it came from. */
  readonly source: string;
  readonly bytes: number;
  readonly sha256: string;
}

export function describeBoard(identity: Identity): BoardDescription {
  const { model, boardId, firmware, protocol, capabilities } = identity;
  const simulated = (capabilities & CAPABILITY.simulated) !== 0;
  return { model, boardId, firmware, protocol, simulated };
}

/** The time as RFC 3339 section 5.6 writes it, in this computer's zone, to the millisecond. */
export function rfc3339(time: Date): string {
  const east = -time.getTimezoneOffset();
  const local = new Date(time.getTime() + east * 60_000).toISOString().slice(0, -1);
  const two = (value: number) => String(Math.floor(Math.abs(value))).padStart(2, '0');
  return `${local}${east < 0 ? '-' : '+'}${two(east / 60)}:${two(east % 60)}`;
}

/** Writes the description: a reader, or a power cut, finds the old one or the new one, whole. */
export function writeDescription(folder: string, description: SessionDescription): void {
  writeFileWhole(path.join(folder, NAME), JSON.stringify(description, undefined, 2) + '\n');
}

/** Reads the description as it is; throws `RECORD_DESCRIPTION_BAD` where that cannot be. */
export function readDescription(folder: string): SessionDescription {
  const file = path.join(folder, NAME);
  try {
    const value: unknown = JSON.parse(fs.readFileSync(file, 'utf8'));
    if (typeof value !== 'object' || value === null || (value as { format?: unknown }).format !== 1)
      throw new Error('it is not a description of format 1');
    return value as SessionDescription;
  } catch (error) {
    throw new LapwingError('recordDescriptionBad', `${file}: ${(error as Error).message}`, {
      cause: error,
    });
  }
}

/** Changes some fields of the description, whole as `writeDescription` does; others are kept. */
export function updateDescription(folder: string, change: Partial<SessionDescription>): void {
  writeDescription(folder, { ...readDescription(folder), ...change });
}

/** The JSON Schema of `session.json` (draft 2020-12). */
export function sessionSchemaFile(): string {
  return path.join(packageRoot, 'server', 'session', 'session.schema.json');
}
