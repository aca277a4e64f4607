import { beforeEach, describe, expect, test } from 'vitest';
import type { OperatorAct } from '../../../server/session/inputs.js';
import { readRig } from '../../../server/session/rig/readRig.js';
import { until, Viewer } from '../webRig.js';
import { beginSession, type GuardedRig, startGuarded } from './signedIn.js';

type Method = 'GET' | 'POST' | 'PUT' | 'DELETE';
type Caller = 'anonymous' | 'viewer' | 'operator' | 'holder';
const CALLERS: readonly Caller[] = ['anonymous', 'viewer', 'operator', 'holder'];

/** The first caller who gets in. What is not named here: to read is a viewer's, to change a holder's. */
const FIRST: Record<string, Caller> = {
  'GET /healthz': 'anonymous',
  'POST /api/sign-in': 'anonymous',
  'POST /api/sign-out': 'viewer',
  // Each act has a need of its own, below.
  'POST /api/acts': 'viewer',
  'POST /api/quiet': 'operator',
  'POST /api/controls': 'operator',
  'PUT /api/rules/file': 'operator',
  'POST /api/rules/check': 'operator',
  'POST /api/rehearse': 'operator',
  'DELETE /api/rehearse': 'operator',
  'DELETE /api/jobs/{id}': 'operator',
  'POST /api/records/{name}/work': 'operator',
  'POST /api/comparisons': 'operator',
  'POST /api/animals': 'operator',
};

function firstFor(method: string, path: string): Caller {
  return FIRST[`${method} ${path}`] ?? (method === 'GET' ? 'viewer' : 'holder');
}

describe('every route of the description', () => {
  test('lets in whom it should, of anonymous, viewer, operator, and operator with the controls', async () => {
    const rig = await startGuarded();
    const anna = await rig.holder('anna');
    const browsers: Record<Caller, { cookie?: string }> = {
      anonymous: {},
      viewer: await rig.signIn('vera'),
      operator: await rig.signIn('ben'),
      holder: anna,
    };
    const { paths } = (await rig.ask('GET', '/api/openapi.json', anna)).body;
    let checked = 0;
    for (const [path, item] of Object.entries(paths as Record<string, Record<string, object>>)) {
      for (const method of Object.keys(item).map((name) => name.toUpperCase() as Method)) {
        for (const caller of CALLERS) {
          const url = path.replace(/\{\w+\}/g, 'nothing');
          // Whoever is let in is told that there is no such field: nothing is done.
          const payload = method === 'GET' || method === 'DELETE' ? undefined : { nonsense: 1 };
          const headers = browsers[caller];
          const { status, body } = await rig.ask(method, url, headers, payload);
          const where = `${method} ${path} by ${caller}`;
          const allowed = CALLERS.indexOf(caller) >= CALLERS.indexOf(firstFor(method, path));
          if (allowed) expect([401, 403], where).not.toContain(status);
          else expect([where, status]).toEqual([where, caller === 'anonymous' ? 401 : 403]);
          if (!allowed) expect(body.type, where).toMatch(/^urn:lapwing:error:WEB_/);
          checked++;
        }
      }
    }
    expect(checked).toBeGreaterThan(80);
    expect(Object.keys(FIRST).filter((row) => !isDescribed(row, paths))).toEqual([]);
  });

  test('says in the description what it wants of whoever asks', async () => {
    const rig = await startGuarded();
    const { body } = await rig.ask('GET', '/api/openapi.json', await rig.signIn('vera'));
    const words = {
      anonymous: 'nothing',
      viewer: 'signed in',
      operator: 'operator',
      holder: 'controls',
    };
    for (const [path, item] of Object.entries(
      body.paths as Record<string, Record<string, object>>,
    )) {
      for (const [method, operation] of Object.entries(item)) {
        const first = firstFor(method.toUpperCase(), path);
        expect(operation, `${method} ${path}`).toMatchObject({
          'x-needs': words[first],
          security: first === 'anonymous' ? [] : [{ signIn: [] }],
        });
      }
    }
    expect(body.components.securitySchemes.signIn).toMatchObject({ type: 'apiKey', in: 'cookie' });
  });
});

