import { copyFileSync, mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Page } from 'playwright-core';
import { afterAll, describe, expect, test } from 'vitest';
import { packageRoot } from '../../server/packageRoot.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { until } from '../web/webRig.js';
import { openPage, useBrowser } from './pageRig.js';
import { axeFinds, tabTo as tabWithin } from './pageTools.js';

useBrowser();

const demo = join(packageRoot, 'hardware-sim/demo');
const rulesFolder = mkdtempSync(join(tmpdir(), 'lapwing-desk-'));
copyFileSync(join(demo, 'sessions/06-induction-sham.yaml'), join(rulesFolder, 'induction.yaml'));
afterAll(() => rmSync(rulesFolder, { recursive: true, force: true }));

async function openDesk(context = {}) {
  const rig = readRig(join(demo, 'rig.yaml'));
  const more = { rig, rulesFolder, at: '/#rehearse' };
  const opened = await openPage(context, (loop) => void loop.run(), 'dark', more);
  await opened.page.locator('.belt-row').first().waitFor();
  return opened;
}

/** Within the 60 presses that the page's own keys take at most. */
const tabTo = (page: Page, name: RegExp, key = 'Tab') => tabWithin(page, name, key, 60);

const lineOfCursor = (page: Page) =>
  page.locator('.cm-lineNumbers .cm-activeLineGutter').textContent();

describe('the Rehearse page, in a real browser', () => {
  test('by keyboard alone: a mistake is told, its mending too; a rehearsal shows what fired', {
    timeout: 150_000,
  }, async () => {
    const { page, troubles, loop } = await openDesk();
    // Out of the Run page into the other one, and there into the text.
    await tabTo(page, /^Rules file$/);
    await page.keyboard.press('Control+End');
    await page.keyboard.type('endd: lap > 3');
    await page.getByText('nearest: end').waitFor();
    await page.locator('.problem-row.error').first().waitFor();
    await page.locator('.cm-lintRange-error').first().waitFor({ state: 'attached' });
    expect(await page.getByRole('button', { name: 'Rehearse', exact: true }).isDisabled()).toBe(
      true,
    );
    // Single keys that act on the rig do nothing while someone types.
    expect(loop.acts()).toEqual([]);
    for (let n = 0; n < 'endd: lap > 3'.length; n++) await page.keyboard.press('Backspace');
    await until(async () => (await page.locator('.problem-row.error').count()) === 0);
    await until(async () => (await page.locator('.cm-lintRange-error').count()) === 0);

    // The line under the cursor has its place marked, and the place its line.
    await page.keyboard.press('Control+Home');
    await tabTo(page, /^induce, line 20/);
    await until(async () => (await lineOfCursor(page)) === '20');
    await page.locator('.belt-row.current').getByText('induce').waitFor();
    await tabTo(page, /^At most, minutes/);
    await page.keyboard.press('Control+A');
    await page.keyboard.type('6');
    await tabTo(page, /^Rehearse$/);
    await page.keyboard.press('Enter');
    await page.locator('.result').waitFor({ timeout: 90_000 });
    const row = page.getByRole('row', { name: /^water/ });
    expect(Number(await row.locator('td').first().textContent())).toBeGreaterThan(2);
    await until(() =>
      page.locator('.result .raster canvas').evaluate((element) => {
        const canvas = element as HTMLCanvasElement;
        const { data } = canvas.getContext('2d')!.getImageData(0, 0, canvas.width, canvas.height);
        return data.some((value) => value > 0);
      }),
    );
    // How several sessions differ, asked for from the same form.
    await tabTo(page, /^Sessions/, 'Shift+Tab');
    await page.keyboard.press('Control+A');
    await page.keyboard.type('3');
    await page.keyboard.press('Enter');
    await page.locator('.result.many').waitFor({ timeout: 90_000 });
    await page.getByRole('row', { name: /^water .*always|^water .*\(/ }).waitFor();
    expect(await page.locator('.result.many svg.spread').count()).toBeGreaterThan(6);
    // The policy forbids inline style, script and unsafe sinks: the editor must not even try.
    expect(troubles).toEqual([]);

    expect(await axeFinds(page)).toEqual([]);
  });

  test('completes a name, saves under a new one, and keeps the text while the Run page is open', async () => {
    const { page } = await openDesk();
    await page.locator('.cm-content').click();
    await page.keyboard.press('Control+End');
    await page.keyboard.type('end: time >= 60 min');
    await page.keyboard.press('Control+End');
    await page.keyboard.type(' or firings of indu');
    await page.locator('.cm-tooltip-autocomplete').getByText('induce').waitFor();
    // An open list takes no key in its first instants, so as not to be chosen from by chance.
    await page.waitForTimeout(300);
    await page.keyboard.press('Enter');
    await page.keyboard.type(' this session >= 3');
    await page.getByLabel('Save under a new name').fill('mine');
    await page.keyboard.press('Enter');
    await page.getByText('Saved as mine.yaml.').waitFor();
    expect(readFileSync(join(rulesFolder, 'mine.yaml'), 'utf8')).toMatch(
      /or firings of induce this session >= 3$/,
    );
    await page.getByRole('link', { name: 'Run' }).click();
    await page.locator('.vitals').waitFor();
    await page.getByRole('link', { name: 'Rehearse' }).click();
    await page.locator('.cm-content').getByText('this session').first().waitFor();
    expect(await page.getByLabel('Open a file').inputValue()).toBe('mine.yaml');
  });

  test('on a phone it is one column, and the stop still under the thumb', async () => {
    const phone = { viewport: { width: 360, height: 740 }, isMobile: true, hasTouch: true };
    const { page } = await openDesk(phone);
    expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(360);
    const stop = (await page.getByRole('button', { name: 'Stop everything' }).boundingBox())!;
    expect(stop.y + stop.height).toBeGreaterThan(700);
  });
});
