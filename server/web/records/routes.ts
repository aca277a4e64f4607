/** The Records page's half of the HTTP interface: finding sessions, and working on their records. */
import fs from 'node:fs/promises';
import type { FastifyInstance, FastifyReply } from 'fastify';
import { compiledScript } from '../../askChild.js';
import { LapwingError } from '../../errors/codes.js';
import { learningPage } from '../../export/report/learningPage.js';
import { packageVersion } from '../../packageRoot.js';
import { refuseSealed } from '../../session/blinding/arms.js';
import { readDescription } from '../../session/description.js';
import type { Jobs } from '../jobs/jobs.js';
import type { RulesFolder } from '../rules/rulesFolder.js';
import { Downloads } from './download.js';
import { learningDays } from './learningDays.js';
import { madeOf, madePath, tidyDerived } from './made.js';
import type {
  Download,
  LearningTold,
  SessionList,
  SessionQuery,
  SessionRow,
  SessionTold,
  Work,
} from './recordsMessages.js';
import type { RecordsTask } from './recordsTask.js';
import { recordsBodies, recordsParams, recordsQueries } from './schemas.js';
import { searchSessions } from './search.js';
import { SessionIndex } from './sessionIndex.js';

const SCRIPT = compiledScript(import.meta.url, '../../main/recordsProcess.js');

export interface RecordsRouteOptions {
  /** Absolute; without it these routes answer WEB_NO_RECORDS. */
  readonly records: string | undefined;
  /** Where other rules files to try come from. */
  readonly rules: RulesFolder | undefined;
  readonly jobs: Jobs;
}

type Named = { Params: { name: string } };
/** As it comes in the address: every value is text. */
type AskedQuery = { readonly [key in keyof SessionQuery]: string };

/** Nothing on the rig changes: no need to hold its controls. */
const OPERATOR = { needs: 'operator' } as const;

/** A page made here brings its own style, and nothing else; only Lapwing's own page may frame it. */
const PAGE_HEADERS = {
  'content-security-policy':
    "default-src 'none'; style-src 'unsafe-inline'; img-src data:; base-uri 'none'; form-action 'none'; frame-ancestors 'self'",
  'x-frame-options': 'SAMEORIGIN',
};

