import { execFileSync } from 'node:child_process';
import {
  cpSync,
  existsSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { Ajv2020 } from 'ajv/dist/2020.js';
import type { FastifyInstance } from 'fastify';
import { afterAll, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { packageRoot } from '../../../server/packageRoot.js';
import { readDescription, updateDescription } from '../../../server/session/description.js';
import { mend } from '../../../server/session/record/mend.js';
import { lockRecord, unlockRecord } from '../../../server/session/record/recordLock.js';
import { noteReplay } from '../../../server/session/selfCheck.js';
import type { JobTold } from '../../../server/web/jobs/jobMessages.js';
import type {
  SessionTold,
  SummaryTold,
  Work,
} from '../../../server/web/records/recordsMessages.js';
import { recordedSession } from '../../analysis/recorded.js';
import { startWeb, until } from '../webRig.js';
import { recordsFolder } from './folders.js';

/** As long as the longest that the program gives. */
const NAME = `2026-03-04_09-30-00_${'m'.repeat(40)}_${'t'.repeat(40)}_2`;
let root: string;
let folder: string;
let untouched: string;
let app: FastifyInstance;

/** One real session, recorded and finished once; each test has a folder of its own with a copy. */
beforeAll(async () => {
  const made = recordedSession({ minutes: 2 });
  await mend(made.folder);
  await noteReplay(made.folder);
  untouched = recordsFolder();
  cpSync(made.folder, join(untouched, NAME), { recursive: true });
  made.remove();
});
afterAll(() => rmSync(untouched, { recursive: true, force: true }));

beforeEach(async () => {
  root = recordsFolder();
  folder = join(root, NAME);
  cpSync(join(untouched, NAME), folder, { recursive: true });
  app = (await startWeb({ records: root, rulesFolder: demoRules })).app;
  return () => rmSync(root, { recursive: true, force: true });
});
/** Not there, not valid, too long. */
const REFUSED = [404, 400, 414];
const demoRules = join(packageRoot, 'hardware-sim/demo/sessions');

const at = (name: string) => `/api/records/${encodeURIComponent(name)}`;
const ask = (work: Work, name = NAME) =>
  app.inject({ method: 'POST', url: `${at(name)}/work`, payload: work });
const job = async (id: string): Promise<JobTold> => (await app.inject(`/api/jobs/${id}`)).json();
/** However long it takes: jobs give way to all else on the machine. */
const ended = async (id: string): Promise<JobTold> => {
  for (;;) {
    const told = await job(id);
    if (told.state !== 'waiting' && told.state !== 'running') return told;
    await new Promise((resolve) => setTimeout(resolve, 20));
  }
};
const session = async (name = NAME): Promise<SessionTold> => (await app.inject(at(name))).json();

/** Has something done and waits for what comes of it. */
async function resultOf<T>(work: Work): Promise<T> {
  const begun = await ask(work);
  expect([begun.statusCode, begun.json().done]).toEqual([200, true]);
  const told = await ended(begun.json().job);
  if (told.state !== 'done') throw new Error(JSON.stringify(told));
  return told.result as T;
}

/** Bytes of an answer as a file, for other programs to read. */
async function fetched(what: string): Promise<string> {
  const answer = await app.inject(`${at(NAME)}/download?what=${what}`);
  expect(answer.statusCode).toBe(200);
  const file = join(root, `.${what}.file`);
  writeFileSync(file, answer.rawPayload);
  return file;
}

describe('the records over HTTP', { timeout: 150_000 }, () => {
  test('are listed, and one is told with what it says of itself', async () => {
    const { rows, total } = (await app.inject('/api/records?subject=m07&sort=title')).json();
    expect([total, rows.length, rows[0].name]).toEqual([1, 1, NAME]);
    const told = await session();
    expect(told.row).toMatchObject({ subject: 'm07', record: 'whole', check: 'identical' });
    expect(told.description).toEqual(readDescription(folder));
    expect(told.recordBytes).toBe(statSync(join(folder, 'record.mcap')).size);
    expect(told.made).toEqual({ report: null, tables: null, parquet: null, nwb: null });
    expect(told.summary).toBeNull();
  });

  test('refuse every name that is none of theirs, and every query that is none', async () => {
    const names = ['..', '../..', `../${NAME}`, `${NAME}/derived`, 'x'.repeat(300), 'a\0b'];
    for (const name of names) {
      for (const url of [at(name), `${at(name)}/report`, `${at(name)}/download?what=session`]) {
        const { statusCode } = await app.inject(url);
        expect([url, REFUSED.includes(statusCode)]).toEqual([url, true]);
      }
      const { statusCode } = await ask({ do: 'mend' }, name);
      expect([name, REFUSED.includes(statusCode)]).toEqual([name, true]);
    }
    const bad = ['offset=-1', 'limit=0', 'limit=201', 'from=yesterday', 'sort=mood', 'path=/etc'];
    for (const query of bad) {
      expect([query, (await app.inject(`/api/records?${query}`)).statusCode]).toEqual([query, 400]);
    }
    const works = [{}, { do: 'erase' }, { do: 'export' }, { do: 'export', to: 'xls' }];
    for (const work of [...works, { do: 'what if' }, { do: 'mend', folder: '/' }]) {
      expect((await ask(work as Work)).statusCode).toBe(400);
    }
    for (const rules of ['../rig.yaml', '/etc/passwd', 'none.yaml']) {
      const { statusCode } = await ask({ do: 'what if', rules });
      expect([rules, statusCode >= 400 && statusCode < 500]).toEqual([rules, true]);
    }
    expect((await app.inject(`${at(NAME)}/download?what=rig.yaml`)).statusCode).toBe(400);
    expect((await app.inject(`${at(NAME)}/download?what=nwb`)).json().code).toBe('WEB_NOT_MADE');
    expect((await app.inject(`${at(NAME)}/report`)).json().code).toBe('WEB_NOT_MADE');
  });

  test('without a records folder say so', async () => {
    const { app } = await startWeb();
    const answer = await app.inject('/api/records');
    expect([answer.statusCode, answer.json().code]).toEqual([503, 'WEB_NO_RECORDS']);
  });

  test('look as the description says', async () => {
    const description = (await app.inject('/api/openapi.json')).json();
    const ajv = new Ajv2020({ strict: false, validateFormats: false });
    ajv.addSchema({ $id: 'lapwing', components: description.components });
    const matches = (name: string, body: unknown) => {
      const check = ajv.compile({ $ref: `lapwing#/components/schemas/${name}` });
      return check(body) ? [] : check.errors;
    };
    await resultOf({ do: 'summary' });
    const begun = (await ask({ do: 'replay' })).json();
    expect(matches('JobBegun', begun)).toEqual([]);
    await ended(begun.job);
    expect(matches('SessionList', (await app.inject('/api/records')).json())).toEqual([]);
    expect(matches('Session', await session())).toEqual([]);
    expect(matches('Job', await job(begun.job))).toEqual([]);
    expect(matches('JobList', (await app.inject('/api/jobs')).json())).toEqual([]);
    expect(matches('Work', { do: 'export', to: 'nwb' })).toEqual([]);
    expect(matches('Session', {})).not.toEqual([]);
  });
});

describe('work on a record', { timeout: 150_000 }, () => {
  test('sums up what happened, and keeps that until the record changes', async () => {
    const summary = await resultOf<SummaryTold>({ do: 'summary' });
    expect(summary.laps).toBeGreaterThan(3);
    expect(summary.minutes).toBeCloseTo(2, 0);
    const water = summary.rules.find(({ name }) => name === 'water')!;
    expect(water.fired).toBeGreaterThan(0);
    const drops = summary.firings.filter(({ rule }) => rule === 'water');
    expect(drops).toHaveLength(water.fired);
    for (const { errorMm, atCm, placeCm } of drops) {
      expect(Math.abs(errorMm!)).toBeCloseTo(Math.abs(atCm! - placeCm!) * 10, 3);
    }
    expect(drops.reduce((most, { errorMm }) => Math.max(most, Math.abs(errorMm!)), 0)).toBe(
      water.armed!.worstMm,
    );
    expect((await session()).summary).toEqual(summary);
    // Bytes at its end that are no record: whoever asks next gets none that is old.
    writeFileSync(join(folder, 'record.mcap'), 'x', { flag: 'a' });
    expect((await session()).summary).toBeNull();
  });

  test('makes the report, which no page but our own may frame and no script may be in', async () => {
    await resultOf({ do: 'report' });
    const answer = await app.inject(`${at(NAME)}/report`);
    expect(answer.statusCode).toBe(200);
    expect(answer.body).toContain('Proof sheet');
    const policy = String(answer.headers['content-security-policy']);
    expect(policy).toContain("default-src 'none'");
    expect(policy).toContain("frame-ancestors 'self'");
    expect(policy).not.toContain('script-src');
    expect((await session()).made.report).toMatchObject({ old: false });
    const saved = await fetched('report');
    expect(readFileSync(saved, 'utf8')).toBe(answer.body);
  });

  test('replays it, and tells where a record was tampered with', async () => {
    expect(await resultOf({ do: 'replay' })).toMatchObject({ difference: null, missing: [] });
    // Another seed is another session: the record's draws are not those that it gives.
    updateDescription(folder, { seed: 'another' });
    const told = await resultOf<{ difference: { recorded: string; replayed: string } }>({
      do: 'replay',
    });
    expect(told.difference.recorded).not.toBe(told.difference.replayed);
  });

  test('tells what other rules would have done, firing by firing', async () => {
    const told = await resultOf<{ rows: { rule: string; verdict: string }[]; title: string }>({
      ...{ do: 'what if', rules: '01-fixed-place.yaml' },
    });
    expect(told.title).toBe('Water at one place, day 1');
    const verdicts = told.rows.filter(({ rule }) => rule === 'water').map((row) => row.verdict);
    expect(verdicts.length).toBeGreaterThan(0);
    const begun = await ask({ do: 'what if', rules: 'm12-earned.csv' });
    expect([begun.statusCode, begun.json().code]).toEqual([422, 'WEB_RULES_PATH']);
  });

  test('exports it, to be taken along as one file that other programs read', async () => {
    for (const to of ['tables', 'parquet', 'nwb'] as const) await resultOf({ do: 'export', to });
    const { made } = await session();
    for (const to of ['tables', 'parquet', 'nwb'] as const) {
      expect(made[to]).toMatchObject({ old: false, bytes: expect.any(Number) });
    }
    const nwb = await fetched('nwb');
    expect(readFileSync(nwb)).toEqual(readFileSync(join(folder, 'derived/session.nwb')));
    for (const what of ['tables', 'parquet', 'session']) {
      const zip = await fetched(what);
      const into = join(root, `.${what}`);
      // Info-ZIP: another hand's reader, which checks every CRC.
      execFileSync('unzip', ['-q', zip, '-d', into]);
      const [top] = readdirSync(into);
      const of = what === 'session' ? folder : join(folder, 'derived', what);
      const files = readdirSync(of, { recursive: true }).map(String).sort();
      expect(readdirSync(join(into, top!), { recursive: true }).map(String).sort()).toEqual(files);
      for (const file of files) {
        if (statSync(join(of, file)).isDirectory()) continue;
        expect(readFileSync(join(into, top!, file)).equals(readFileSync(join(of, file)))).toBe(
          true,
        );
      }
    }
  });

  test('closes one that a crash left open, and says what it lacks', async () => {
    // As a power cut leaves it: not ended, and its last bytes not there.
    const file = join(folder, 'record.mcap');
    truncateSync(file, statSync(file).size - 1000);
    const { record: _, replay: __, ...rest } = readDescription(folder);
    writeFileSync(join(folder, 'session.json'), JSON.stringify({ ...rest, ended: null }));
    expect((await session()).row).toMatchObject({ ended: null, record: null });
    const told = await resultOf<{ missing: string[]; identical: boolean }>({ do: 'mend' });
    expect(told.identical).toBe(true);
    expect(told.missing.length).toBeGreaterThan(0);
    await until(async () => (await session()).row.ended?.how === 'mended');
    const { row } = await session();
    expect(row.record).not.toBe('whole');
    expect(row.check).toBe('identical');
    // What could not be read stays beside it.
    expect(existsSync(join(folder, 'original-1.mcap'))).toBe(true);
  });

  test('compares sessions of one animal, and refuses those of two', async () => {
    cpSync(folder, join(root, 'second'), { recursive: true });
    cpSync(folder, join(root, 'other'), { recursive: true });
    updateDescription(join(root, 'second'), { startedAt: '2026-03-05T09:30:00.000Z' });
    updateDescription(join(root, 'other'), { subject: 'm08' });
    const compare = (sessions: string[]) =>
      app.inject({ method: 'POST', url: '/api/comparisons', payload: { sessions } });
    await until(async () => (await app.inject('/api/records')).json().total === 3);
    const begun = (await compare([NAME, 'second'])).json();
    const told = await ended(begun.job);
    if (told.state !== 'done') throw new Error(JSON.stringify(told));
    const { days } = told.result as { days: { name: string; laps: number }[] };
    expect(days).toHaveLength(2);
    expect(days[0]!.laps).toBe(days[1]!.laps);
    const page = await app.inject(`/api/comparisons/${begun.job}`);
    expect(page.headers['content-type']).toMatch(/html/);
    expect(page.body).toContain('m07');
    const mixed = await compare([NAME, 'other']);
    expect([mixed.statusCode, mixed.json().code]).toEqual([422, 'WEB_OTHER_SUBJECTS']);
    for (const sessions of [[NAME], [NAME, NAME], [NAME, 'none'], []]) {
      expect((await compare(sessions)).statusCode).toBeGreaterThanOrEqual(400);
    }
  });

  test('waits until a session that is being recorded has ended', async () => {
    updateDescription(folder, { ended: null });
    lockRecord(folder);
    try {
      await until(async () => (await session()).row.recording);
      for (const work of ['summary', 'report', 'replay', 'mend'] as const) {
        const answer = await ask({ do: work });
        expect([answer.statusCode, answer.json().code]).toEqual([409, 'RECORD_BUSY']);
      }
      const answer = await app.inject(`${at(NAME)}/download?what=session`);
      expect([answer.statusCode, answer.json().code]).toEqual([409, 'RECORD_BUSY']);
    } finally {
      unlockRecord(folder);
    }
  });

  test('of a folder that cannot be read fails, and says why', async () => {
    rmSync(join(folder, 'rig.yaml'));
    const begun = (await ask({ do: 'report' })).json();
    const told = await ended(begun.job);
    expect(told).toMatchObject({ state: 'failed', detail: expect.stringContaining('rig.yaml') });
    rmSync(join(folder, 'record.mcap'));
    const second = await ended((await ask({ do: 'summary' })).json().job);
    expect(second).toMatchObject({ state: 'failed', code: 'RECORD_MISSING' });
  });

  test('cancelled leaves nothing half made', async () => {
    const begun = (await ask({ do: 'export', to: 'tables' })).json();
    const derived = join(folder, 'derived');
    await until(() => existsSync(derived) && readdirSync(derived).length > 0);
    const gone = await app.inject({ method: 'DELETE', url: `/api/jobs/${begun.job}` });
    expect(gone.statusCode).toBe(200);
    // It may have been done in the same instant.
    const { state } = await job(begun.job);
    if (state === 'done') return;
    expect(state).toBe('cancelled');
    await until(() => readdirSync(derived).length === 0);
  });
});
