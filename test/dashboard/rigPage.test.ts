/** The Rig page over a whole service on the simulated rig, in a real browser. Runs `dist/`. */
import axe from 'axe-core';
import type { Browser, Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { launchBrowser } from '../tools/browser.js';
import { ServedRig } from '../tools/servedRig.js';

let rig: ServedRig;
let browser: Browser;
beforeAll(async () => {
  rig = await ServedRig.start();
  browser = await launchBrowser();
}, 120_000);
afterAll(async () => {
  await browser?.close();
  await rig?.stop();
});

async function openRig(context = {}, theme = 'dark') {
  const view = await browser.newContext({ viewport: { width: 1440, height: 1000 }, ...context });
  const page = await view.newPage();
  page.setDefaultTimeout(25_000);
  const troubles: string[] = [];
  page.on('pageerror', (error) => troubles.push(error.message));
  page.on('console', (message) => {
    if (message.type() === 'error') troubles.push(message.text());
  });
  await page.addInitScript((name) => localStorage.setItem('lapwing.theme', name), theme);
  await page.goto(`${rig.url}/#rig`);
  await page.getByRole('heading', { name: 'Try outputs' }).waitFor();
  return { page, troubles, close: () => view.close() };
}

async function grave(page: Page) {
  await page.evaluate(axe.source);
  const found = await page.evaluate(async () => {
    const { violations } = await (
      window as unknown as { axe: { run(of: string): Promise<{ violations: unknown[] }> } }
    ).axe.run('main');
    return violations as { id: string; impact: string; nodes: { html: string }[] }[];
  });
  return found
    .filter(({ impact }) => impact === 'serious' || impact === 'critical')
    .map(({ id, nodes }) => `${id}: ${nodes[0]?.html}`);
}

/** Presses Tab until what has the focus is named so. */
async function tabTo(page: Page, name: RegExp): Promise<void> {
  for (let n = 0; n < 90; n++) {
    await page.keyboard.press('Tab');
    const there = await page.evaluate(() => {
      const active = document.activeElement as HTMLInputElement | null;
      const label = active?.labels?.[0]?.textContent;
      return (active?.getAttribute('aria-label') ?? label ?? active?.textContent ?? '').trim();
    });
    if (name.test(there)) return;
  }
  throw new Error(`Tab never came to ${name}`);
}

/** A machine that is held up is too late for a pulse, and says so: then once more. */
async function untilTried(page: Page, words: RegExp, press: () => Promise<void>): Promise<void> {
  for (let n = 0; n < 8; n++) {
    await press();
    await page.locator('.said strong').waitFor();
    const said = (await page.locator('.said strong').textContent()) ?? '';
    if (words.test(said)) return;
    if (!said.includes('board did not do it')) throw new Error(said);
    await page.getByRole('button', { name: 'Close' }).first().click();
  }
  throw new Error(`never: ${words}`);
}

describe('the Rig page, in a real browser', { timeout: 180_000 }, () => {
  test('by keyboard alone: an output is tried, a guide gone through, its result listed', async () => {
    const { page, troubles, close } = await openRig();
    await page.locator('.board-now').getByText('simulated').waitFor();
    const before = (await rig.rises())[4]!;
    await tabTo(page, /^Pulse marker$/);
    await untilTried(page, /^marker was on for 10\.00 ms/, () => page.keyboard.press('Enter'));
    expect((await rig.rises())[4]! - before).toBe(1);

    await tabTo(page, /^Measure latency$/);
    await page.keyboard.press('Enter');
    await page.getByRole('spinbutton', { name: 'Pulses' }).fill('20');
    await page.getByRole('spinbutton', { name: 'At least' }).fill('2');
    await page.keyboard.press('Enter');
    await page.getByRole('button', { name: 'Done', exact: true }).waitFor();
    expect(await page.locator('figure.measured svg').count()).toBe(3);
    await page.getByRole('button', { name: 'Done', exact: true }).press('Enter');
    await page.getByText(/^Kept as latency-/).waitFor();
    await page.getByRole('button', { name: 'Close' }).last().press('Enter');
    await page
      .locator('.calibrations li')
      .getByText(/^latency-/)
      .waitFor();
    expect(troubles).toEqual([]);
    await close();
  });

  test('what drives a stimulus wants a long press', async () => {
    const { page, close } = await openRig();
    const button = page.getByRole('button', { name: 'Hold to pulse tone' });
    const before = (await rig.rises())[3]!;
    await button.hover();
    await page.mouse.down();
    await page.waitForTimeout(60);
    await page.mouse.up();
    await page.waitForTimeout(700);
    expect((await rig.rises())[3]! - before).toBe(0);
    await untilTried(page, /^tone was on for/, async () => {
      await page.mouse.up();
      await page.mouse.down();
    });
    await page.mouse.up();
    expect((await rig.rises())[3]! - before).toBe(1);
    await close();
  });

  test.each(['dark', 'red', 'light'])(
    'has nothing that axe calls serious, in %s',
    async (theme) => {
      const { page, close } = await openRig({ reducedMotion: 'reduce' }, theme);
      expect(await grave(page)).toEqual([]);
      await close();
    },
  );

  test('folds into one column on a phone, and nothing hangs over its edge', async () => {
    const { page, close } = await openRig({ viewport: { width: 390, height: 800 } });
    const [wide, seen] = await page.evaluate(() => [
      document.documentElement.scrollWidth,
      document.documentElement.clientWidth,
    ]);
    expect(wide).toBeLessThanOrEqual(seen!);
    await close();
  });
});
