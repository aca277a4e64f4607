import { describe, expect, test } from 'vitest';
import type { OperatorAct } from '../../../server/session/inputs.js';
import { until, Viewer } from '../webRig.js';
import { beginSession, type GuardedRig, startGuarded } from './signedIn.js';

const note = (text: string) => ({ act: { act: 'note', text } });

/** The acts that say who has the controls, as the loop was told them. */
function recorded({ loop }: GuardedRig): [who: string, act: OperatorAct][] {
  return loop.heard.flatMap((one): [string, OperatorAct][] =>
    one.say === 'act' && one.act.act === 'controls' ? [[one.who, one.act]] : [],
  );
}

describe('the controls', () => {
  test('are nobody’s until an operator takes them, and then only that browser acts', async () => {
    const rig = await startGuarded();
    const { ask, signIn } = rig;
    const [anna, alsoAnna, ben] = [await signIn('anna'), await signIn('anna'), await signIn('ben')];
    await beginSession(rig, anna);
    const refused = await ask('POST', '/api/acts', anna, note('too early'));
    expect([refused.status, refused.body.code]).toEqual([403, 'WEB_CONTROLS_ELSEWHERE']);
    expect(refused.body.detail).toContain('Nobody holds them');
    expect((await ask('POST', '/api/controls', anna, { take: true })).status).toBe(200);
    expect((await ask('POST', '/api/acts', anna, note('mine'))).status).toBe(200);
    for (const other of [alsoAnna, ben]) {
      const answer = await ask('POST', '/api/acts', other, note('mine too'));
      expect([answer.status, answer.body.detail]).toEqual([403, expect.stringContaining('anna')]);
    }
    expect(rig.loop.acts()).toContainEqual({ act: 'note', text: 'mine' });
    expect(rig.loop.acts()).toHaveLength(2);
  });

  test('are taken over only from whom one saw with them, and everybody is told at once', async () => {
    const rig = await startGuarded();
    const { ask, signIn, url } = rig;
    const anna = await rig.holder('anna');
    const [ben, vera] = [await signIn('ben'), await signIn('vera')];
    const page = new Viewer(url, '', { headers: vera });
    await until(() => page.all('controls').length === 1);
    expect(page.all('controls')[0]!.controls.holder).toMatchObject({ name: 'anna' });
    const { change } = page.all('controls')[0]!.controls;
    for (const seen of [undefined, change - 1]) {
      const blind = await ask('POST', '/api/controls', ben, {
        take: true,
        ...(seen === undefined ? {} : { seen }),
      });
      expect([blind.status, blind.body.code]).toEqual([409, 'WEB_CONTROLS_CHANGED']);
    }
    const took = await ask('POST', '/api/controls', ben, { take: true, seen: change });
    expect(took.body).toMatchObject({ change: change + 1, holder: { name: 'ben' } });
    await until(() => page.all('controls').length === 2);
    expect(page.all('controls')[1]!.controls).toEqual(took.body);
    expect((await ask('POST', '/api/end', anna, {})).status).toBe(403);
    expect((await ask('POST', '/api/end', ben, {})).status).toBe(200);
  });

  test('are taken by one of two who ask at the same moment', async () => {
    const rig = await startGuarded();
    const { ask, signIn } = rig;
    const [anna, ben] = [await signIn('anna'), await signIn('ben')];
    await beginSession(rig, anna);
    const answers = await Promise.all(
      [anna, ben].map((browser) => ask('POST', '/api/controls', browser, { take: true, seen: 0 })),
    );
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 409]);
    expect(recorded(rig)).toHaveLength(1);
  });

  test('and every change of them are acts in the record, from its beginning', async () => {
    const rig = await startGuarded();
    const { ask, signIn } = rig;
    const anna = await rig.holder('anna');
    expect(recorded(rig)).toEqual([]);
    await beginSession(rig, anna);
    await until(() => recorded(rig).length === 1);
    const ben = await signIn('ben');
    const { change } = (await ask('GET', '/api/controls', ben)).body;
    await ask('POST', '/api/controls', ben, { take: true, seen: change });
    await ask('POST', '/api/controls', anna, { take: false });
    await ask('POST', '/api/controls', ben, { take: false });
    expect(recorded(rig)).toEqual([
      ['Lapwing', { act: 'controls', holder: 'anna', before: 'anna' }],
      ['ben', { act: 'controls', holder: 'ben', before: 'anna' }],
      ['ben', { act: 'controls', holder: null, before: 'ben' }],
    ]);
  });

  test('do not change hands while the loop cannot record it', async () => {
    const rig = await startGuarded({ loopTimeoutMs: 100 });
    const { ask, signIn } = rig;
    const anna = await rig.holder('anna');
    const ben = await signIn('ben');
    await beginSession(rig, anna);
    await until(() => recorded(rig).length === 1);
    rig.loop.silent = true;
    const { change } = (await ask('GET', '/api/controls', ben)).body;
    const answer = await ask('POST', '/api/controls', ben, { take: true, seen: change });
    expect([answer.status, answer.body.code]).toEqual([504, 'LOOP_SILENT']);
    expect((await ask('GET', '/api/controls', ben)).body.holder.name).toBe('anna');
  });

  test('are nobody’s once the holder signs out', async () => {
    const rig = await startGuarded();
    const { ask, signIn } = rig;
    const anna = await rig.holder('anna');
    await beginSession(rig, anna);
    await until(() => recorded(rig).length === 1);
    await ask('POST', '/api/sign-out', anna, {});
    const ben = await signIn('ben');
    expect((await ask('GET', '/api/controls', ben)).body.holder).toBeNull();
    await until(() => recorded(rig).length === 2);
    expect(recorded(rig)[1]).toEqual([
      'Lapwing',
      { act: 'controls', holder: null, before: 'anna' },
    ]);
  });

  test('are not needed to stop everything, however often it takes, or to hold the stimulus', async () => {
    const rig = await startGuarded({ requestsPerS: 5 });
    const { ask, signIn } = rig;
    const ben = await signIn('ben');
    await rig.holder('anna');
    await beginSession(rig, ben);
    for (let n = 0; n < 60; n++) {
      expect((await ask('POST', '/api/quiet', ben, {})).status).toBe(200);
    }
    expect((await ask('POST', '/api/quiet', {}, {})).status).toBe(401);
    expect((await ask('POST', '/api/quiet', await signIn('vera'), {})).status).toBe(403);
    const held = await ask('POST', '/api/acts', await signIn('ben'), {
      act: { act: 'hold', what: 'stimulus', on: true },
    });
    expect(held.status).toBe(200);
    // Who is no operator cannot flood through the stop either.
    let answer = 0;
    for (let n = 0; n < 60; n++) answer = (await ask('POST', '/api/quiet', {}, {})).status;
    expect(answer).toBe(429);
  });

  test('are everybody’s on loopback, where nobody signs in', async () => {
    const { startWeb } = await import('../webRig.js');
    const { app, url } = await startWeb();
    const page = new Viewer(url);
    await until(() => page.all('state').length > 0);
    expect(page.all('welcome')[0]!.you).toMatchObject({ signedIn: false });
    expect(page.all('controls')).toEqual([]);
    const payload = { take: true };
    const take = { method: 'POST', url: '/api/controls', payload } as const;
    expect((await app.inject(take)).statusCode).toBe(404);
  });
});
