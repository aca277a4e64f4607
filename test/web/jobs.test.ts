import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, afterEach, describe, expect, test } from 'vitest';
import { type JobLimits, Jobs } from '../../server/web/jobs/jobs.js';
import { until } from './webRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-jobs-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** A process that does as its task says: answers at once, waits for good, or dies. */
const script = join(folder, 'work.mjs');
writeFileSync(
  script,
  `process.once('message', ({ does, with: value }) => {
    process.send({ report: 'progress', done: 0.5, doing: 'half of it' });
    if (does === 'answer') process.send({ report: 'done', result: value });
    if (does === 'refuse') {
      process.send({ report: 'failed', code: 'RECORD_MISSING', detail: 'none', remedy: 'look' });
    }
    if (does === 'die') process.exit(7);
    if (does === 'wait') setInterval(() => {}, 1000);
    else process.disconnect();
  });`,
);

let jobs: Jobs;
afterEach(() => jobs.close());

const withLimits = (limits: Partial<JobLimits> = {}) => {
  jobs = new Jobs(limits);
};
const plan = (does: string, value: unknown = null, tidy?: (pid: number) => void) => ({
  ...{ kind: does, about: [String(value)], script, task: { does, with: value } },
  ...(tidy ? { tidy } : {}),
});
const stateOf = (id: string) => jobs.told(id).state;
const ended = (id: string) => until(() => !['waiting', 'running'].includes(stateOf(id)));

describe('long work', () => {
  test('is done one after another; how far it is and what came of it is told', async () => {
    withLimits();
    const ids = [1, 2, 3].map((n) => jobs.begin(plan('answer', n)));
    expect(ids.map(stateOf)).toEqual(['running', 'waiting', 'waiting']);
    expect(ids.map((id) => jobs.told(id))).toMatchObject([{}, { ahead: 1 }, { ahead: 2 }]);
    for (const id of ids) await ended(id);
    expect(ids.map((id) => jobs.told(id))).toMatchObject([1, 2, 3].map((n) => ({ result: n })));
    expect(jobs.list().map(({ id }) => id)).toEqual([...ids].reverse());
    // Results can be long: the list leaves them to whoever asks for one.
    expect(jobs.list()).toMatchObject([{ result: null }, { result: null }, { result: null }]);

    const waiting = jobs.begin(plan('wait'));
    await until(() => {
      const told = jobs.told(waiting);
      return told.state === 'running' && told.done === 0.5 && told.doing === 'half of it';
    });
  });

  test('asked for twice while it is on its way is the same; asked for again later, another', async () => {
    withLimits();
    jobs.begin(plan('wait'));
    const first = jobs.begin(plan('answer', 'a'));
    expect(jobs.begin(plan('answer', 'a'))).toBe(first);
    expect(jobs.begin(plan('answer', 'b'))).not.toBe(first);
    jobs.cancel(jobs.list().at(-1)!.id);
    await ended(first);
    expect(jobs.begin(plan('answer', 'a'))).not.toBe(first);
  });

  test('cancelled, running or waiting, ends; what it half made is cleared, and the next begins', async () => {
    withLimits();
    const cleared: number[] = [];
    const running = jobs.begin(plan('wait', 1, (pid) => void cleared.push(pid)));
    const waiting = jobs.begin(plan('wait', 2, (pid) => void cleared.push(pid)));
    const next = jobs.begin(plan('answer', 3));
    jobs.cancel(waiting);
    jobs.cancel(running);
    expect([running, waiting].map(stateOf)).toEqual(['cancelled', 'cancelled']);
    await ended(next);
    expect(jobs.told(next)).toMatchObject({ state: 'done', result: 3 });
    // One was never begun.
    expect(cleared).toHaveLength(1);
    expect(cleared[0]).toBeGreaterThan(0);
    jobs.cancel(next);
    expect(stateOf(next)).toBe('done');
  });

  test('that fails or dies says so', async () => {
    withLimits({ atOnce: 2 });
    const refused = jobs.begin(plan('refuse'));
    const dead = jobs.begin(plan('die'));
    for (const id of [refused, dead]) await ended(id);
    expect(jobs.told(refused)).toMatchObject({ code: 'RECORD_MISSING', detail: 'none' });
    expect(jobs.told(dead)).toMatchObject({
      code: 'WEB_JOB_DIED',
      detail: 'Its process left early: status 7.',
    });
  });

  test('that takes too long is stopped', async () => {
    withLimits({ mostMs: 300 });
    const endless = jobs.begin(plan('wait'));
    await ended(endless);
    expect(jobs.told(endless)).toMatchObject({
      code: 'WEB_JOB_DIED',
      detail: 'It had not ended after 0.3 s.',
    });
  });

  test('waits only so much of it, and only the last results are kept', async () => {
    withLimits({ mostWaiting: 2, mostKept: 2 });
    const first = jobs.begin(plan('wait'));
    jobs.begin(plan('answer', 1));
    jobs.begin(plan('answer', 2));
    expect(() => jobs.begin(plan('answer', 3))).toThrow('2 jobs are waiting');
    jobs.cancel(first);
    await until(() => jobs.list().every(({ state }) => state !== 'waiting' && state !== 'running'));
    jobs.begin(plan('answer', 4));
    expect(() => jobs.told(first)).toThrow('There is no job');
    expect(() => jobs.cancel('no such')).toThrow('There is no job');
  });
});
