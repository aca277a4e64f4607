import { generateKeyPairSync } from 'node:crypto';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import https from 'node:https';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { connect } from 'node:tls';
import { afterAll, describe, expect, test } from 'vitest';
import { certificateWarning, readTls } from '../../server/web/tls.js';
import { selfSigned } from '../tools/certificate.js';
import { startGuarded } from './access/signedIn.js';
import { until, Viewer } from './webRig.js';

const DAY_MS = 86_400_000;
const folder = mkdtempSync(join(tmpdir(), 'lapwing-tls-'));
afterAll(() => rmSync(folder, { recursive: true }));

function file(name: string, text: string): string {
  const path = join(folder, name);
  writeFileSync(path, text);
  return path;
}

const now = Date.now();
const good = selfSigned(new Date(now - DAY_MS), new Date(now + 90 * DAY_MS));
const other = selfSigned(new Date(now - DAY_MS), new Date(now + 90 * DAY_MS));
const certFile = file('cert.pem', good.cert);
const keyFile = file('key.pem', good.key);

function get(url: string, headers: Record<string, string> = {}) {
  return new Promise<{ status: number; headers: Record<string, unknown> }>((resolve, reject) => {
    https
      .get(url, { ca: good.cert, headers }, (answer) => {
        answer.resume();
        resolve({ status: answer.statusCode ?? 0, headers: answer.headers });
      })
      .on('error', reject);
  });
}

describe('with a certificate and its key', () => {
  test('the page and the stream are served over TLS to a client that knows the certificate', async () => {
    const rig = await startGuarded({ tls: readTls(certFile, keyFile) });
    expect(rig.url).toMatch(/^https:/);
    const { status, headers } = await get(`${rig.url}/healthz`);
    expect(status).toBe(200);
    // RFC 6797: come back over TLS only.
    expect(headers['strict-transport-security']).toMatch(/^max-age=\d{7,}$/);
    const body = JSON.stringify({ name: 'vera', secret: rig.secrets.get('vera') });
    const cookie = await new Promise<string>((resolve, reject) => {
      const options = {
        ...{ method: 'POST', ca: good.cert },
        headers: { 'content-type': 'application/json', origin: rig.url },
      };
      https
        .request(`${rig.url}/api/sign-in`, options, (answer) => {
          answer.resume();
          resolve(String(answer.headers['set-cookie']));
        })
        .on('error', reject)
        .end(body);
    });
    expect(cookie).toMatch(/^__Host-lapwing-[\da-f]{8}=.*; Secure$/);
    const headersOf = { cookie: cookie.split(';')[0]! };
    expect((await get(`${rig.url}/api/me`, headersOf)).status).toBe(200);
    // The name without the prefix is one that a neighbour without TLS could have set.
    const bare = { cookie: headersOf.cookie.replace('__Host-', '') };
    expect((await get(`${rig.url}/api/me`, bare)).status).toBe(401);
    const page = new Viewer(rig.url, '', { ca: good.cert, headers: headersOf, origin: rig.url });
    await until(() => page.all('state').length > 0);
    // Whoever is on the way can write what comes over plain http.
    const plain = { ...headersOf, origin: rig.url.replace('https', 'http') };
    expect((await get(`${rig.url}/api/me`, plain)).status).toBe(403);
  });

  test('an older protocol than TLS 1.2 is refused, and a stranger to the certificate refuses it', async () => {
    const rig = await startGuarded({ tls: readTls(certFile, keyFile) });
    const port = Number(new URL(rig.url).port);
    const handshake = (options: object) =>
      new Promise<string>((resolve) => {
        const socket = connect({ host: '127.0.0.1', port, ...options }, () => {
          resolve(socket.getProtocol() ?? '');
          socket.destroy();
        });
        socket.on('error', (error: NodeJS.ErrnoException) => resolve(error.code ?? error.message));
      });
    expect(await handshake({ ca: good.cert })).toBe('TLSv1.3');
    expect(await handshake({ ca: good.cert, maxVersion: 'TLSv1.2' })).toBe('TLSv1.2');
    const old = { minVersion: 'TLSv1', maxVersion: 'TLSv1.1', ciphers: 'ALL@SECLEVEL=0' };
    expect(await handshake({ ca: good.cert, ...old })).toMatch(/ERR_SSL|ECONNRESET/);
    expect(await handshake({})).toMatch(/SELF_SIGNED/);
  });
});

describe('what cannot be used is said before anything listens', () => {
  const encrypted = generateKeyPairSync('rsa', {
    modulusLength: 2048,
    publicKeyEncoding: { type: 'spki', format: 'pem' },
    privateKeyEncoding: { type: 'pkcs8', format: 'pem', cipher: 'aes-256-cbc', passphrase: 'x' },
  }).privateKey;
  const cases: [string, string, string, RegExp][] = [
    ['a certificate that is not there', join(folder, 'none.pem'), keyFile, /ENOENT/],
    ['a key that is not there', certFile, join(folder, 'none.pem'), /ENOENT/],
    ['a certificate that is none', file('a.pem', 'hello'), keyFile, /a certificate in PEM/],
    ['files the wrong way round', keyFile, certFile, /a certificate in PEM/],
    ['a key that is none', certFile, file('b.pem', 'hello'), /a private key in PEM/],
    ['a key with a passphrase', certFile, file('c.pem', encrypted), /without passphrase/],
    ['the key of another certificate', certFile, file('d.pem', other.key), /is not the key of/],
  ];
  test.each(cases)('%s', (_what, cert, key, words) => {
    expect(() => readTls(cert, key)).toThrow(words);
    expect(() => readTls(cert, key)).toThrow(expect.objectContaining({ code: 'WEB_TLS' }));
  });

  test('a certificate that ends soon or has ended is used, with a warning', () => {
    const tls = readTls(certFile, keyFile);
    const daysAhead = (days: number) => new Date(now + (90 - days) * DAY_MS);
    expect(certificateWarning(tls, daysAhead(15))).toBeUndefined();
    expect(certificateWarning(tls, daysAhead(13))).toContain('ends at');
    expect(certificateWarning(tls, daysAhead(-1))).toContain('ended at');
  });
});
