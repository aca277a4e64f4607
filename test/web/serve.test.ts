/** `lapwing serve` and `lapwing people` as they are used at a rig, in processes of their own. */
import type { ChildProcess } from 'node:child_process';
import { mkdtempSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { accessFiles } from '../../server/web/access/people.js';
import { pageAddresses, parseListen } from '../../server/web/listening.js';
import { finished, lapwing, until } from '../tools/liveRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-serve-'));
const rigPath = join(packageRoot, 'hardware-sim/demo/rig.yaml');
process.env.LAPWING_CONFIG = join(folder, 'config');
process.env.LAPWING_RUNTIME = folder;
let service: ChildProcess | undefined;
afterAll(() => {
  if (service?.exitCode === null) service.kill('SIGKILL');
  rmSync(folder, { recursive: true, force: true });
});

/** A command that ends: its status and all it said. */
async function run(...args: string[]): Promise<{ status: number | null; said: string }> {
  const { status, out, err } = await finished(lapwing(...args));
  return { status, said: out + err };
}

const SECRET = /[2-9a-z]{4}(?:-[2-9a-z]{4}){4}/;

describe('lapwing serve --listen', { timeout: 240_000 }, () => {
  test('makes people the first time, lets them in over the network, and nobody else', async () => {
    let said = '';
    const where = ['--rig', rigPath, '--records', join(folder, 'records')];
    const child = lapwing(
      'serve',
      ...where,
      '--listen',
      '0.0.0.0:0',
      '--viewers',
      '2',
      '--name',
      'rig1.example',
    );
    service = child;
    for (const stream of [child.stdout!, child.stderr!]) {
      stream.on('data', (bytes: Buffer) => {
        said += bytes.toString('utf8');
      });
    }
    await until(
      'the page',
      () => /dashboard: http/.test(said),
      180_000,
      () => said,
    );
    const secretOf = (name: string) =>
      new RegExp(`^ +${name} +(${SECRET.source})$`, 'm').exec(said)?.[1];
    for (const name of ['operator', 'viewer-1', 'viewer-2'])
      expect(secretOf(name), said).toBeDefined();
    expect(said).toContain('shown once');
    expect(said).toContain('without TLS');
    const [, port] = /dashboard: http:\/\/rig1\.example:(\d+)/.exec(said) ?? [];
    expect(statSync(accessFiles('demo').peopleFile).mode & 0o777).toBe(0o600);

    const url = `http://127.0.0.1:${port}`;
    const post = (path: string, body: object, cookie = '') =>
      fetch(url + path, {
        method: 'POST',
        headers: { 'content-type': 'application/json', cookie },
        body: JSON.stringify(body),
      });
    const signIn = async (name: string) => {
      const answer = await post('/api/sign-in', { name, secret: secretOf(name)! });
      expect(answer.status).toBe(200);
      return answer.headers.get('set-cookie')!.split(';')[0]!;
    };
    expect((await fetch(`${url}/api/state`)).status).toBe(401);
    const operator = await signIn('operator');
    const viewer = await signIn('viewer-2');
    const state = async (cookie: string) =>
      (await fetch(`${url}/api/me`, { headers: { cookie } })).status;
    expect([await state(operator), await state(viewer)]).toEqual([200, 200]);
    expect((await post('/api/quiet', {}, viewer)).status).toBe(403);
    expect((await post('/api/controls', { take: true }, operator)).status).toBe(200);
    expect((await post('/api/quiet', {}, operator)).status).toBe(200);

    // Somebody who is taken out at the rig is out, and who is added is in, while it runs.
    expect((await run('people', 'remove', 'viewer-2', '--rig', rigPath)).status).toBe(0);
    const added = await run('people', 'add', 'zoe', '--as', 'operator', '--rig', rigPath, '--json');
    const { name, secret } = JSON.parse(added.said) as { name: string; secret: string };
    expect((await post('/api/sign-in', { name, secret })).status).toBe(200);
    let status = 0;
    for (let n = 0; n < 200 && status !== 401; n++) {
      await new Promise((resolve) => setTimeout(resolve, 100));
      status = await state(viewer);
    }
    expect([status, await state(operator)]).toEqual([401, 200]);
    const list = JSON.parse((await run('people', '--rig', rigPath, '--json')).said) as {
      people: { name: string; role: string }[];
    };
    expect(list.people.map((one) => `${one.name} ${one.role}`)).toEqual([
      'operator operator',
      'viewer-1 viewer',
      'zoe operator',
    ]);
    expect(JSON.stringify(list)).not.toContain('hash');
    const left = new Promise<number | null>((resolve) => child.once('exit', resolve));
    child.kill('SIGINT');
    expect(await left).toBe(0);
  });

  test('says what is wrong with what it is told before anything starts', async () => {
    const serve = (...flags: string[]) => run('serve', '--rig', rigPath, ...flags);
    const [listen, tls, nobody] = await Promise.all([
      serve('--listen', '8711'),
      serve('--tls-cert', 'cert.pem'),
      run('people', 'renew', 'nobody', '--rig', rigPath),
    ]);
    expect([listen.status, listen.said]).toEqual([1, expect.stringContaining('WEB_LISTEN')]);
    expect([tls.status, tls.said]).toEqual([1, expect.stringContaining('WEB_TLS')]);
    expect([nobody.status, nobody.said]).toEqual([1, expect.stringContaining('WEB_PERSON')]);
  });
});

describe('an address to listen at', () => {
  test('is an address and a port', () => {
    expect(parseListen('0.0.0.0:8711')).toEqual({ host: '0.0.0.0', port: 8711 });
    expect(parseListen('[::]:80')).toEqual({ host: '::', port: 80 });
    expect(parseListen('rig1.example:0')).toEqual({ host: 'rig1.example', port: 0 });
    for (const bad of [
      '',
      ':80',
      '0.0.0.0',
      '[::]',
      '::1:80',
      '[zz]:80',
      'a b:80',
      'x:65536',
      'x:-1',
    ]) {
      expect(() => parseListen(bad), bad).toThrow(expect.objectContaining({ code: 'WEB_LISTEN' }));
    }
  });

  test('is told to people under the names that were given, else as the addresses of this machine', () => {
    const tls = { cert: 'c', key: 'k' };
    expect(pageAddresses({ host: '0.0.0.0', port: 0, names: ['rig1.example'], tls }, 443)).toEqual([
      'https://rig1.example:443',
    ]);
    expect(pageAddresses({ host: '127.0.0.1', port: 0 }, 8711)).toEqual(['http://127.0.0.1:8711']);
    expect(pageAddresses({ host: '::1', port: 0 }, 8711)).toEqual(['http://[::1]:8711']);
    for (const address of pageAddresses({ host: '::', port: 0 }, 8711)) {
      expect(new URL(address).port).toBe('8711');
    }
  });
});
