import { cpSync, existsSync, readFileSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import type { BrowserContextOptions } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { updateDescription } from '../../server/session/description.js';
import { mend } from '../../server/session/record/mend.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { noteReplay } from '../../server/session/selfCheck.js';
import { recordedSession } from '../analysis/recorded.js';
import { describedSession, plainFolder, recordsFolder } from '../web/records/folders.js';
import { until } from '../web/webRig.js';
import { openPage, useBrowser } from './pageRig.js';
import { axeFinds, tabTo } from './pageTools.js';

useBrowser();

const demo = join(packageRoot, 'hardware-sim/demo');
const FIRST = '2026-03-04_09-30-00_m07_Demo';
const SECOND = '2026-03-05_09-30-00_m07_Demo';
let untouched: string;
let root: string;

beforeAll(async () => {
  const made = recordedSession({ minutes: 2 });
  await mend(made.folder);
  await noteReplay(made.folder);
  untouched = recordsFolder();
  for (const name of [FIRST, SECOND]) {
    cpSync(made.folder, join(untouched, name), { recursive: true });
    updateDescription(join(untouched, name), { startedAt: `${name.slice(0, 10)}T09:30:00.000Z` });
  }
  updateDescription(join(untouched, SECOND), { title: 'A second day' });
  describedSession(untouched, '2026-02-01_08-00-00_m08_Left', {
    ...{ subject: 'm08', title: 'Left open', ended: null },
    startedAt: '2026-02-01T08:00:00.000Z',
  });
  plainFolder(untouched, '2026-01-01_08-00-00_m09_Torn', { 'session.json': '{' });
  made.remove();
});
afterAll(() => rmSync(untouched, { recursive: true, force: true }));

/** The Records page over a copy of the sessions. */
async function openRecords(context: BrowserContextOptions = {}, at = '/#records') {
  root = recordsFolder();
  cpSync(untouched, root, { recursive: true });
  const rig = readRig(join(demo, 'rig.yaml'));
  const more = { rig, rulesFolder: join(demo, 'sessions'), records: root, at };
  const opened = await openPage(context, (loop) => void loop.run(), 'dark', more);
  if (at !== '/') await opened.page.locator('.sessions').waitFor({ state: 'attached' });
  return opened;
}

/** Work is done in processes that give way to all else. */
const LONG = { timeout: 100_000 };

describe('the Records page, in a real browser', { timeout: 200_000 }, () => {
  test('by mouse: a session is found, told, reported, replayed and tried with other rules', async () => {
    const { page, troubles } = await openRecords();
    await page.getByText('4 sessions', { exact: true }).waitFor();
    await page.getByLabel('Words in it').fill('second');
    await page.getByText('1 of 4 sessions').waitFor();
    await page.getByRole('link', { name: 'A second day' }).click();
    await page.getByText(/laps? in 2\.0 min/).waitFor(LONG);
    const water = page.getByRole('row', { name: /^water/ }).first();
    expect(Number(await water.locator('td').first().textContent())).toBeGreaterThan(0);

    await page.getByRole('button', { name: 'Make the report' }).click();
    const report = page.frameLocator('iframe');
    await report.getByText('Proof sheet: every firing').waitFor(LONG);
    await page.getByRole('button', { name: 'Hide it' }).click();
    expect(await page.locator('iframe').count()).toBe(0);

    await page.getByRole('button', { name: 'Replay it' }).click();
    await page.getByText(/^Identical$/).waitFor(LONG);
    await page.getByLabel('Rules file').last().selectOption('01-fixed-place.yaml');
    await page.getByRole('button', { name: 'See what it would have done' }).click();
    await page.getByText('might have moved otherwise').waitFor(LONG);

    expect(await axeFinds(page)).toEqual([]);
    // What was found out is there again when the page is loaded anew.
    await page.reload();
    await page.getByText(/^Identical$/).waitFor(LONG);
    expect(troubles).toEqual([]);
  });

  test('an export is made and taken along as one file', async () => {
    const { page, troubles } = await openRecords({}, `/#records/${SECOND}`);
    await page.getByRole('button', { name: 'Make: Tables' }).click();
    await page.getByRole('link', { name: 'Download: Tables' }).waitFor(LONG);
    const [download] = await Promise.all([
      page.waitForEvent('download'),
      page.getByRole('link', { name: 'Download: Tables' }).click(),
    ]);
    expect(download.suggestedFilename()).toBe(`${SECOND}_tables.zip`);
    const saved = await download.path();
    // A local file header of ZIP (APPNOTE 4.3.7).
    expect(readFileSync(saved).subarray(0, 4).toString('latin1')).toBe('PK\x03\x04');

    expect(troubles).toEqual([]);
  });

  test('by keyboard alone: two sessions are compared, one is opened, its report made', async () => {
    const { page, loop } = await openRecords({}, '/');
    await tabTo(page, /^Records$/);
    await page.keyboard.press('Enter');
    await page.locator('.sessions').waitFor();
    await tabTo(page, /^Animalall/);
    await page.keyboard.type('m07');
    await page.getByText('2 of 4 sessions').waitFor();
    await tabTo(page, /^Tick those shown$/);
    await page.keyboard.press('Enter');
    await tabTo(page, /^Compare$/);
    await page.keyboard.press('Enter');
    await page.locator('.trends').waitFor(LONG);
    expect(await page.locator('.comparison-panel tbody tr').count()).toBe(2);
    await tabTo(page, /^A second day$/);
    await page.keyboard.press('Enter');
    await page.getByText(/laps? in 2\.0 min/).waitFor(LONG);
    await tabTo(page, /^Make the report$/);
    await page.keyboard.press('Enter');
    await page.locator('iframe').waitFor(LONG);
    expect(existsSync(join(root, SECOND, 'derived/report.html'))).toBe(true);
    // Letters that act on the rig did nothing while somebody typed.
    expect(loop.acts()).toEqual([]);
  });

  test('what wants looking at is found and shown as such', async () => {
    const { page } = await openRecords();
    await page.getByLabel('Show').selectOption('Want looking at');
    await page.getByText('2 of 4 sessions').waitFor();
    await page.getByRole('row', { name: /bad description/ }).waitFor();
    await page.getByRole('link', { name: 'Left open' }).click();
    await page.getByRole('button', { name: 'Mend the record' }).waitFor();
    // There is nothing in it: mending fails, and says why.
    await page.getByRole('button', { name: 'Mend the record' }).click();
    await page.getByText(/Mending: .*holds no record/).waitFor(LONG);
    await page.getByRole('link', { name: '2026-01-01_08-00-00_m09_Torn' }).click();
    await page.getByText('Its description cannot be read').waitFor();
    await page.getByRole('columnheader', { name: 'Title' }).getByRole('button').click();
    await until(
      async () =>
        (await page.getByRole('columnheader', { name: 'Title' }).getAttribute('aria-sort')) ===
        'ascending',
    );
  });

  test('work can be cancelled where it is shown', async () => {
    const { page } = await openRecords({}, `/#records/${FIRST}`);
    await page.getByRole('button', { name: 'Make: Parquet' }).click();
    const cancel = page.getByRole('button', { name: 'Cancel: Exporting: Parquet' });
    await cancel.click();
    await page.getByText('Exporting: Parquet: cancelled').waitFor();
    expect(existsSync(join(root, FIRST, 'derived/parquet'))).toBe(false);
  });

  test('on a phone it is the list or the session, and every page is at hand', async () => {
    const phone = { viewport: { width: 360, height: 740 }, isMobile: true, hasTouch: true };
    const { page } = await openRecords(phone);
    expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(360);
    expect(await axeFinds(page)).toEqual([]);
    for (const link of await page.locator('.pages a').all()) {
      const box = (await link.boundingBox())!;
      expect(box.x + box.width).toBeLessThanOrEqual(360);
      expect(box.height).toBeGreaterThanOrEqual(40);
    }
    await page.getByRole('link', { name: 'A second day' }).click();
    await page.getByText(/laps? in 2\.0 min/).waitFor(LONG);
    expect(await page.locator('.sessions').isVisible()).toBe(false);
    expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(360);
    expect(await axeFinds(page)).toEqual([]);
    await page.getByRole('link', { name: 'All sessions' }).click();
    await page.locator('.sessions').waitFor();
  });

  test('with no session yet it says where they will come from', async () => {
    const more = { records: join(root, 'none'), at: '/#records' };
    const { page } = await openPage({}, (loop) => void loop.run(), 'dark', more);
    await page.getByText('There is no session yet').waitFor();
  });
});
