import axe from 'axe-core';
import type { Page } from 'playwright-core';
import { describe, expect, test } from 'vitest';
import type { FakeLoop } from '../tools/fakeLoop.js';
import { until } from '../web/webRig.js';
import { openPage, shownNumber, useBrowser } from './pageRig.js';

useBrowser();

const running = (loop: FakeLoop) => {
  loop.animal.begin('induction.yaml', 'M12', 'KL', '3');
  loop.animal.advance(100);
  loop.run();
};

/** How many pixels of a canvas of the page are drawn on. */
async function inkOf(page: Page, selector: string): Promise<number> {
  return page
    .locator(selector)
    .first()
    .evaluate((element) => {
      const canvas = element as HTMLCanvasElement;
      const pixels = canvas.getContext('2d')!.getImageData(0, 0, canvas.width, canvas.height).data;
      let ink = 0;
      for (let n = 3; n < pixels.length; n += 4) if (pixels[n]! > 0) ink++;
      return ink;
    });
}

/** A key pressed and let go within one task: never long, however slow the machine. */
async function tapKey(page: Page, code: string): Promise<void> {
  await page.evaluate((name) => {
    const target = document.activeElement ?? document.body;
    for (const type of ['keydown', 'keyup']) {
      target.dispatchEvent(
        new KeyboardEvent(type, { code: name, key: name, bubbles: true, cancelable: true }),
      );
    }
  }, code);
}

