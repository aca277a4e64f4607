import { readFileSync, statSync } from 'node:fs';
import { afterEach, describe, expect, test, vi } from 'vitest';
import WebSocket from 'ws';
import { IDLE_MS, LONGEST_MS } from '../../../server/web/access/signIns.js';
import { until, Viewer } from '../webRig.js';
import { cookieOf, newFiles, startGuarded } from './signedIn.js';

afterEach(() => vi.useRealTimers());

/** Only the wall clock is moved: sockets go on in real time. */
function laterBy(ms: number): void {
  const now = Date.now();
  vi.useFakeTimers({ toFake: ['Date'], now: now + ms });
}

describe('signing in', () => {
  test('gives a cookie that no script reads and no other site sends, and says who one is', async () => {
    const { ask, secrets } = await startGuarded();
    const answer = await ask(
      'POST',
      '/api/sign-in',
      {},
      { name: 'anna', secret: secrets.get('anna')! },
    );
    expect(answer.status).toBe(200);
    expect(answer.headers['cache-control']).toBe('no-store');
    const cookie = String(answer.headers['set-cookie']);
    // 32 bytes in base64url: 256 bits of chance.
    expect(cookie).toMatch(/^lapwing-[\da-f]{8}=[\w-]{43}; /);
    expect(cookie.split('; ').slice(1).sort()).toEqual([
      'HttpOnly',
      `Max-Age=${LONGEST_MS / 1000}`,
      'Path=/',
      'SameSite=Strict',
    ]);
    const me = await ask('GET', '/api/me', { cookie: cookieOf(answer) });
    expect(me.body).toEqual(answer.body);
    expect(me.body).toMatchObject({
      signedIn: true,
      name: 'anna',
      role: 'operator',
      mayHold: true,
    });
  });

  test('forgives how a secret is typed, and nothing else', async () => {
    const { ask, secrets } = await startGuarded();
    const secret = secrets.get('vera')!;
    const typed = ` ${secret.toUpperCase().replaceAll('-', ' ')} `;
    const status = async (name: string, text: string) =>
      (await ask('POST', '/api/sign-in', {}, { name, secret: text })).status;
    expect(await status('vera', typed)).toBe(200);
    expect(await status(' vera ', secret)).toBe(200);
    expect(await status('Vera', secret)).toBe(401);
    expect(await status('vera', secret.slice(0, -1))).toBe(401);
    expect(await status('ben', secret)).toBe(401);
  });

  test('answers the same for a name that nobody has and for a wrong secret', async () => {
    const { ask } = await startGuarded();
    const wrong = await ask('POST', '/api/sign-in', {}, { name: 'anna', secret: 'guessed' });
    const nobody = await ask('POST', '/api/sign-in', {}, { name: 'zoe', secret: 'guessed' });
    expect([wrong.status, wrong.body]).toEqual([401, nobody.body]);
    expect(wrong.body).toMatchObject({ code: 'WEB_SIGN_IN_WRONG' });
    expect(wrong.headers['set-cookie']).toBeUndefined();
    // RFC 9110, 15.5.2: a 401 says how to sign in.
    expect(wrong.headers['www-authenticate']).toContain('/api/sign-in');
  });

  test('gives a new cookie each time, and ends what the old one signed in', async () => {
    const { ask, signIn, secrets } = await startGuarded();
    const before = await signIn('anna');
    const body = { name: 'anna', secret: secrets.get('anna')! };
    const after = cookieOf(await ask('POST', '/api/sign-in', before, body));
    expect(after).not.toBe(before.cookie);
    expect((await ask('GET', '/api/me', before)).status).toBe(401);
    expect((await ask('GET', '/api/me', { cookie: after })).status).toBe(200);
    // Nor does a cookie that somebody planted become theirs.
    const planted = `${before.cookie.split('=')[0]}=${'A'.repeat(43)}`;
    const fixed = cookieOf(await ask('POST', '/api/sign-in', { cookie: planted }, body));
    expect(fixed).not.toBe(planted);
  });

  test('is not got by a cookie that is empty, guessed, twice there, or of enormous length', async () => {
    const { ask, signIn } = await startGuarded();
    const { cookie } = await signIn('anna');
    const [name] = cookie.split('=');
    const bad = [`${name}=`, `${name}=${'B'.repeat(43)}`, `${cookie}; ${cookie}`, `${cookie}x`];
    for (const one of [...bad, `${name}=${'C'.repeat(5000)}`, `__Host-${cookie}`]) {
      expect((await ask('GET', '/api/state', { cookie: one })).status).toBe(401);
    }
    expect((await ask('GET', '/api/me', { cookie: `other=1; ${cookie}` })).status).toBe(200);
  });

  test('is made to wait after wrong secrets, says how long, and the others are not', async () => {
    const { ask, secrets } = await startGuarded();
    const attempt = (name: string, secret: string) =>
      ask('POST', '/api/sign-in', {}, { name, secret });
    for (let n = 0; n < 3; n++) expect((await attempt('anna', `guess ${n}`)).status).toBe(401);
    const waits = await attempt('anna', secrets.get('anna')!);
    expect([waits.status, waits.body.code]).toEqual([429, 'WEB_SIGN_IN_WAIT']);
    expect(Number(waits.headers['retry-after'])).toBeGreaterThan(0);
    expect((await attempt('ben', secrets.get('ben')!)).status).toBe(200);
  });

  test('is refused from another site, and as anything but JSON', async () => {
    const { app, ask, secrets } = await startGuarded();
    const body = { name: 'anna', secret: secrets.get('anna')! };
    const headers = { host: '127.0.0.1:1', origin: 'http://evil.example' };
    expect((await ask('POST', '/api/sign-in', headers, body)).status).toBe(403);
    const form = await app.inject({
      ...{ method: 'POST', url: '/api/sign-in', payload: new URLSearchParams(body).toString() },
      headers: { 'content-type': 'application/x-www-form-urlencoded' },
    });
    expect(form.statusCode).toBe(415);
  });
});

