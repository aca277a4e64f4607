import { existsSync, readFileSync, rmSync } from 'node:fs';
import { readDescription } from '../session/description.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import type { RunningSession } from './view.js';

/** The running session as a restarted loop finds it. */
export interface CurrentSession {
  readonly folder: string;
  readonly subject: string;
  readonly experimenter: string;
  readonly seed: string;
  readonly startedAt: string;
  readonly waterTodayNl: number;
}

/** Notes which session runs, so that a loop started after a crash finds it. */
export function keepCurrent(file: string, session: RunningSession): void {
  writeFileWhole(file, JSON.stringify(currentOf(session)));
}

/** The session that a loop which died was running; one that was mended since is over. */
export function leftOver(file: string): CurrentSession | undefined {
  if (!existsSync(file)) return undefined;
  const current = JSON.parse(readFileSync(file, 'utf8')) as CurrentSession;
  if (existsSync(current.folder) && readDescription(current.folder).ended === null) return current;
  rmSync(file, { force: true });
  return undefined;
}

function currentOf(session: RunningSession): CurrentSession {
  const { folder, subject, experimenter, seed, startedAt, waterTodayNl } = session;
  return { folder, subject, experimenter, seed, startedAt: startedAt.toISOString(), waterTodayNl };
}