describe('the page, in a real browser', () => {
  test('laps, licks and water grow on the screen while the animal runs', async () => {
    const { page, loop, troubles } = await openPage({}, (loop) => {
      loop.animal.begin('induction.yaml', 'M12');
      loop.run(8);
    });
    await until(async () => (await shownNumber(page, 'lap')) >= 1);
    const lap = await shownNumber(page, 'lap');
    const ink = await inkOf(page, '.raster canvas');
    await until(async () => (await shownNumber(page, 'lap')) >= lap + 4);
    await until(async () => (await inkOf(page, '.raster canvas')) > ink);
    expect(await shownNumber(page, 'water')).toBeGreaterThan(0);
    expect(await page.locator('.events-panel li').first().textContent()).toMatch(/lap \d+/);
    expect(await page.title()).toMatch(/^Lap \d+ · \w+ · Lapwing$/);
    expect(await inkOf(page, '.strip canvas:nth-child(2)')).toBeGreaterThan(50);
    expect(loop.connections).toBe(1);
    // The policy forbids inline script and style: the page must not even try.
    expect(troubles).toEqual([]);
  });

  test('draws the field that the last induction is predicted to leave, and says it in words', async () => {
    const { page, loop } = await openPage({}, running);
    await page.locator('.field-panel .curve').waitFor();
    const field = loop.animal.events.findLast(({ event }) => event.kind === 'field predicted')!;
    const { event } = field as { event: Extract<typeof field.event, { kind: 'field predicted' }> };
    await page
      .getByText(`${event.widthCm.toFixed(0)} cm wide.`, { exact: false })
      .first()
      .waitFor();
    const words = await page.locator('.field-panel svg').getAttribute('aria-label');
    expect(words).toContain(`Peak at ${event.peakCm.toFixed(0)} cm`);
    expect(await page.locator('.field-panel').textContent()).toContain('not measured');
  });

  test('draws how far firings were from their places, the board’s and the host’s apart', async () => {
    const { page } = await openPage({}, running);
    await page.locator('.errors-panel .bars').first().waitFor();
    const words = await page.locator('.errors-panel svg').getAttribute('aria-label');
    expect(words).toMatch(
      /firings? started by the board: median \d+\.\d\d mm, most \d+\.\d\d mm; /,
    );
    expect(words).toMatch(/by the host/);
  });

  test('says how old it is, and turns grey, when the board, the loop or the service is gone', async () => {
    const { page, loop, app } = await openPage({}, running);
    await page.locator('.session-running').waitFor();
    expect(await page.locator('.shown.stale').count()).toBe(0);

    loop.freeze();
    await page.getByText('Board time stands still').waitFor();
    expect(await page.locator('.shown.stale').count()).toBeGreaterThan(2);
    expect(await page.title()).toMatch(/^\(stale\)/);
    loop.run();
    await page.locator('.session-running').waitFor();
    await until(async () => (await page.locator('.shown.stale').count()) === 0);

    await loop.goAway();
    await page.getByText('The loop is away').waitFor();
    await until(async () => {
      const age = await page.locator('.stale-age b').textContent();
      return Number.parseFloat(age ?? '0') > 1;
    });
    await loop.start();
    loop.run();
    await until(async () => (await page.locator('.shown.stale').count()) === 0);

    await app.close();
    await page.getByText('No connection to the service').waitFor();
    // What acts is never greyed.
    expect(await page.locator('.stale .stop, .stale .session-panel').count()).toBe(0);
  });

  test('stop everything reaches the loop by button, by key, and over the stream alone', async () => {
    const { page, loop } = await openPage({}, running);
    const quiets = () => loop.heard.filter((one) => one.say === 'quiet').length;
    await page.locator('.session-running').waitFor();
    await page.getByRole('button', { name: 'Stop everything' }).click();
    await page.getByText('Stopped: the loop confirmed').waitFor();
    expect(quiets()).toBeGreaterThan(0);
    await page.getByText('Outputs are idle').waitFor();
    await page.getByText('Held: everything was stopped', { exact: true }).first().waitFor();

    await page.getByRole('button', { name: 'Understood' }).click();
    const before = quiets();
    await tapKey(page, 'Escape');
    await page.waitForTimeout(500);
    expect(quiets()).toBe(before);
    await page.keyboard.down('Escape');
    await page.getByText('Stopped: the loop confirmed').waitFor();
    await page.keyboard.up('Escape');
    expect(quiets()).toBeGreaterThan(before);

    await page.getByRole('button', { name: 'Understood' }).click();
    await page.route('**/api/quiet', (route) => route.abort());
    const last = quiets();
    await page.getByRole('button', { name: 'Stop everything' }).click();
    await page.getByText('Stopped: the loop confirmed').waitFor();
    expect(quiets()).toBeGreaterThan(last);
  });

  test('a stop that is not confirmed says so loudly, and goes on trying until it is', async () => {
    const { page, loop } = await openPage({}, running);
    await page.locator('.session-running').waitFor();
    loop.silent = true;
    await page.getByRole('button', { name: 'Stop everything' }).click();
    await page.getByText('The stop is NOT confirmed').waitFor();
    await page.getByText('Use the manual switch at the rig now').waitFor();
    loop.silent = false;
    await page.getByText('Stopped: the loop confirmed').waitFor();
  });

  test('a whole session by keyboard alone', async () => {
    const { page, loop } = await openPage({}, (loop) => void loop.run());
    const tabTo = async (name: string | RegExp) => {
      for (let n = 0; n < 60; n++) {
        await page.keyboard.press('Tab');
        const there = await page.evaluate(() => {
          const active = document.activeElement as HTMLElement | null;
          const label = (active as HTMLInputElement | null)?.labels?.[0]?.textContent;
          return `${label ?? active?.textContent ?? ''}`.trim();
        });
        if (there.match(name)) return;
      }
      throw new Error(`Tab never came to ${name}`);
    };
    await page.getByRole('button', { name: 'Begin' }).waitFor();
    await tabTo(/^Animal$/);
    await page.keyboard.type('M12');
    await tabTo(/^Begin$/);
    await page.keyboard.press('Enter');
    await page.locator('.session-running').waitFor();
    expect(loop.heard.find((one) => one.say === 'begin')).toMatchObject({ subject: 'M12' });
    loop.advance(30);

    // Out of the field, single keys act from anywhere; what drives an output wants a long press.
    await page.evaluate(() => (document.activeElement as HTMLElement | null)?.blur());
    await tapKey(page, 'KeyS');
    await until(() => loop.acts().some((act) => act.act === 'hold'));
    expect(loop.acts()).toEqual([{ act: 'hold', what: 'stimulus', on: true }]);
    await page.getByText('Held: held by the operator', { exact: true }).waitFor();
    await tapKey(page, 'KeyS');
    await page.waitForTimeout(600);
    expect(loop.acts()).toHaveLength(1);
    await page.keyboard.down('s');
    await until(() => loop.acts().length === 3);
    await page.keyboard.up('s');
    expect(loop.acts().slice(1)).toEqual([
      { act: 'hold', what: 'stimulus', on: false },
      { act: 'allow stimulation' },
    ]);
    await tapKey(page, 'Digit1');
    await page.waitForTimeout(600);
    expect(loop.acts()).toHaveLength(3);
    await page.keyboard.down('1');
    await until(() => loop.acts().length === 4);
    await page.keyboard.up('1');
    expect(loop.acts()[3]).toEqual({ act: 'press', button: 'induce_now' });

    // The mark is made by the key; its words come when there is time for them.
    await page.keyboard.press('n');
    await until(() => loop.acts().length === 5);
    expect(loop.acts()[4]).toEqual({ act: 'mark' });
    await page.getByText('Mark 1: lap').waitFor();
    await page.keyboard.type('swims s1');
    await page.keyboard.press('Enter');
    await until(() => loop.acts().length === 6);
    expect(loop.acts()[5]).toEqual({ act: 'note', text: 'swims s1', mark: 1 });

    await tabTo(/^End session/);
    await page.keyboard.press('Enter');
    await tabTo(/^Why it ends/);
    await page.keyboard.type('enough');
    await page.keyboard.press('Enter');
    await page.getByText('The last session ended: enough').waitFor();
  });

  test('a choice outside its bounds cannot be set, one inside is queued for the next lap', async () => {
    const { page, loop } = await openPage({}, running);
    const field = page.getByRole('spinbutton', { name: 'target' });
    const set = page.getByRole('button', { name: 'Set target' });
    await field.fill('161');
    await page.getByText('At most 160 cm.').waitFor();
    expect(await set.isDisabled()).toBe(true);
    await field.press('Enter');
    await field.fill('52');
    await field.press('Enter');
    await page.getByText(/^45 to 52 cm from lap \d+$/).waitFor();
    expect(loop.acts()).toEqual([{ act: 'choose', name: 'target', value: 52 }]);
  });

  test('what the loop refuses is shown with its remedy', async () => {
    const { page, loop } = await openPage({}, (loop) => void loop.run());
    loop.refusal = { code: 'RULES_X', message: 'line 3: no such place', remedy: 'Mend line 3.' };
    await page.getByLabel('Animal').fill('M12');
    await page.getByRole('button', { name: 'Begin' }).click();
    await page.getByText('line 3: no such place').waitFor();
    await page.getByText('Mend line 3.').waitFor();
  });

  test('nothing wider than the screen of a phone, and the stop under the thumb', async () => {
    const phone = { viewport: { width: 360, height: 740 }, isMobile: true, hasTouch: true };
    const { page, loop } = await openPage(phone, running);
    await page.locator('.session-running').waitFor();
    expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(360);
    const stop = page.getByRole('button', { name: 'Stop everything' });
    await page.evaluate(() => window.scrollTo(0, 1200));
    const box = (await stop.boundingBox())!;
    expect(box.y + box.height).toBeGreaterThan(700);
    expect(box.height).toBeGreaterThanOrEqual(44);
    await stop.tap();
    await page.getByText('Stopped: the loop confirmed').waitFor();
    expect(loop.heard.some((one) => one.say === 'quiet')).toBe(true);
  });
});

