import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { request } from 'node:http';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { runWeb } from '../../server/web/webProcess.js';
import { startWeb, until, Viewer } from './webRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-web-'));
mkdirSync(join(folder, 'page/assets'), { recursive: true });
writeFileSync(join(folder, 'page/index.html'), '<!doctype html><title>Lapwing</title>');
writeFileSync(join(folder, 'page/assets/main-1a2b.js'), 'export {};');
writeFileSync(join(folder, 'secret.txt'), 'outside of the page');
afterAll(() => rmSync(folder, { recursive: true }));

/** A request whose path is sent as it stands: `fetch` would tidy it first. */
function rawGet(url: string, path: string): Promise<{ status: number; body: string }> {
  const { hostname, port } = new URL(url);
  return new Promise((resolve, reject) => {
    const asked = request({ hostname, port, path }, (response) => {
      let body = '';
      response.on('data', (bytes) => {
        body += String(bytes);
      });
      response.on('end', () => resolve({ status: response.statusCode ?? 0, body }));
    });
    asked.on('error', reject);
    asked.end();
  });
}

describe('the page itself', () => {
  test('is served with the policy, never cached; what carries a hash is cached for good', async () => {
    const { app } = await startWeb({ dashboard: join(folder, 'page') });
    const page = await app.inject('/');
    expect(page.statusCode).toBe(200);
    expect(page.headers['content-type']).toContain('text/html');
    expect(page.headers['content-security-policy']).toContain("script-src 'self'");
    expect(page.headers['cache-control']).toBe('no-cache');
    const script = await app.inject('/assets/main-1a2b.js');
    expect(script.headers['cache-control']).toContain('immutable');
    expect(script.headers['x-content-type-options']).toBe('nosniff');
  });

  test('nothing outside of its folder can be had', async () => {
    const { url } = await startWeb({ dashboard: join(folder, 'page') });
    const paths = [
      '/../secret.txt',
      '/assets/../../secret.txt',
      '/%2e%2e/secret.txt',
      '/..%2fsecret.txt',
    ];
    paths.push('/assets/%2e%2e%2f%2e%2e%2fsecret.txt', '/..%5csecret.txt', '//secret.txt', '/%00');
    for (const path of paths) {
      const { status, body } = await rawGet(url, path);
      expect(status).toBeGreaterThanOrEqual(400);
      expect(body).not.toContain('outside of the page');
    }
  });
});

describe('the web process', () => {
  test('is not opened to the network without sign-in', async () => {
    for (const host of ['0.0.0.0', '::', '192.168.1.5']) {
      const started = runWeb(['--socket', '/nowhere', '--host', host, '--log', 'silent']);
      await expect(started).rejects.toMatchObject({ code: 'WEB_HOST_NOT_LOOPBACK' });
    }
  });

  test('names a port in use, and what to do', async () => {
    const { app } = await startWeb();
    const { port } = app.server.address() as AddressInfo;
    const args = ['--socket', '/nowhere', '--port', String(port), '--log', 'silent'];
    await expect(runWeb(args)).rejects.toMatchObject({
      code: 'WEB_PORT_BUSY',
      remedy: expect.stringContaining('--port'),
    });
  });
});

describe('many pages', () => {
  test('two hundred watch at once over one connection to the loop, and each gets everything', async () => {
    const { app, url, loop } = await startWeb();
    const viewers = Array.from({ length: 200 }, () => new Viewer(url));
    await until(() => viewers.every((one) => one.told.length >= 3));
    loop.animal.begin('induction.yaml', 'M12');
    for (let n = 0; n < 40; n++) {
      loop.advance(0.5);
      await new Promise((resolve) => setTimeout(resolve, 5));
    }
    const all = loop.animal.events.map((one) => one.number);
    const { boardUs } = loop.animal.state;
    await until(() => viewers.every((one) => one.all('state').at(-1)?.state.boardUs === boardUs));
    await until(() => viewers.every((one) => one.eventNumbers.length === all.length));
    for (const one of viewers) expect(one.eventNumbers).toEqual(all);
    expect(loop.connections).toBe(1);
    expect((await app.inject('/healthz')).json()).toMatchObject({ clients: 200, dropped: 0 });
    for (const one of viewers) one.socket.terminate();
    await until(async () => (await app.inject('/healthz')).json().clients === 0);
  });
});
