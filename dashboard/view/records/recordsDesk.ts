/** What the Records page does: asks the service, and keeps what it was told. */
import type { JobTold } from '../../../server/web/jobs/jobMessages.js';
import type {
  SessionQuery,
  SessionRow,
  Work,
} from '../../../server/web/records/recordsMessages.js';
import {
  emptyRecords,
  isUnended,
  jobKey,
  queryWith,
  type Records,
  ROWS_AT_ONCE,
} from '../../model/records.js';
import type { Told } from '../../stream/ask.js';
import { type RecordsApi, recordsApi } from '../../stream/recordsApi.js';

/** While something is being worked on, and while nothing is. */
const FOLLOW_MS = 300;
const LIST_MS = 5_000;
/** A pause in typing after which is searched. */
const SEARCH_AFTER_MS = 250;

export class RecordsDesk {
  readonly state: Records = emptyRecords();
  private inFront = false;
  private listTimer: ReturnType<typeof setTimeout> | undefined;
  private asked = 0;
  private readonly followed = new Set<string>();

  constructor(
    private readonly touch: () => void,
    private readonly api: RecordsApi = recordsApi,
  ) {}

  /** The page is in front, with this session open, or none. */
  shown(name: string): void {
    this.inFront = true;
    void this.list();
    if (this.state.rulesFiles.length === 0) void this.listRules();
    if (name === '') this.close();
    else if (name !== this.state.open) void this.open(name);
  }

  hidden(): void {
    this.inFront = false;
    clearTimeout(this.listTimer);
  }

  /** Searches at once, or after a pause where somebody types. */
  search(change: Partial<SessionQuery>, typing = false): void {
    this.setQuery(queryWith(this.state.query, change), typing);
  }

  setQuery(query: SessionQuery, typing = false): void {
    this.state.query = query;
    this.touch();
    clearTimeout(this.listTimer);
    if (typing) this.listTimer = setTimeout(() => void this.list(), SEARCH_AFTER_MS);
    else void this.list();
  }

  turn(pages: number): void {
    const { query } = this.state;
    const offset = Math.max(0, (query.offset ?? 0) + pages * ROWS_AT_ONCE);
    this.search({ offset });
  }

  tick({ name, subject }: SessionRow, on: boolean): void {
    if (on) this.state.ticked.set(name, subject);
    else this.state.ticked.delete(name);
    this.touch();
  }

  untickAll(): void {
    this.state.ticked.clear();
    this.state.comparison = undefined;
    this.touch();
  }

  async compare(): Promise<void> {
    const told = await this.api.compare([...this.state.ticked.keys()]);
    if (!told.done) return this.say(told, 'Not compared');
    await this.follow(told.value.job, (job) => {
      this.state.comparison = job;
    });
  }

  /** Has something done with the session that is open. */
  async work(work: Work): Promise<void> {
    const { open } = this.state;
    if (open === undefined) return;
    const told = await this.api.work(open, work);
    if (!told.done) return this.say(told, 'Not done');
    this.state.notice = undefined;
    await this.followFor(open, jobKey(work), told.value.job);
  }

  async showReport(): Promise<void> {
    await this.work({ do: 'report' });
    if (this.state.jobs.get('report')?.state === 'done') this.setReportShown(true);
  }

  setReportShown(shown: boolean): void {
    this.state.reportShown = shown;
    this.touch();
  }

  async cancel(job: JobTold): Promise<void> {
    const told = await this.api.cancel(job.id);
    if (!told.done) this.say(told, 'Not cancelled');
  }

  dismiss(): void {
    this.state.notice = undefined;
    this.touch();
  }

  private close(): void {
    Object.assign(this.state, { open: undefined, session: undefined, reportShown: false });
    this.state.jobs = new Map();
    this.touch();
  }

  private async open(name: string): Promise<void> {
    this.close();
    this.state.open = name;
    this.touch();
    await this.refresh(name);
    if (this.state.open !== name || !this.state.session) return;
    await this.adopt(name);
    const { session } = this.state;
    const { recording, bad } = session.row;
    // Asked for while it is on its way, it is the same job.
    if (!session.summary && !recording && bad === null) await this.work({ do: 'summary' });
  }

  /** Work on this session that was begun before the page was loaded, or by somebody else. */
  private async adopt(name: string): Promise<void> {
    const told = await this.api.jobs();
    if (!told.done) return;
    const seen = new Set(this.state.jobs.keys());
    // The newest first; what it came to is not in the list.
    for (const { id, kind, about, state } of told.value.jobs) {
      if (about.length !== 1 || about[0] !== name || seen.has(kind)) continue;
      if (state === 'failed' || state === 'cancelled') continue;
      seen.add(kind);
      void this.followFor(name, kind, id, state === 'done');
    }
  }

  private async refresh(name: string): Promise<void> {
    const told = await this.api.session(name);
    if (this.state.open !== name) return;
    if (told.done) this.state.session = told.value;
    else this.say(told, 'The session cannot be shown');
    this.touch();
  }

  /**
   * Follows a job of a session, and asks about the session again when it is done.
   * @param known it was done before the session was asked about
   */
  private async followFor(name: string, key: string, id: string, known = false): Promise<void> {
    await this.follow(id, (job) => {
      if (this.state.open === name) this.state.jobs.set(key, job);
    });
    if (this.state.open !== name || known) return;
    await this.refresh(name);
    await this.list();
  }

  /** Asks how far a job is until it has ended. */
  private async follow(id: string, take: (job: JobTold) => void): Promise<void> {
    if (this.followed.has(id)) return;
    this.followed.add(id);
    try {
      for (;;) {
        const told = await this.api.job(id);
        if (!told.done) return this.say(told, 'The work cannot be followed');
        take(told.value);
        this.touch();
        if (!isUnended(told.value)) return;
        await new Promise((resolve) => setTimeout(resolve, FOLLOW_MS));
      }
    } finally {
      this.followed.delete(id);
    }
  }

  /** The list as it is now, and again in a while: sessions begin and end. */
  private async list(): Promise<void> {
    clearTimeout(this.listTimer);
    const asked = ++this.asked;
    const told = await this.api.list(this.state.query);
    // A newer search is on its way: its answer is the one to show.
    if (asked !== this.asked) return;
    if (told.done) {
      this.state.list = told.value;
      this.seeWhetherEnded(told.value.rows);
    } else this.say(told, 'The sessions cannot be listed');
    this.touch();
    if (this.inFront) this.listTimer = setTimeout(() => void this.list(), LIST_MS);
  }

  /** The session that is open was being recorded and is not any more: there is more to show. */
  private seeWhetherEnded(rows: readonly SessionRow[]): void {
    const { open, session } = this.state;
    const row = rows.find(({ name }) => name === open);
    if (open !== undefined && row && session?.row.recording && !row.recording) void this.open(open);
  }

  private async listRules(): Promise<void> {
    const told = await this.api.rulesFiles();
    if (told.done) this.state.rulesFiles = told.value.files;
    this.touch();
  }

  private say(told: Extract<Told<unknown>, { done: false }>, what: string): void {
    this.state.notice = { kind: 'bad', text: `${what}: ${told.text}`, remedy: told.remedy };
    this.touch();
  }
}