const RULES = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];

async function violations(page: Page, runOnly: string[]): Promise<string[]> {
  return page.evaluate(async (rules) => {
    const run = (window as unknown as { axe: typeof axe }).axe.run;
    const found = await run(document, { runOnly: rules });
    return found.violations.map(
      (one) => `${one.id}: ${one.nodes.map((node) => node.html).join(' | ')}`,
    );
  }, runOnly);
}

describe('for everybody', () => {
  test.each(['idle', 'running', 'stale', 'stopped'] as const)(
    'axe finds nothing in any theme while %s',
    async (what) => {
      const { page, loop } = await openPage({}, what === 'idle' ? (l) => void l.run() : running);
      await page.locator(what === 'idle' ? '.session-idle' : '.session-running').waitFor();
      if (what === 'stale') {
        loop.freeze();
        await page.locator('.stale-banner').waitFor();
      }
      if (what === 'stopped') {
        await page.getByRole('button', { name: 'Stop everything' }).click();
        await page.getByText('Stopped: the loop confirmed').waitFor();
      }
      await page.evaluate(axe.source);
      for (const theme of ['Dark', 'Red', 'Light']) {
        await page.getByText(theme, { exact: true }).click();
        // The structure is the same in every theme; the colours are not.
        // What is stale is meant to look faded (WCAG 2.2, 1.4.3, inactive parts); on a slow machine a
        // page that axe holds up may be so for a moment, and is looked at again.
        await until(async () => {
          const found = await violations(page, theme === 'Dark' ? RULES : ['color-contrast']);
          const stale = (await page.locator('.shown.stale').count()) > 0;
          if (stale && what !== 'stale') return false;
          const faded = (one: string) => stale && one.startsWith('color-contrast');
          expect(found.filter((one) => !faded(one))).toEqual([]);
          return true;
        });
      }
    },
  );

  test('the ground is dark before anything else is there', async () => {
    const { page, url } = await openPage();
    await page.route('**/assets/*.js', (route) => route.abort());
    await page.goto(url);
    const ground = await page.evaluate(
      () => getComputedStyle(document.documentElement).backgroundColor,
    );
    const [red = 255, green = 255, blue = 255] = ground.match(/\d+/g)!.map(Number);
    expect(red + green + blue).toBeLessThan(100);
    expect(await page.locator('meta[name="color-scheme"]').getAttribute('content')).toBe('dark');
  });
});