describe('being signed in', () => {
  test('ends when one signs out, with the page that watched', async () => {
    const { ask, signIn, url } = await startGuarded();
    const browser = await signIn('vera');
    const other = await signIn('vera');
    const page = new Viewer(url, '', { headers: browser });
    await until(() => page.told.length > 0);
    let code = 0;
    page.socket.on('close', (closed) => {
      code = closed;
    });
    const out = await ask('POST', '/api/sign-out', browser, {});
    expect(String(out.headers['set-cookie'])).toContain('Max-Age=0');
    await until(() => page.closed);
    expect(code).toBe(4401);
    expect((await ask('GET', '/api/state', browser)).status).toBe(401);
    expect((await ask('GET', '/api/me', other)).status).toBe(200);
    await ask('POST', '/api/sign-out', other, { everywhere: true });
    expect((await ask('GET', '/api/me', other)).status).toBe(401);
  });

  test('everywhere ends all browsers of one person, and nobody else', async () => {
    const { ask, signIn } = await startGuarded();
    const [one, two, ben] = [await signIn('anna'), await signIn('anna'), await signIn('ben')];
    await ask('POST', '/api/sign-out', one, { everywhere: true });
    expect((await ask('GET', '/api/me', two)).status).toBe(401);
    expect((await ask('GET', '/api/me', ben)).status).toBe(200);
  });

  test('lasts while it is used, ends after a rest, and in any case after a week', async () => {
    const { ask, signIn } = await startGuarded();
    const used = await signIn('anna');
    const rested = await signIn('anna');
    const status = async (browser: { cookie: string }) =>
      (await ask('GET', '/api/me', browser)).status;
    laterBy(IDLE_MS - 1000);
    expect(await status(used)).toBe(200);
    laterBy(2000);
    expect([await status(used), await status(rested)]).toEqual([200, 401]);
    for (let days = 0.5; days < 7; days += 0.45) {
      laterBy(0.45 * 24 * 3_600_000);
      const stays = days + 0.45 < 7;
      expect([days, await status(used)]).toEqual([days, stays ? 200 : 401]);
    }
  });

  test('outlives the web process, of which only the cookie has the secret', async () => {
    const access = newFiles();
    const first = await startGuarded({ access });
    const browser = await first.holder('anna');
    const held = (await first.ask('GET', '/api/controls', browser)).body;
    await first.app.close();
    const kept = readFileSync(access.signedInFile, 'utf8');
    expect(kept).not.toContain(browser.cookie.split('=')[1]);
    expect(statSync(access.signedInFile).mode & 0o777).toBe(0o600);
    const second = await startGuarded({ access });
    expect((await second.ask('GET', '/api/me', browser)).body.name).toBe('anna');
    expect((await second.ask('GET', '/api/controls', browser)).body).toEqual(held);
  });

  test('ends within seconds for somebody who is taken out or has a new secret', async () => {
    const { ask, signIn, people, holder } = await startGuarded();
    const [anna, vera] = [await holder('anna'), await signIn('vera')];
    people.remove('vera');
    await people.renew('anna');
    await until(async () => (await ask('GET', '/api/me', vera)).status === 401);
    expect((await ask('GET', '/api/me', anna)).status).toBe(401);
    const ben = await signIn('ben');
    expect((await ask('GET', '/api/controls', ben)).body.holder).toBeNull();
  });

  test('is needed for the stream', async () => {
    const { url, signIn } = await startGuarded();
    const open = (headers: Record<string, string>) =>
      new Promise<number>((resolve) => {
        const socket = new WebSocket(`${url.replace('http', 'ws')}/api/stream`, { headers });
        socket.on('error', () => undefined);
        socket.on('open', () => {
          socket.terminate();
          resolve(101);
        });
        socket.on('unexpected-response', (_request, { statusCode }) => resolve(statusCode ?? 0));
      });
    expect(await open({})).toBe(401);
    expect(await open(await signIn('vera'))).toBe(101);
  });

  test('is not asked of anybody on loopback, where there is nothing to sign in to', async () => {
    const { app } = await (await import('../webRig.js')).startWeb();
    expect((await app.inject('/api/me')).json()).toMatchObject({
      signedIn: false,
      role: 'operator',
    });
    const payload = { name: 'anna', secret: 'x' };
    expect((await app.inject({ method: 'POST', url: '/api/sign-in', payload })).statusCode).toBe(
      404,
    );
  });
});
