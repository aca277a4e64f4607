import { describe, expect, test } from 'vitest';
import { ERRORS } from '../../server/errors/codes.js';
import { isLoopback, RateLimit } from '../../server/web/gates.js';
import { startWeb, until } from './webRig.js';

const CODES = new Set(Object.values(ERRORS).map((entry) => entry.code as string));

describe('the HTTP interface', () => {
  test('shows the setup and the state that the loop told last', async () => {
    const { app, loop } = await startWeb();
    expect((await app.inject('/api/setup')).json()).toEqual(loop.animal.setup);
    loop.animal.state.lap = 17;
    loop.show();
    await until(async () => (await app.inject('/api/state')).json().lap === 17);
  });

  test('begins a session, passes an act on with who and from where, and ends the session', async () => {
    const { app, loop } = await startWeb();
    const begin = { rules: 'induction.yaml', subject: 'M12', experimenter: 'KL', seed: '3' };
    const began = await app.inject({ method: 'POST', url: '/api/session', payload: begin });
    expect(began.statusCode).toBe(200);
    await until(async () => (await app.inject('/api/setup')).json().session !== null);
    const payload = { act: { act: 'choose', name: 'target', value: 52 }, who: 'KL' };
    expect((await app.inject({ method: 'POST', url: '/api/acts', payload })).statusCode).toBe(200);
    const end = { method: 'POST', url: '/api/end', payload: { reason: 'done' } } as const;
    expect((await app.inject(end)).statusCode).toBe(200);
    expect(loop.heard.find((one) => one.say === 'begin')).toMatchObject(begin);
    expect(loop.heard.find((one) => one.say === 'act')).toMatchObject({
      ...payload,
      from: 'dashboard 127.0.0.1',
    });
    expect(loop.heard.find((one) => one.say === 'end')).toMatchObject({ reason: 'done' });
  });

  test('stop everything reaches the loop', async () => {
    const { app, loop } = await startWeb();
    const answer = await app.inject({ method: 'POST', url: '/api/quiet', payload: {} });
    expect(answer.json()).toEqual({ done: true });
    expect(loop.heard.filter((one) => one.say === 'quiet')).toHaveLength(1);
  });

  test('stop everything says so when the loop does not answer, or is away', async () => {
    const { app, loop } = await startWeb({ loopTimeoutMs: 100 });
    const quiet = { method: 'POST', url: '/api/quiet', payload: {} } as const;
    loop.silent = true;
    const silent = await app.inject(quiet);
    expect([silent.statusCode, silent.json().code]).toEqual([504, 'LOOP_SILENT']);
    // It was asked twice: over the standing connection, and over one of its own.
    expect(loop.heard.filter((one) => one.say === 'quiet')).toHaveLength(2);
    await loop.goAway();
    const away = await app.inject(quiet);
    expect([away.statusCode, away.json().code]).toEqual([503, 'LOOP_AWAY']);
    expect(away.json().remedy).toContain('250 ms');
  });

  test('finds the loop again after it went away, and nothing asked meanwhile is sent later', async () => {
    const { app, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    loop.show();
    loop.broadcast(JSON.stringify({ tell: 'setup', setup: loop.animal.setup }) + '\n');
    await until(async () => (await app.inject('/api/setup')).json().session !== null);
    await loop.goAway();
    await until(async () => (await app.inject('/healthz')).json().loop === 'away');
    const payload = { act: { act: 'note', text: 'nobody hears this' } };
    const lost = await app.inject({ method: 'POST', url: '/api/acts', payload });
    expect([lost.statusCode, lost.json().code]).toEqual([503, 'LOOP_AWAY']);
    await loop.start();
    await until(async () => (await app.inject('/healthz')).json().loop === 'up');
    const heard = { act: { act: 'note', text: 'heard' } };
    const sent = await app.inject({ method: 'POST', url: '/api/acts', payload: heard });
    expect(sent.statusCode).toBe(200);
    expect(loop.acts()).toEqual([{ act: 'note', text: 'heard' }]);
  });

  test("passes the loop's own refusal on, with its code and remedy", async () => {
    const { app, loop } = await startWeb();
    loop.refusal = { code: 'RULES_BAD', message: 'line 3: no such place', remedy: 'Mend line 3.' };
    const payload = { rules: 'induction.yaml', subject: 'M12' };
    const answer = await app.inject({ method: 'POST', url: '/api/session', payload });
    expect(answer.statusCode).toBe(409);
    expect(answer.headers['content-type']).toContain('application/problem+json');
    expect(answer.json()).toMatchObject({
      code: 'RULES_BAD',
      detail: 'line 3: no such place',
      remedy: 'Mend line 3.',
    });
  });
});

describe('what is refused', () => {
  const acts: [string, unknown][] = [
    ['no act', {}],
    ['an unknown act', { act: { act: 'explode' } }],
    ['an unknown field', { act: { act: 'stop everything', output: 3 } }],
    ['an unknown field beside the act', { act: { act: 'stop everything' }, admin: true }],
    ['a number as text', { act: { act: 'exclude lap', lap: '4' } }],
    ['a note too long', { act: { act: 'note', text: 'x'.repeat(2001) } }],
    ['a missing field', { act: { act: 'hold', what: 'stimulus' } }],
    ['a list', []],
    ['null', null],
  ];
  test.each(acts)('%s in the body of an act', async (_what, payload) => {
    const { app, loop } = await startWeb();
    const answer = await app.inject({
      method: 'POST',
      url: '/api/acts',
      payload: JSON.stringify(payload),
      headers: { 'content-type': 'application/json' },
    });
    expect(answer.statusCode).toBe(400);
    // RFC 9457, section 3: the media type, and the members `type`, `title`, `status`, `detail`.
    expect(answer.headers['content-type']).toContain('application/problem+json');
    const body = answer.json();
    expect(body).toMatchObject({ type: 'urn:lapwing:error:WEB_BODY_INVALID', status: 400 });
    expect(body.title).toBeTruthy();
    expect(body.errors[0].pointer).toMatch(/^#/);
    expect(loop.acts()).toEqual([]);
  });

  test('acts that the running session does not offer, with what it does offer', async () => {
    const { app, loop } = await startWeb();
    const post = (act: unknown) =>
      app.inject({ method: 'POST', url: '/api/acts', payload: { act } as object });
    expect((await post({ act: 'press', button: 'drop' })).json().detail).toBe(
      'No session is running.',
    );
    loop.animal.begin('induction.yaml', 'M12');
    loop.broadcast(JSON.stringify({ tell: 'setup', setup: loop.animal.setup }) + '\n');
    await until(async () => (await app.inject('/api/setup')).json().session !== null);
    const refused = [
      [{ act: 'press', button: 'launch' }, 'induce_now, drop'],
      [{ act: 'phase', to: 'nowhere' }, 'baseline, induction, probe'],
      [{ act: 'choose', name: 'target', value: 161 }, 'from 20 to 160 cm'],
      [{ act: 'choose', name: 'target', value: 'far' }, 'from 20 to 160 cm'],
      [{ act: 'choose', name: 'train', value: 'endless' }, 'short, long'],
      [{ act: 'choose', name: 'colour', value: 1 }, 'target, volume, train'],
    ] as const;
    for (const [act, words] of refused) {
      const answer = await post(act);
      expect([answer.statusCode, answer.json().code]).toEqual([422, 'WEB_ACT_UNKNOWN']);
      expect(answer.json().detail).toContain(words);
    }
    expect((await post({ act: 'choose', name: 'target', value: 160 })).statusCode).toBe(200);
    expect(loop.acts()).toHaveLength(1);
  });

  test('a rules file that the loop did not offer, above all one outside its folder', async () => {
    const { app, loop } = await startWeb();
    for (const rules of ['../../etc/passwd', '/etc/passwd', 'induction.yaml\0', 'Induction.yaml']) {
      const payload = { rules, subject: 'M12' };
      const answer = await app.inject({ method: 'POST', url: '/api/session', payload });
      expect(answer.statusCode).toBe(422);
    }
    expect(loop.heard.some((one) => one.say === 'begin')).toBe(false);
  });

  test('anything that is not JSON: forms, plain text, no type, torn JSON, too much of it', async () => {
    const { app } = await startWeb();
    const post = (payload: string, type?: string) =>
      app.inject({
        method: 'POST',
        url: '/api/end',
        payload,
        ...(type === undefined ? {} : { headers: { 'content-type': type } }),
      });
    expect((await post('reason=x', 'application/x-www-form-urlencoded')).statusCode).toBe(415);
    expect((await post('{"reason":"x"}', 'text/plain')).statusCode).toBe(415);
    expect((await post('{"reason":"x"}')).statusCode).toBe(415);
    expect((await post('{"reason":', 'application/json')).statusCode).toBe(400);
    expect((await post('', 'application/json')).statusCode).toBe(400);
    expect((await post('{"__proto__":{"a":1}}', 'application/json')).statusCode).toBe(400);
    const long = JSON.stringify({ reason: 'x'.repeat(20_000) });
    const answer = await post(long, 'application/json');
    expect([answer.statusCode, answer.json().code]).toEqual([413, 'WEB_BODY_TOO_LARGE']);
  });

  test('hosts and origins that are not ours', async () => {
    const { app, loop } = await startWeb({ allowedHosts: ['rig3.lab'] });
    const quiet = (headers: Record<string, string>) =>
      app.inject({ method: 'POST', url: '/api/quiet', payload: {}, headers });
    // DNS rebinding: a hostile name that resolves to this machine.
    const rebound = await app.inject({ url: '/api/state', headers: { host: 'evil.example:8711' } });
    expect([rebound.statusCode, rebound.json().code]).toEqual([421, 'WEB_HOST_REFUSED']);
    const host = '127.0.0.1:8711';
    for (const origin of ['http://evil.example', 'null', 'http://127.0.0.1:9999', 'file://']) {
      const crossed = await quiet({ host, origin });
      expect([crossed.statusCode, crossed.json().code]).toEqual([403, 'WEB_ORIGIN_REFUSED']);
    }
    for (const site of ['cross-site', 'same-site', 'none']) {
      expect((await quiet({ host, 'sec-fetch-site': site })).statusCode).toBe(403);
    }
    expect(loop.heard.some((one) => one.say === 'quiet')).toBe(false);
    expect((await quiet({ host, origin: 'http://127.0.0.1:8711' })).statusCode).toBe(200);
    expect((await quiet({ host: 'rig3.lab', origin: 'https://rig3.lab' })).statusCode).toBe(200);
    expect((await quiet({ host: '[::1]:8711', 'sec-fetch-site': 'same-origin' })).statusCode).toBe(
      200,
    );
  });

  test('a flood from one address, but never a stop', async () => {
    const { app } = await startWeb({ requestsPerS: 5 });
    const codes = await Promise.all(
      Array.from({ length: 60 }, async () => (await app.inject('/api/state')).statusCode),
    );
    expect(codes).toContain(429);
    for (let n = 0; n < 60; n++) {
      const answer = await app.inject({ method: 'POST', url: '/api/quiet', payload: {} });
      expect(answer.statusCode).toBe(200);
    }
  });

  test('unknown paths and paths that climb, as problem details', async () => {
    const { app } = await startWeb();
    for (const url of [
      '/api/nothing',
      '/../package.json',
      '/%2e%2e/package.json',
      '/..%2fpackage.json',
    ]) {
      const answer = await app.inject(url);
      expect(answer.statusCode).toBeGreaterThanOrEqual(400);
      expect(answer.headers['content-type']).toContain('application/problem+json');
      expect(CODES).toContain(answer.json().code);
    }
  });
});

describe('every answer', () => {
  test('carries a policy without inline script or style, and the other security headers', async () => {
    const { app } = await startWeb();
    for (const url of ['/healthz', '/api/state', '/nothing']) {
      const { headers } = await app.inject(url);
      const policy = String(headers['content-security-policy']);
      expect(policy).toContain("default-src 'none'");
      expect(policy).toContain("frame-ancestors 'none'");
      expect(policy).not.toContain('unsafe');
      expect(headers['x-content-type-options']).toBe('nosniff');
      expect(headers['referrer-policy']).toBe('no-referrer');
      expect(headers['access-control-allow-origin']).toBeUndefined();
    }
    expect((await app.inject('/api/state')).headers['cache-control']).toBe('no-store');
  });

  test('only loopback counts as loopback', () => {
    for (const host of ['127.0.0.1', '127.8.8.8', 'localhost', '::1'])
      expect(isLoopback(host)).toBe(true);
    for (const host of ['0.0.0.0', '::', '10.0.0.2', '127.evil.example', '']) {
      expect(isLoopback(host)).toBe(false);
    }
  });

  test('the rate limit refills with time and holds a bounded number of addresses', () => {
    let nowMs = 0;
    const rate = new RateLimit(10, 3, () => nowMs, 2);
    expect([1, 2, 3, 4].map(() => rate.take('a'))).toEqual([true, true, true, false]);
    nowMs += 100;
    expect([1, 2].map(() => rate.take('a'))).toEqual([true, false]);
    expect(rate.take('b')).toBe(true);
    expect(rate.take('c')).toBe(false);
    nowMs += 10_000;
    expect(rate.take('c')).toBe(true);
  });
});
