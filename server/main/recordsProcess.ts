/**
 * The process in which the Records page's work is done: forked by the web process, told one task,
 * gone when it is done. Reading a record takes a whole core for seconds; neither the loop nor the
 * web process may wait for that.
 */

import { fileURLToPath } from 'node:url';
import { type LearningDay, learningDay } from '../analysis/learning.js';
import { readSession } from '../analysis/readSession.js';
import { derivedFolder } from '../export/exportFolder.js';
import { reportPage } from '../export/report/page.js';
import { writeTables } from '../export/writeTables.js';
import { needArm, refuseSealed } from '../session/blinding/arms.js';
import { closeRecord } from '../session/closeRecord.js';
import { rfc3339 } from '../session/description.js';
import { loadSession } from '../session/loadSession.js';
import { refuseWhileRecording } from '../session/record/recordLock.js';
import { describeTroubles } from '../session/record/recordState.js';
import { replaySession } from '../session/replay.js';
import { whatIf } from '../session/whatIf.js';
import { writeFileWhole } from '../session/writeFileWhole.js';
import { serveJob, type Tell } from '../web/jobs/serveJob.js';
import { madePath } from '../web/records/made.js';
import type {
  ExportFormat,
  LearningTold,
  MendTold,
  ReplayTold,
  SummaryTold,
  WhatIfTold,
} from '../web/records/recordsMessages.js';
import type { RecordsTask } from '../web/records/recordsTask.js';
import { summarise } from '../web/records/summarise.js';
import { SimulatedLedBoard } from './ledBoard.js';

/** So many rows are told; the tables and the report have all of them. */
const MOST_ROWS = 3_000;

/**
 * Does one task.
 * @throws LapwingError RECORD_BUSY for a session that is being recorded, and as what it calls does
 */
export async function work(task: RecordsTask, tell: Tell): Promise<unknown> {
  if (task.do === 'learning') return learning(task.folders, tell);
  refuseWhileRecording(task.folder);
  switch (task.do) {
    case 'summary':
      return summary(task.folder, tell);
    case 'report':
      return report(task.folder, tell);
    case 'replay':
      return replay(task.folder, tell);
    case 'mend':
      return mendAndCheck(task.folder, tell);
    case 'export':
      return exportTo(task.folder, task.to, tell);
    case 'what if':
      return whatIfWith(task.folder, task.rules, task.rulesPath, tell);
  }
}

async function summary(folder: string, tell: Tell): Promise<SummaryTold> {
  return summarise(folder, (done) => tell(done, 'reading the record'));
}

async function report(folder: string, tell: Tell): Promise<{ bytes: number }> {
  const session = await readSession(folder, (done) => tell(0.9 * done, 'reading the record'));
  tell(0.95, 'drawing');
  const page = reportPage(session);
  derivedFolder(folder);
  writeFileWhole(madePath(folder, 'report'), page);
  return { bytes: Buffer.byteLength(page) };
}

async function learning(folders: readonly string[], tell: Tell): Promise<LearningTold> {
  const days: LearningDay[] = [];
  for (const [n, folder] of folders.entries()) {
    refuseWhileRecording(folder);
    const doing = `reading session ${n + 1} of ${folders.length}`;
    const share = (done: number) => tell((n + done) / folders.length, doing);
    days.push(learningDay(await readSession(folder, share)));
  }
  return { days };
}

async function replay(folder: string, tell: Tell): Promise<ReplayTold> {
  const { setup, description } = loadSession(folder);
  needArm(description.blinding, setup.arm);
  const most = description.record?.lastInput ?? 0;
  const share = (inputs: number) => tell(most > 0 ? inputs / most : 0, 'replaying');
  const { state, ...found } = await replaySession(folder, setup, share);
  if (found.difference !== null) refuseSealed(description.blinding, 'The first difference');
  return { ...found, missing: describeTroubles(state) };
}

async function mendAndCheck(folder: string, tell: Tell): Promise<MendTold> {
  const { finished, replay } = await closeRecord(folder, (done) =>
    tell(done, done < 0.5 ? 'closing the record' : 'replaying'),
  );
  const { state, bytes } = finished;
  const { messages, lastInput } = state;
  const missing = describeTroubles(state);
  return { messages, lastInput, bytes, missing, identical: replay?.identical ?? null };
}

async function exportTo(folder: string, to: ExportFormat, tell: Tell): Promise<{ path: string }> {
  derivedFolder(folder);
  const into = madePath(folder, to);
  const session = await readSession(folder, (done) => tell(done / 4, 'reading the record'));
  const writing = (done: number) => tell(0.25 + 0.75 * done, 'writing');
  writing(0);
  if (to === 'tables') writeTables(session, into, writing);
  else if (to === 'parquet') {
    const { writeParquet } = await import('../export/writeParquet.js');
    writeParquet(session, into, writing);
  } else {
    // Loaded by whoever wants one: HDF5 takes longer to load than most of the other work takes.
    const { writeNwb } = await import('../export/nwb/writeNwb.js');
    await writeNwb(session, into, rfc3339(new Date()));
  }
  return { path: into };
}

async function whatIfWith(
  folder: string,
  rules: string,
  rulesPath: string,
  tell: Tell,
): Promise<WhatIfTold> {
  tell(0, 'reading the rules');
  const other = loadSession(folder, rulesPath);
  refuseSealed(other.description.blinding, 'Another rules file compared with this one');
  const most = other.description.record?.lastInput ?? 0;
  const { counts, rows } = await whatIf(
    other,
    (hear) => new SimulatedLedBoard(hear),
    (inputs) => tell(most > 0 ? inputs / most : 0, 'running the other rules'),
  );
  const rowsLeftOut = Math.max(0, rows.length - MOST_ROWS);
  const { title } = other.rules.file;
  return { rules, title, counts, rows: rows.slice(0, MOST_ROWS), rowsLeftOut };
}

if (process.argv[1] === fileURLToPath(import.meta.url) && process.send) serveJob(work);
