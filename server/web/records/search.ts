import type { SessionList, SessionQuery, SessionRow, SessionSort } from './recordsMessages.js';
import { hasTrouble } from './sessionRow.js';

const MOST_SUBJECTS = 1_000;
const MOST_RULES = 500;
export const ROWS_AT_ONCE = 50;

/** What a row is searched in, made once: rows stay the same object while their files do. */
const haystacks = new WeakMap<SessionRow, string>();

/** The sessions that fit, sorted, one stretch of them; and what there is to choose from. */
export function searchSessions(rows: readonly SessionRow[], query: SessionQuery): SessionList {
  const words = (query.text ?? '').toLowerCase().split(/\s+/).filter(Boolean);
  const found = sorted(
    rows.filter((row) => fits(row, query, words)),
    query,
  );
  const { offset = 0, limit = ROWS_AT_ONCE } = query;
  return {
    total: rows.length,
    found: found.length,
    rows: found.slice(offset, offset + limit),
    ...choices(rows),
  };
}

function fits(row: SessionRow, query: SessionQuery, words: readonly string[]): boolean {
  const { subject, title, rules, from, to, state = 'any' } = query;
  if (subject && row.subject !== subject) return false;
  if (title && !row.title.toLowerCase().includes(title.toLowerCase())) return false;
  if (rules && row.rules !== rules) return false;
  const day = row.startedAt.slice(0, 10);
  if ((from && day < from) || (to && (day === '' || day > to))) return false;
  if (state === 'recording' && !row.recording) return false;
  if (state === 'ended' && row.ended === null) return false;
  if (state === 'trouble' && !hasTrouble(row)) return false;
  if (words.length === 0) return true;
  const haystack = haystackOf(row);
  return words.every((word) => haystack.includes(word));
}

function haystackOf(row: SessionRow): string {
  let text = haystacks.get(row);
  if (text === undefined) {
    const { name, subject, title, experimenter, protocolNumber, rules, ended, bad } = row;
    text = [name, subject, title, experimenter, protocolNumber, rules, ended?.reason, bad]
      .join('\n')
      .toLowerCase();
    haystacks.set(row, text);
  }
  return text;
}

const VALUES: Readonly<Record<SessionSort, (row: SessionRow) => string | number>> = {
  started: (row) => momentOf(row),
  subject: (row) => row.subject.toLowerCase(),
  title: (row) => row.title.toLowerCase(),
  minutes: (row) => row.minutes ?? -1,
  water: (row) => row.givenUl ?? -1,
};

function momentOf({ startedAt }: SessionRow): number {
  const ms = Date.parse(startedAt);
  return Number.isNaN(ms) ? 0 : ms;
}

/** By what is asked for, and among equals the newest first. */
function sorted(rows: readonly SessionRow[], { sort = 'started', order = 'down' }: SessionQuery) {
  const sign = order === 'up' ? 1 : -1;
  return rows
    .map((row) => ({ row, value: VALUES[sort](row), moment: momentOf(row) }))
    .sort((a, b) => {
      if (a.value !== b.value) return a.value < b.value ? -sign : sign;
      return b.moment - a.moment || (a.row.name < b.row.name ? 1 : -1);
    })
    .map(({ row }) => row);
}

function choices(rows: readonly SessionRow[]): Pick<SessionList, 'subjects' | 'rules'> {
  const subjects = new Map<string, { sessions: number; lastMs: number }>();
  const rules = new Set<string>();
  for (const row of rows) {
    if (row.rules !== '') rules.add(row.rules);
    if (row.subject === '') continue;
    const seen = subjects.get(row.subject) ?? { sessions: 0, lastMs: 0 };
    seen.sessions++;
    seen.lastMs = Math.max(seen.lastMs, momentOf(row));
    subjects.set(row.subject, seen);
  }
  return {
    subjects: [...subjects]
      .sort(([, a], [, b]) => b.lastMs - a.lastMs)
      .slice(0, MOST_SUBJECTS)
      .map(([subject, { sessions }]) => ({ subject, sessions })),
    rules: [...rules].sort().slice(0, MOST_RULES),
  };
}
