/** What OWASP ASVS asks and no other test shows; and that the table of it names tests that exist. */
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { packageRoot } from '../../../server/packageRoot.js';
import { Access } from '../../../server/web/access/access.js';
import { People } from '../../../server/web/access/people.js';
import { startWeb } from '../webRig.js';
import { CHEAP, newFiles, startGuarded } from './signedIn.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-standard-'));
mkdirSync(join(folder, 'assets'));
writeFileSync(join(folder, 'index.html'), '<!doctype html><title>Lapwing</title>');
writeFileSync(join(folder, 'sign-in.html'), '<!doctype html><title>Sign in</title>');
writeFileSync(join(folder, 'assets/main-1a2b.js'), 'export {};');
afterAll(() => rmSync(folder, { recursive: true }));

describe('a session', () => {
  test('is never taken from the address, nor from any header but the cookie', async () => {
    const { ask, signIn, url } = await startGuarded();
    const { cookie } = await signIn('anna');
    const [name, value] = cookie.split('=');
    for (const path of [`/api/me?${cookie}`, `/api/me?token=${value}`, `/api/me;${cookie}`]) {
      expect((await ask('GET', path)).status).toBeGreaterThanOrEqual(401);
    }
    const headers = { authorization: `Bearer ${value}`, [name!]: value!, 'x-cookie': cookie };
    expect((await ask('GET', '/api/me', headers)).status).toBe(401);
    expect(url).not.toContain(value);
  });

  test('leaves no secret and no cookie in the log, whoever comes', async () => {
    const lines: string[] = [];
    const put = (...parts: unknown[]) => void lines.push(JSON.stringify(parts));
    const log = { info: put, warn: put, error: put } as never;
    const files = newFiles();
    const secret = await new People(files.peopleFile, CHEAP).add('anna', 'operator');
    const access = new Access({
      ...{ files, cost: CHEAP, viewersMayHold: false, log },
      record: async () => undefined,
      ended: () => undefined,
      heldChanged: () => undefined,
    });
    const from = { address: '10.0.0.7', secure: false };
    // A secret typed where the name belongs is not written down either.
    for (const [name, text] of [
      ['anna', 'wrong-guess'],
      [secret, 'anna'],
    ] as const) {
      await expect(access.signIn(name, text, from)).rejects.toMatchObject({
        code: 'WEB_SIGN_IN_WRONG',
      });
    }
    const { cookie } = await access.signIn('anna', secret, from);
    access.close();
    const all = lines.join('\n');
    expect(all).toContain('signed in');
    expect(all).toContain('sign-in refused');
    for (const hidden of [secret, 'wrong-guess', cookie.split(/[=;]/)[1]!])
      expect(all).not.toContain(hidden);
  });
});

describe('a request', () => {
  test('with a parameter twice, or one that is unknown, is refused', async () => {
    const { ask, signIn } = await startGuarded();
    const vera = await signIn('vera');
    const status = async (query: string) =>
      (await ask('GET', `/api/rules/file?${query}`, vera)).status;
    expect(await status('path=demo.yaml')).toBe(200);
    expect(await status('path=demo.yaml&path=other.yaml')).toBe(400);
    expect(await status('path=demo.yaml&admin=1')).toBe(400);
  });

  test('with a method that nothing here uses is refused', async () => {
    const { app } = await startWeb({ dashboard: folder });
    for (const method of ['TRACE', 'PATCH', 'OPTIONS', 'PROPFIND', 'DELETE'] as const) {
      for (const url of ['/', '/api/state', '/api/quiet']) {
        const answer = await app.inject({ method: method as 'DELETE', url });
        expect([method, url, answer.statusCode]).toEqual([method, url, 404]);
      }
    }
  });

  test('is sent on to the sign-in page and nowhere else, whatever its address says', async () => {
    const { ask } = await startGuarded({ dashboard: folder });
    for (const url of ['/', '/?next=//evil.example', '/index.html?to=https://evil.example']) {
      const { status, headers } = await ask('GET', url);
      expect([status, headers.location]).toEqual([303, '/sign-in.html']);
    }
    expect((await ask('GET', '//evil.example/')).headers.location).toBeUndefined();
    expect((await ask('GET', '/sign-in.html')).status).toBe(200);
  });
});

describe('an answer', () => {
  test('says what it is, and nothing of the program that made it', async () => {
    const { app } = await startWeb({ dashboard: folder });
    for (const url of ['/', '/assets/main-1a2b.js', '/healthz', '/api/state', '/nothing']) {
      const { headers } = await app.inject(url);
      expect(String(headers['content-type']), url).toMatch(/charset=utf-8|problem\+json/i);
      for (const name of ['server', 'x-powered-by', 'via']) expect(headers[name]).toBeUndefined();
      expect(headers['access-control-allow-origin']).toBeUndefined();
    }
  });

  test('never lists a folder', async () => {
    const { app } = await startWeb({ dashboard: folder });
    for (const url of ['/assets', '/assets/', '/assets/.', '/assets/../assets/']) {
      const { statusCode, body } = await app.inject(url);
      expect(statusCode).toBeGreaterThanOrEqual(400);
      expect(body).not.toContain('main-1a2b');
    }
  });
});

describe('the source', () => {
  const files = ['server/web', 'dashboard'].flatMap((folder) => sourceFiles(folder));

  test('turns no text into code or markup', () => {
    expect(files.length).toBeGreaterThan(60);
    for (const file of files) {
      const text = readFileSync(join(packageRoot, file), 'utf8');
      expect(text, file).not.toMatch(
        /\beval\(|new Function\(|innerHTML|outerHTML|insertAdjacentHTML|document\.write/,
      );
      expect(text, file).not.toMatch(/<script>|javascript:|\son\w+="/);
    }
  });

  test('brings in no script, style or font from elsewhere', () => {
    for (const file of files.filter((one) => one.endsWith('.html'))) {
      const text = readFileSync(join(packageRoot, file), 'utf8');
      expect(text.match(/(?:src|href)="(?!\.?\/)[^"]*"/g), file).toBeNull();
    }
  });
});

function sourceFiles(below: string): string[] {
  const all = readdirSync(join(packageRoot, below), { recursive: true, encoding: 'utf8' });
  return all.filter((file) => /\.(tsx?|html)$/.test(file)).map((file) => join(below, file));
}

describe('the table of the standard', () => {
  const table = readFileSync(join(packageRoot, 'server/web/ASVS.md'), 'utf8');
  const rows = [...table.matchAll(/^\| (\d+\.\d+\.\d+) +\|(.+)\|$/gm)];

  test('has each requirement once, and a test or a reason for each', () => {
    const numbers = rows.map(([, number]) => number!);
    expect(numbers.length).toBeGreaterThan(100);
    expect(new Set(numbers).size).toBe(numbers.length);
    for (const [, number, rest] of rows) {
      const cells = rest!.split('|').map((cell) => cell.trim());
      expect(
        cells.every((cell) => cell !== ''),
        number,
      ).toBe(true);
    }
  });

  test('names tests that exist', () => {
    const named = [...table.matchAll(/`(test\/[\w/.-]+\.test\.ts)`: ([^|]+?)(?:;| \|)/g)];
    expect(named.length).toBeGreaterThan(50);
    for (const [, file, title] of named) {
      expect(existsSync(join(packageRoot, file!)), file).toBe(true);
      const source = readFileSync(join(packageRoot, file!), 'utf8');
      expect(source.includes(title!.trim()), `${file}: ${title}`).toBe(true);
    }
  });
});
