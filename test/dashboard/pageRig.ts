import { join } from 'node:path';
import type { FastifyInstance } from 'fastify';
import type { Browser, BrowserContextOptions, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { buildWeb, type WebOptions } from '../../server/web/buildWeb.js';
import { launchBrowser } from '../tools/browser.js';
import { FakeLoop } from '../tools/fakeLoop.js';

export interface PageRig {
  readonly loop: FakeLoop;
  readonly app: FastifyInstance;
  readonly url: string;
  readonly page: Page;
  /** Whatever the page said on its console as an error, and what it threw. */
  readonly troubles: string[];
}

let browser: Browser;
/** What `npm run build` made: the test command does so before any test. */
const built = join(packageRoot, 'dist/dashboard');
let end: (() => Promise<void>) | undefined;

/** Starts a browser once for the file's tests. */
export function useBrowser(): void {
  beforeAll(async () => {
    browser = await launchBrowser();
  });
  afterEach(async () => {
    await end?.();
    end = undefined;
  });
  afterAll(async () => {
    await browser?.close();
  });
}

/** A scripted loop, the web process, and one page that shows it. */
export async function openPage(
  context: BrowserContextOptions = {},
  prepare: (loop: FakeLoop) => void = () => undefined,
  theme = 'dark',
  more: Partial<WebOptions> & { readonly at?: string } = {},
): Promise<PageRig> {
  const { at = '', ...web } = more;
  const loop = await new FakeLoop().start();
  prepare(loop);
  const { socketPath, tokenFile } = loop;
  const app = buildWeb({
    socketPath,
    tokenFile,
    dashboard: built,
    log: false,
    requestsPerS: 1000,
    loopTimeoutMs: 1500,
    ...web,
  });
  const url = await app.listen({ host: '127.0.0.1', port: 0 });
  const viewport = { width: 1440, height: 1000 };
  const view = await browser.newContext({ viewport, ...context });
  const page = await view.newPage();
  const troubles: string[] = [];
  page.on('pageerror', (error) => troubles.push(error.message));
  page.on('console', (message) => {
    if (message.type() === 'error') troubles.push(message.text());
  });
  await page.addInitScript((name) => localStorage.setItem('lapwing.theme', name), theme);
  await page.goto(url + at);
  end = async () => {
    await view.close();
    await app.close();
    await loop.stop();
  };
  return { loop, app, url, page, troubles };
}

/** The number that the page shows in the element with this id. */
export async function shownNumber(page: Page, id: string): Promise<number> {
  return Number(await page.locator(`#${id}`).textContent());
}