export function addRecordsRoutes(app: FastifyInstance, options: RecordsRouteOptions): void {
  const { records, rules, jobs } = options;
  const index = records === undefined ? undefined : new SessionIndex(records);
  const downloads = new Downloads();

  const need = (): SessionIndex => {
    if (!index) throw new LapwingError('webNoRecords', 'No records folder was named.');
    return index;
  };

  app.get<{ Querystring: AskedQuery }>(
    '/api/records',
    { schema: { querystring: recordsQueries.search } },
    async (request): Promise<SessionList> =>
      searchSessions(await need().rows(), queryOf(request.query)),
  );

  app.get<Named>(
    '/api/records/:name',
    { schema: { params: recordsParams } },
    async (request): Promise<SessionTold> => {
      const { row, folder } = await need().find(request.params.name);
      const description = row.bad === null ? readDescription(folder) : null;
      return { row, description, ...(await madeOf(folder, packageVersion)) };
    },
  );

  app.post<Named & { Body: Work }>(
    '/api/records/:name/work',
    { config: OPERATOR, schema: { params: recordsParams, body: recordsBodies.work } },
    async (request) => {
      const { row, folder } = await need().find(request.params.name);
      refuseRecording(row);
      return { done: true, job: begin(taskOf(request.body, folder), [row.name], folder) };
    },
  );

  app.post<{ Body: { sessions: string[] } }>(
    '/api/comparisons',
    { config: OPERATOR, schema: { body: recordsBodies.compare } },
    async (request) => {
      const found = [];
      for (const name of request.body.sessions) found.push(await need().find(name));
      checkComparable(found.map(({ row }) => row));
      const folders = found.map(({ folder }) => folder);
      const names = found.map(({ row }) => row.name);
      return { done: true, job: begin({ do: 'learning', folders }, names) };
    },
  );

  app.get<Named>(
    '/api/records/:name/report',
    { schema: { params: recordsParams } },
    async (request, reply) => {
      const { row, folder } = await need().find(request.params.name);
      const page = await fs
        .readFile(madePath(folder, 'report'))
        .catch(() => notMade(row, 'report'));
      return reply.headers(PAGE_HEADERS).type('text/html; charset=utf-8').send(page);
    },
  );

  app.get<Named & { Querystring: { what: Download } }>(
    '/api/records/:name/download',
    { schema: { params: recordsParams, querystring: recordsQueries.download } },
    async (request, reply) => {
      const { row, folder } = await need().find(request.params.name);
      refuseRecording(row);
      if (request.query.what === 'session' && row.bad === null) {
        refuseSealed(readDescription(folder).blinding, 'The raw record');
      }
      return send(reply, row, folder, request.query.what);
    },
  );

  app.get<{ Params: { id: string } }>('/api/comparisons/:id', async (request, reply) => {
    const told = jobs.told(request.params.id);
    if (told.kind !== 'learning' || told.state !== 'done') {
      throw new LapwingError('webNotMade', `Job ${told.id} has no page: it is ${told.state}.`);
    }
    const page = learningPage(learningDays(told.result as LearningTold));
    return reply.headers(PAGE_HEADERS).type('text/html; charset=utf-8').send(page);
  });

  function begin(task: RecordsTask, about: readonly string[], folder?: string): string {
    const tidy = folder && ((pid: number) => void tidyDerived(folder, pid).catch(() => {}));
    const kind = task.do === 'export' ? `export ${task.to}` : task.do;
    return jobs.begin({ kind, about, script: SCRIPT, task, ...(tidy ? { tidy } : {}) });
  }

  function taskOf(work: Work, folder: string): RecordsTask {
    if (work.do !== 'what if') return { ...work, folder };
    if (!rules) throw new LapwingError('webNoRig', '`--rig-file` was not given.');
    return { ...work, folder, rulesPath: rules.pathOf(work.rules) };
  }

  async function send(reply: FastifyReply, row: SessionRow, folder: string, what: Download) {
    const { name } = row;
    if (what === 'session') return downloads.zip(reply, folder, name);
    const made = madePath(folder, what);
    const stat = await fs.lstat(made).catch(() => notMade(row, what));
    if (stat.isDirectory()) return downloads.zip(reply, made, `${name}_${what}`);
    if (!stat.isFile()) notMade(row, what);
    const [type, ending] = what === 'report' ? ['text/html', 'html'] : ['application/x-hdf5', what];
    return downloads.file(reply, made, `${name}.${ending}`, type);
  }
}

function notMade({ name }: SessionRow, what: string): never {
  throw new LapwingError('webNotMade', `${name} has no ${what} yet.`);
}

function refuseRecording({ name, recording }: SessionRow): void {
  if (recording) throw new LapwingError('recordBusy', `${name} is being recorded now.`);
}

function checkComparable(rows: readonly SessionRow[]): void {
  const subjects = [...new Set(rows.map(({ subject }) => subject))];
  const bad = rows.find((row) => row.bad !== null);
  if (bad) throw new LapwingError('webOtherSubjects', `${bad.name}: ${bad.bad}.`);
  if (subjects.length > 1) {
    throw new LapwingError('webOtherSubjects', `They are of ${subjects.join(', ')}.`);
  }
  for (const row of rows) refuseRecording(row);
}

/** The schema has let through only what can be read as such. */
function queryOf({ offset, limit, ...rest }: AskedQuery): SessionQuery {
  return {
    ...(rest as Omit<SessionQuery, 'offset' | 'limit'>),
    ...(offset === undefined ? {} : { offset: Number(offset) }),
    ...(limit === undefined ? {} : { limit: Number(limit) }),
  };
}
