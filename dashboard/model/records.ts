/** What the Records page knows, and what it makes of it. Nothing here touches the screen. */
import type { JobTold } from '../../server/web/jobs/jobMessages.js';
import type {
  ExportFormat,
  SessionList,
  SessionQuery,
  SessionRow,
  SessionSort,
  SessionTold,
  Work,
} from '../../server/web/records/recordsMessages.js';
import { plural } from './format.js';
import type { Level } from './health.js';
import type { Notice } from './rehearse.js';

export const ROWS_AT_ONCE = 50;
/** As many as the service compares at once. */
export const MOST_COMPARED = 200;

export interface Records {
  query: SessionQuery;
  list: SessionList | undefined;
  /** Names ticked for a comparison, with whose they are. */
  readonly ticked: Map<string, string>;
  /** The session that is shown, by name, and what was told of it. */
  open: string | undefined;
  session: SessionTold | undefined;
  /** The newest job of each kind about the session shown (`jobKey`). */
  jobs: Map<string, JobTold>;
  comparison: JobTold | undefined;
  reportShown: boolean;
  rulesFiles: readonly string[];
  notice: Notice | undefined;
}

export function emptyRecords(): Records {
  return {
    query: { sort: 'started', order: 'down' },
    list: undefined,
    ticked: new Map(),
    open: undefined,
    session: undefined,
    jobs: new Map(),
    comparison: undefined,
    reportShown: false,
    rulesFiles: [],
    notice: undefined,
  };
}

/** Jobs of one kind take each other's place; each export has its own. */
export function jobKey(work: Work): string {
  return work.do === 'export' ? `export ${work.to}` : work.do;
}

export function isUnended(job: JobTold | undefined): boolean {
  return job?.state === 'waiting' || job?.state === 'running';
}

/** What is found by the query after a change: another search begins at its first row. */
export function queryWith(query: SessionQuery, change: Partial<SessionQuery>): SessionQuery {
  const next = { ...query, ...change };
  if (!('offset' in change)) delete (next as { offset?: number }).offset;
  return next;
}

/** The same column once more turns the order round; dates, lengths and water begin with the most. */
export function sortedBy(query: SessionQuery, sort: SessionSort): SessionQuery {
  const usual = sort === 'subject' || sort === 'title' ? 'up' : 'down';
  const turned = query.order === 'up' ? 'down' : 'up';
  return queryWith(query, { sort, order: query.sort === sort ? turned : usual });
}

export function isNarrowed({
  text,
  subject,
  title,
  rules,
  from,
  to,
  state,
}: SessionQuery): boolean {
  const words = [text, subject, title, rules, from, to];
  return words.some((word) => word !== undefined && word !== '') || (state ?? 'any') !== 'any';
}

/** `4 Mar 2026, 09:30` by the clock of the place where it was recorded. */
export function momentWords(rfc3339: string): string {
  const [, year, month, day, time] = /^(\d{4})-(\d\d)-(\d\d)T(\d\d:\d\d)/.exec(rfc3339) ?? [];
  if (!year || !month) return 'unknown';
  return `${Number(day)} ${MONTHS[Number(month) - 1] ?? month} ${year}, ${time}`;
}
const MONTHS = 'Jan Feb Mar Apr May Jun Jul Aug Sep Oct Nov Dec'.split(' ');

/** How a session stands, in a word or two, worst first. */
export function standing(row: SessionRow): { readonly level: Level; readonly words: string } {
  if (row.bad !== null) return { level: 'bad', words: 'bad description' };
  if (row.recording) return { level: 'off', words: 'recording' };
  if (row.ended === null) return { level: 'bad', words: 'left unfinished' };
  if (row.check === 'different') return { level: 'bad', words: 'differs in replay' };
  if (row.record === 'damaged') return { level: 'bad', words: 'record damaged' };
  if (row.check === 'failed') return { level: 'warn', words: 'not checked' };
  if (row.record === 'torn' || row.record === 'open') {
    return { level: 'warn', words: 'end missing' };
  }
  if (row.record === null) return { level: 'warn', words: 'not closed yet' };
  if (row.check === null) return { level: 'warn', words: 'not checked' };
  return { level: 'good', words: 'checked' };
}

/** The self-check in a sentence. */
export function checkWords({ description, row }: SessionTold): string {
  const replay = description?.replay;
  if (!replay) return row.recording ? 'made when the session ends' : 'not made';
  if (replay.failed !== undefined) return `could not be made: ${replay.failed}`;
  const { inputs, decisions, commands, difference } = replay;
  const counts = `${plural(inputs, 'input')}, ${plural(decisions, 'decision')}, ${plural(commands, 'command')}`;
  if (replay.identical) return `replayed, identical: ${counts}`;
  return `replayed, different at input ${difference?.input ?? '?'}: ${counts}`;
}

/** Water as given, with what nobody can account for as a range. */
export function waterWords(givenUl: number | null, uncertainUl: number | null): string {
  if (givenUl === null) return '–';
  const given = givenUl.toFixed(1);
  if (!uncertainUl) return given;
  return `${given} to ${(givenUl + uncertainUl).toFixed(1)}`;
}

/** Whether the record can be closed: it was left, or never finished, and nobody writes it. */
export function canMend(row: SessionRow): boolean {
  if (row.recording) return false;
  return row.ended === null || row.record === null || row.bad !== null;
}

/** Why the ticked sessions cannot be compared, or undefined where they can. */
export function whyNotComparable(ticked: ReadonlyMap<string, string>): string | undefined {
  if (ticked.size < 2) return 'Tick two sessions or more of one animal.';
  if (new Set(ticked.values()).size > 1) return 'They are of more than one animal.';
  if (ticked.size > MOST_COMPARED) return `More than ${MOST_COMPARED} at once.`;
  return undefined;
}

export const EXPORT_WORDS: Readonly<Record<ExportFormat, { name: string; what: string }>> = {
  tables: { name: 'Tables', what: 'CSV, with loaders for Python, R and Octave' },
  parquet: { name: 'Parquet', what: 'the same tables, typed and small' },
  nwb: { name: 'NWB', what: 'one HDF5 file of the standard' },
};

/** A job's state in words, for the line beside its bar. */
export function jobWords(job: JobTold): string {
  switch (job.state) {
    case 'waiting':
      return job.ahead === 0 ? 'about to begin' : `waiting, ${job.ahead} before it`;
    case 'running':
      return job.done > 0 ? `${job.doing}, ${Math.floor(job.done * 100)} %` : job.doing;
    case 'done':
      return `done in ${job.tookS.toFixed(1)} s`;
    case 'failed':
      return job.detail;
    case 'cancelled':
      return 'cancelled';
  }
}
