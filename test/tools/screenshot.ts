/**
 * Pictures of the pages of a running service, in each theme, as on a desk and on a phone:
 * `node dist/test/tools/screenshot.js --url http://127.0.0.1:8711 --out pictures [--laps 12]`.
 */
import { mkdir } from 'node:fs/promises';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import type { Page } from 'playwright-core';
import { launchBrowser } from './browser.js';

export interface Pictures {
  readonly url: string;
  readonly out: string;
  /** Waits until the page shows this lap, so that there is something to see. */
  readonly laps?: number;
  readonly themes?: readonly string[];
  readonly timeoutMs?: number;
  /** Done in each page before its picture is taken. */
  readonly prepare?: (page: Page) => Promise<void>;
}

const SCREENS = [
  { name: 'desk', width: 1440, height: 1000, scale: 1, phone: false },
  { name: 'phone', width: 390, height: 844, scale: 2, phone: true },
] as const;

/** Rehearses the file that the other page opens with. */
async function pictureRehearsal(page: Page, url: string, file: string): Promise<string> {
  await page.goto(`${url}/#rehearse`);
  await page.locator('.belt-row').first().waitFor();
  await page.getByRole('button', { name: 'Rehearse', exact: true }).click();
  await page.locator('.result').waitFor({ timeout: 120_000 });
  await page.locator('.belt-row').last().focus();
  await page.evaluate(() => window.scrollTo(0, 0));
  await page.waitForTimeout(300);
  await page.screenshot({ path: file });
  return file;
}

/** One session of those that the demo makes for a newcomer, with what happened in it. */
async function pictureRecords(page: Page, url: string, file: string): Promise<string> {
  await page.goto(`${url}/#records`);
  const session = page.getByRole('link', { name: 'Induction with sham laps' });
  await session.waitFor({ timeout: 240_000 });
  await session.click();
  await page.locator('.rules-table').waitFor({ timeout: 120_000 });
  await page.evaluate(() => window.scrollTo(0, 0));
  await page.waitForTimeout(300);
  await page.screenshot({ path: file });
  return file;
}

/** A page as it is when it is opened. */
async function picturePage(page: Page, url: string, name: string, file: string): Promise<string> {
  await page.goto(`${url}/#${name}`);
  await page.locator(`main.${name}`).waitFor();
  await page.waitForTimeout(2500);
  await page.screenshot({ path: file });
  return file;
}

/**
 * Writes `run-THEME-desk.png`, `run-THEME-phone.png`, and the same of the Rehearse page, and of the other
 * pages in the first theme, into `out`, and returns their paths.
 */
export async function takePictures(wanted: Pictures): Promise<string[]> {
  const { url, out, laps = 0, themes = ['dark', 'light', 'red'], timeoutMs = 300_000 } = wanted;
  await mkdir(out, { recursive: true });
  const browser = await launchBrowser();
  const files: string[] = [];
  try {
    for (const theme of themes) {
      for (const { name, width, height, scale, phone } of SCREENS) {
        const viewport = { width, height };
        const page = await browser.newPage({ viewport, deviceScaleFactor: scale, isMobile: phone });
        await page.addInitScript((chosen) => localStorage.setItem('lapwing.theme', chosen), theme);
        await page.goto(url);
        await page.waitForFunction(
          (least) => Number(document.getElementById('lap')?.textContent) >= least,
          laps,
          { timeout: timeoutMs },
        );
        // The profile is drawn twice a second.
        await page.waitForTimeout(1200);
        await wanted.prepare?.(page);
        const file = join(out, `run-${theme}-${name}.png`);
        await page.screenshot({ path: file });
        files.push(file);
        files.push(await pictureRehearsal(page, url, join(out, `rehearse-${theme}-${name}.png`)));
        if (theme === themes[0]) {
          const at = (of: string) => join(out, `${of}-${theme}-${name}.png`);
          files.push(await pictureRecords(page, url, at('records')));
          files.push(await picturePage(page, url, 'animals', at('animals')));
          files.push(await picturePage(page, url, 'rig', at('rig')));
        }
        await page.close();
      }
    }
  } finally {
    await browser.close();
  }
  return files;
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const { values } = parseArgs({
    options: {
      url: { type: 'string', default: 'http://127.0.0.1:8711' },
      out: { type: 'string', default: 'pictures' },
      laps: { type: 'string', default: '0' },
    },
  });
  const laps = Number(values.laps);
  const files = await takePictures({ url: values.url, out: values.out, laps });
  for (const file of files) console.log(file);
}
