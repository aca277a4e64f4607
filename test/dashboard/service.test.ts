/**
 * The whole service as `npm start` runs it, in processes of its own: simulated board on a
 * pseudo-terminal, loop, web, and a real browser at the page. Runs what is in `dist/`.
 */
import { type ChildProcess, execFileSync, spawn } from 'node:child_process';
import { mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { type AddressInfo, createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, expect, test } from 'vitest';
import type { Setup, Snapshot } from '../../server/loop/protocol.js';
import { launchBrowser } from '../tools/browser.js';
import { shownNumber } from './pageRig.js';

const folder = mkdtempSync(join(tmpdir(), 'lapwing-service-'));
const records = join(folder, 'records');
let service: ChildProcess;
let said = '';
let browser: Browser;
let url = '';

beforeAll(async () => {
  const main = new URL('../../dist/server/main/main.js', import.meta.url).pathname;
  service = spawn(
    process.execPath,
    [main, 'demo', '--port', await freePort(), '--records', records, '--no-earlier'],
    {
      env: { ...process.env, LAPWING_RUNTIME: folder },
      stdio: ['ignore', 'pipe', 'pipe'],
    },
  );
  const hear = (bytes: Buffer) => {
    said += bytes.toString();
  };
  service.stdout!.on('data', hear);
  service.stderr!.on('data', hear);
  browser = await launchBrowser();
  url = await untilSaid(/http:\/\/127\.0\.0\.1:\d+/);
});

afterAll(async () => {
  await browser?.close();
  if (service.exitCode === null) service.kill('SIGKILL');
  rmSync(folder, { recursive: true, force: true });
});

async function untilSaid(words: RegExp): Promise<string> {
  for (let n = 0; n < 400; n++) {
    const found = said.match(words);
    if (found) return found[0];
    if (service.exitCode !== null) break;
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
  throw new Error(`the service never said ${words}; it said:\n${said}`);
}

/** One that stays the same when the web process is started again. */
function freePort(): Promise<string> {
  return new Promise((resolve) => {
    const server = createServer().listen(0, '127.0.0.1', () => {
      const { port } = server.address() as AddressInfo;
      server.close(() => resolve(String(port)));
    });
  });
}

/** The number of the service's own child that runs this script. */
function childOf(pid: number, script: string): number {
  const list = execFileSync('ps', ['--ppid', String(pid), '-o', 'pid=,args=']).toString();
  const line = list.split('\n').find((one) => one.includes(script));
  if (line === undefined) throw new Error(`no ${script} among:\n${list}`);
  return Number.parseInt(line, 10);
}

test('laps grow, killed processes come back, stop leaves the outputs idle, the session ends in order', {
  timeout: 240_000,
}, async () => {
  const page = await browser.newPage({ viewport: { width: 1440, height: 1000 } });
  page.setDefaultTimeout(120_000);
  const troubles: string[] = [];
  page.on('pageerror', (error) => troubles.push(error.message));
  page.on('console', (message) => {
    if (message.type() === 'error') troubles.push(message.text());
  });
  await page.goto(url);
  await page.locator('.session-running').waitFor();
  for (const least of [1, 2]) {
    await page.waitForFunction(
      (lap) => Number(document.getElementById('lap')?.textContent) >= lap,
      least,
    );
  }
  // The demo gives water at 90 cm on every lap.
  await page
    .getByText(/water fired \(valve\)/)
    .first()
    .waitFor();
  expect(await shownNumber(page, 'water')).toBeGreaterThan(0);
  // The web process was told the rig and its rules: they can be edited beside the session.
  const { files } = (await (await fetch(`${url}/api/rules`)).json()) as { files: string[] };
  expect(files).toContain('demo.yaml');

  // Each is started again by the launcher; the page follows by itself, with the laps that it had.
  for (const script of ['webProcess.js', 'loopProcess.js']) {
    const lap = await shownNumber(page, 'lap');
    process.kill(childOf(service.pid!, script), 'SIGKILL');
    await page.locator('.shown.stale').first().waitFor();
    await page.locator('.session-running').waitFor();
    expect(await shownNumber(page, 'lap')).toBeGreaterThanOrEqual(lap);
    await page
      .getByText(/water fired \(valve\)/)
      .first()
      .waitFor();
  }
  // That the network broke off is no fault of the page.
  troubles.length = 0;

  await page.getByRole('button', { name: 'Stop everything' }).click();
  await page.getByText('Stopped: the loop confirmed').waitFor();
  await page.getByText('Outputs are idle').waitFor();
  await page
    .getByText(/^Held: /)
    .first()
    .waitFor();
  const get = async <T>(path: string) => (await (await fetch(url + path)).json()) as T;
  const [state, setup] = [await get<Snapshot>('/api/state'), await get<Setup>('/api/setup')];
  const on = setup.outputs.filter((one, n) => one.kind !== 'mark' && (state.outputs >> n) & 1);
  expect(on).toEqual([]);
  expect(state.held.stimulus).toContain('stopped');
  expect(state.held.water).toContain('stopped');
  expect(state.record.state).toBe('writing');

  await page.getByRole('button', { name: 'End session…' }).click();
  await page.getByLabel('Why it ends').fill('the test has seen enough');
  await page.getByRole('button', { name: 'End the session' }).click();
  await page.getByText('The last session ended: the test has seen enough').waitFor();
  expect(troubles).toEqual([]);

  const left = new Promise<number | null>((resolve) => service.once('exit', resolve));
  service.kill('SIGINT');
  expect(await left).toBe(0);
  expect(readdirSync(records).length).toBe(1);
});