describe('for hours', () => {
  test('an hour goes by: memory and the number of elements do not grow', async () => {
    const { page, loop } = await openPage({}, (loop) => {
      loop.animal.begin('induction.yaml', 'M12');
      loop.animal.state.waterLimitUl = 1e6;
    });
    const devtools = await page.context().newCDPSession(page);
    const measure = async () => {
      await devtools.send('HeapProfiler.collectGarbage');
      const { usedSize } = await devtools.send('Runtime.getHeapUsage');
      const { nodes, jsEventListeners } = await devtools.send('Memory.getDOMCounters');
      return { megabytes: usedSize / 1e6, nodes, jsEventListeners };
    };
    // A minute of the animal's life at a time, as fast as the page takes them.
    const live = async (minutes: number) => {
      for (let n = 0; n < minutes; n++) {
        loop.advance(60);
        const last = loop.animal.state.lap;
        await page.waitForFunction(
          (lap) => Number(document.getElementById('lap')?.textContent) >= lap,
          last,
        );
      }
    };
    await live(8);
    const early = await measure();
    await live(52);
    const late = await measure();
    expect(await shownNumber(page, 'lap')).toBeGreaterThan(350);
    expect(late.megabytes - early.megabytes).toBeLessThan(1.5);
    expect(late.nodes).toBeLessThan(early.nodes * 1.2 + 100);
    expect(late.jsEventListeners).toBeLessThanOrEqual(early.jsEventListeners + 10);
    expect(await page.locator('.events-panel li').count()).toBeLessThanOrEqual(60);
  });
});