function isDescribed(row: string, paths: Record<string, Record<string, object>>): boolean {
  const [method = '', path = ''] = row.split(' ');
  return paths[path]?.[method.toLowerCase()] !== undefined;
}

describe('what a viewer may', () => {
  const acts: [string, OperatorAct][] = [
    ['hold the stimulus', { act: 'hold', what: 'stimulus', on: true }],
    ['let go of the stimulus', { act: 'hold', what: 'stimulus', on: false }],
    ['hold the water', { act: 'hold', what: 'water', on: true }],
    ['press a button', { act: 'press', button: 'induce_now' }],
    ['choose', { act: 'choose', name: 'target', value: 52 }],
    ['go to another phase', { act: 'phase', to: 'next' }],
    ['write a note', { act: 'note', text: 'seen' }],
    ['exclude a lap', { act: 'exclude lap', lap: 1 }],
    ['allow stimulation', { act: 'allow stimulation' }],
    ['stop everything as an act', { act: 'stop everything' }],
    ['end', { act: 'end', reason: 'enough' }],
  ];
  const demo = readRig(new URL('../../../hardware-sim/demo/rig.yaml', import.meta.url).pathname);

  test.each([false, true])(
    'hold the stimulus if the rig file says so (%s), and nothing else',
    async (may) => {
      const rig = await startGuarded({ rig: { ...demo, viewersMayHold: may } });
      const vera = await rig.signIn('vera');
      await beginSession(rig, vera);
      for (const [what, act] of acts) {
        const { status } = await rig.ask('POST', '/api/acts', vera, { act });
        const allowed = may && what === 'hold the stimulus';
        expect([what, status]).toEqual([what, allowed ? 200 : 403]);
      }
      expect(rig.loop.acts()).toEqual(may ? [acts[0]![1]] : []);
      expect((await rig.ask('GET', '/api/me', vera)).body.mayHold).toBe(may);
    },
  );

  test('not stop everything over the stream either, which an operator may', async () => {
    const rig = await startGuarded();
    const vera = new Viewer(rig.url, '', { headers: await rig.signIn('vera') });
    const ben = new Viewer(rig.url, '', { headers: await rig.signIn('ben') });
    await until(() => vera.told.length > 0 && ben.told.length > 0);
    vera.socket.send('{"ask":"quiet"}');
    await until(() => vera.all('quiet').length === 1);
    expect(vera.all('quiet')[0]).toMatchObject({ done: false });
    expect(rig.loop.heard.some((one) => one.say === 'quiet')).toBe(false);
    ben.socket.send('{"ask":"quiet"}');
    await until(() => ben.all('quiet').length === 1);
    expect(rig.loop.heard.find((one) => one.say === 'quiet')).toMatchObject({
      who: 'ben',
      from: 'dashboard 127.0.0.1',
    });
  });
});

describe('who did it', () => {
  let rig: GuardedRig;
  beforeEach(async () => {
    rig = await startGuarded();
  });

  test('is the name that was signed in with, whatever the page adds', async () => {
    const anna = await rig.holder('anna');
    await beginSession(rig, anna);
    await rig.ask('POST', '/api/acts', anna, { act: { act: 'note', text: 'a' } });
    await rig.ask('POST', '/api/acts', anna, { act: { act: 'note', text: 'b' }, who: 'ben' });
    const notes = rig.loop.heard.filter((one) => one.say === 'act' && one.act.act === 'note');
    expect(notes).toMatchObject([
      { who: 'anna', from: 'dashboard 127.0.0.1' },
      { who: 'ben (signed in as anna)', from: 'dashboard 127.0.0.1' },
    ]);
    await rig.ask('POST', '/api/end', anna, { reason: 'done' });
    expect(rig.loop.heard.find((one) => one.say === 'end')).toMatchObject({ who: 'anna' });
  });

  test('cannot be made up through the record of who holds the controls', async () => {
    const anna = await rig.holder('anna');
    await beginSession(rig, anna);
    const act = { act: 'controls', holder: 'ben', before: null };
    expect((await rig.ask('POST', '/api/acts', anna, { act })).status).toBe(400);
  });
});
