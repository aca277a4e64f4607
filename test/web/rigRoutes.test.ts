/** The Rig page's routes against a whole service on the simulated rig, by the page's own examples. */
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { GuideTold, RigTold } from '../../server/web/rig/rigMessages.js';
import { ServedRig } from '../tools/servedRig.js';
import { until } from './webRig.js';

const page = readFileSync(new URL('../../server/web/HTTP.md', import.meta.url), 'utf8');

/** What HTTP.md gives as a body for this request. */
function example(path: string): unknown {
  const found = new RegExp(`^\\| \`POST ${path}\` +\\| \`(.+)\` +\\|$`, 'm').exec(page);
  return JSON.parse(found![1]!);
}

let rig: ServedRig;
beforeAll(async () => {
  rig = await ServedRig.start();
}, 120_000);
afterAll(() => rig?.stop());

async function ask(method: string, path: string, body?: unknown) {
  const response = await fetch(rig.url + path, {
    method,
    ...(body === undefined
      ? {}
      : { headers: { 'content-type': 'application/json' }, body: JSON.stringify(body) }),
  });
  return { status: response.status, body: (await response.json()) as Record<string, unknown> };
}
const guide = async () => (await ask('GET', '/api/rig/guide')).body as unknown as GuideTold;
const told = async () => (await ask('GET', '/api/rig')).body as unknown as RigTold;

describe("the Rig page's routes", { timeout: 120_000 }, () => {
  it('tell the rig: each setting with its meaning, whether the file says it or not', async () => {
    const { settings, outputs, calibrations, preflight } = await told();
    const length = settings.find(({ path }) => path.join('.') === 'belt.length');
    expect(length).toMatchObject({ value: '60 cm', meaning: expect.stringContaining('measured') });
    const unsaid = settings.find(({ path }) => path.join('.') === 'board.baud');
    expect(unsaid).toMatchObject({ value: null, meaning: expect.stringContaining('500000') });
    expect(outputs[0]).toMatchObject({ name: 'valve', kind: 'valve', longestOnUs: 250_000 });
    expect(calibrations).toEqual([]);
    expect(preflight).toBeNull();
  });

  it('try an output as the example says, and say what the board measured', async () => {
    const body = example('/api/rig/try');
    let answer = await ask('POST', '/api/rig/try', body);
    // A loaded machine may have been too late for it.
    for (let n = 0; n < 5 && answer.body.code === 'BENCH_LATE'; n++) {
      answer = await ask('POST', '/api/rig/try', body);
    }
    expect(answer).toMatchObject({ status: 200, body: { tried: { onUs: 10_000 } } });
    const { items, last } = (await ask('GET', '/api/rig/bench?after=0')).body as {
      items: { is: string }[];
      last: number;
    };
    expect(items.some(({ is }) => is === 'output')).toBe(true);
    expect(last).toBeGreaterThan(0);
    const long = await ask('POST', '/api/rig/try', { ...(body as object), widthMs: 500 });
    expect(long).toMatchObject({ status: 409, body: { code: 'BENCH_WITHHELD' } });
  });

  it('go through a guide by its questions, keep the result and put one in force', async () => {
    expect((await ask('POST', '/api/rig/guide', example('/api/rig/guide'))).status).toBe(200);
    await until(async () => (await guide()).state === 'asking');
    // One at a time, and nothing is tried beside it.
    expect((await ask('POST', '/api/rig/guide', { guide: 'belt' })).status).toBe(409);
    expect((await ask('POST', '/api/rig/try', example('/api/rig/try'))).status).toBe(409);
    const wrong = { number: 1, answers: { pulses: 1 } };
    expect((await ask('POST', '/api/rig/guide/answer', wrong)).body.code).toBe('CALIBRATE_ANSWER');
    const late = { number: 7, answers: {} };
    expect((await ask('POST', '/api/rig/guide/answer', late)).status).toBe(422);
    const answer = example('/api/rig/guide/answer');
    expect((await ask('POST', '/api/rig/guide/answer', answer)).status).toBe(200);
    await until(async () => {
      const now = await guide();
      return now.state === 'asking' && now.view.title === 'Found';
    }, 60_000);
    await ask('POST', '/api/rig/guide/answer', { number: 2, answers: {} });
    await until(async () => (await guide()).state === 'done');
    expect(await guide()).toMatchObject({ usable: false, kept: { kind: 'latency' } });
    expect((await told()).calibrations).toMatchObject([{ kind: 'latency', inForce: false }]);
    await ask('DELETE', '/api/rig/guide');
    expect(await guide()).toEqual({ state: 'none' });
  });

  it('put no calibration in force that is not there, or that leads elsewhere', async () => {
    const missing = await ask(
      'POST',
      '/api/rig/calibrations/use',
      example('/api/rig/calibrations/use'),
    );
    expect(missing.body.code).toBe('CALIBRATION_BAD');
    const elsewhere = await ask('POST', '/api/rig/calibrations/use', { name: '../rig' });
    expect(elsewhere.body.code).toBe('CALIBRATION_BAD');
    const [latency] = (await told()).calibrations;
    const useless = await ask('POST', '/api/rig/calibrations/use', { name: latency!.name });
    expect(useless.body.code).toBe('CALIBRATION_UNSTORED');
    expect(readFileSync(join(rig.folder, 'rig.yaml'), 'utf8')).not.toContain(
      'calibration: latency',
    );
  });

  it('begin a pre-flight and stop it, with nothing kept', async () => {
    await ask('POST', '/api/rig/preflight', example('/api/rig/preflight'));
    await until(async () => (await guide()).state !== 'none');
    await ask('DELETE', '/api/rig/guide');
    await until(async () => (await guide()).state === 'failed');
    expect(await guide()).toMatchObject({ detail: 'It was stopped on the Rig page.' });
    expect((await told()).preflight).toBeNull();
  });
});
