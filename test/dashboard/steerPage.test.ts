import axe from 'axe-core';
import type { Page } from 'playwright-core';
import { describe, expect, test } from 'vitest';
import type { AlarmView } from '../../server/loop/alarms/alarms.js';
import type { FakeLoop } from '../tools/fakeLoop.js';
import { until } from '../web/webRig.js';
import { openPage, useBrowser } from './pageRig.js';

useBrowser();

const running = (loop: FakeLoop) => {
  loop.animal.begin('induction.yaml', 'M12', 'KL', '3');
  loop.animal.advance(100);
  loop.run();
};

/** A key by where it lies, pressed and let go within one task: never long, however slow the machine. */
async function tap(page: Page, code: string): Promise<void> {
  await page.evaluate((name) => {
    const target = document.activeElement ?? document.body;
    for (const type of ['keydown', 'keyup']) {
      target.dispatchEvent(new KeyboardEvent(type, { code: name, key: '', bubbles: true }));
    }
  }, code);
}

/** A key held down until something has come of it. */
async function hold(page: Page, code: string, until: () => Promise<unknown>): Promise<void> {
  const send = (type: string) =>
    page.evaluate(
      ([name, what]) => {
        document.body.dispatchEvent(
          new KeyboardEvent(what!, { code: name!, key: '', bubbles: true, cancelable: true }),
        );
      },
      [code, type],
    );
  await send('keydown');
  await until();
  await send('keyup');
}

interface Filling {
  readonly text: string;
  readonly outlineStyle: string;
  readonly moves: string;
}

/** Every button that has shown that it is being held, and how: seen even when it is soon over. */
async function watchFilling(page: Page): Promise<() => Promise<Filling[]>> {
  await page.evaluate(() => {
    const seen: Filling[] = [];
    (window as unknown as { filling: Filling[] }).filling = seen;
    new MutationObserver((changes) => {
      for (const { target } of changes) {
        const button = target as HTMLElement;
        if (!button.matches('.hold.long.holding')) continue;
        const text = button.querySelector('.hold-text')?.textContent?.trim() ?? '';
        const moves = getComputedStyle(button, '::before').transitionDuration;
        seen.push({ text, outlineStyle: getComputedStyle(button).outlineStyle, moves });
      }
    }).observe(document.body, { subtree: true, attributes: true, attributeFilter: ['class'] });
  });
  return () => page.evaluate(() => (window as unknown as { filling: Filling[] }).filling);
}

const alarm = (name: AlarmView['alarm'], level: AlarmView['level'], text: string): AlarmView => ({
  ...{ alarm: name, level, text, remedy: 'Look at it.', sinceUs: 1, seenBy: null },
});
const raise = (loop: FakeLoop, ...alarms: AlarmView[]) => {
  loop.animal.state.alarms = alarms;
};

describe('asking for a rule', () => {
  test('by number pad: a short press asks for nothing, a long one does; it is seen while it waits, and taken back', async () => {
    const { page, loop, troubles } = await openPage({}, running);
    await page.getByText('Ask for induce').waitFor();
    // The file's two buttons have the first keys, then induce in the next lap, then now.
    await tap(page, 'Numpad3');
    await page.waitForTimeout(600);
    expect(loop.acts()).toEqual([]);
    const filled = await watchFilling(page);
    await hold(page, 'Numpad3', () => until(() => loop.acts().length === 1));
    expect(await filled()).toMatchObject([{ text: 'Next lap' }]);
    expect(loop.acts()).toEqual([{ act: 'ask', rule: 'induce', laps: 1 }]);
    await page.getByText(/^induce: asked for lap \d+$/).waitFor();
    await page.getByRole('button', { name: 'Take back what was asked of induce' }).press('Enter');
    await until(() => loop.acts().length === 2);
    expect(loop.acts()[1]).toEqual({ act: 'withdraw', rule: 'induce' });
    await until(async () => (await page.locator('.pending strong').count()) === 0);

    await page.getByLabel('for of at most 5 laps').fill('4');
    await page
      .getByLabel('for of at most 5 laps')
      .evaluate((field) => (field as HTMLElement).blur());
    await hold(page, 'Digit3', () => until(() => loop.acts().length === 3));
    await hold(page, 'Digit4', () => until(() => loop.acts().length === 4));
    expect(loop.acts().slice(2)).toEqual([
      { act: 'ask', rule: 'induce', laps: 4 },
      { act: 'ask', rule: 'induce', laps: 0 },
    ]);
    expect(troubles).toEqual([]);
  });
});

describe('steering by keys alone', () => {
  test('phases, laps to exclude, the end put off, the next cell with its fields', async () => {
    const { page, loop } = await openPage({}, running);
    await page.getByRole('button', { name: /^Phase again/ }).waitFor();
    const lap = loop.animal.state.lap;
    loop.freeze();
    await tap(page, 'KeyX');
    await tap(page, 'KeyZ');
    await tap(page, 'KeyE');
    await until(() => loop.acts().length === 3);
    expect(loop.acts()).toEqual(
      expect.arrayContaining([
        { act: 'exclude lap', lap },
        { act: 'exclude lap', lap: lap - 1 },
        { act: 'put off', laps: 5, minutes: 0 },
      ]),
    );
    loop.run();
    await page.getByText(/Put off by 5 laps\.$/).waitFor();
    await hold(page, 'BracketLeft', () => until(() => loop.acts().length === 4));
    expect(loop.acts()[3]).toEqual({ act: 'phase', to: 'previous' });

    await hold(page, 'KeyC', () => page.getByText('phases and counts begin anew').waitFor());
    // The first field has the focus: it can be filled in the dark.
    await page.keyboard.type('350');
    await page.keyboard.press('Tab');
    await page.keyboard.type('28');
    await page.keyboard.press('Enter');
    await until(() => loop.acts().length === 5);
    expect(loop.acts()[4]).toEqual({
      act: 'new cell',
      fields: { 'depth (um)': '350', 'access resistance (MOhm)': '28' },
    });
    await page.getByText('cell 1 now').waitFor();
  });

  test('a moved place is followed from queue to board', async () => {
    const { page, loop } = await openPage({}, running);
    const field = page.getByRole('spinbutton', { name: 'target' });
    await field.fill('52');
    await field.press('Enter');
    await page.getByText(/^45 to 52 cm from lap \d+$/).waitFor();
    loop.run(8);
    await page.getByText('52 cm counts; the board has yet to be armed by it').waitFor();
    const { lap } = loop.animal.state;
    loop.animal.tell({ kind: 'choice', name: 'target', value: 52, state: 'armed anew' }, { lap });
    await page.getByText(`The board confirmed 52 cm in lap ${lap}`).waitFor();
    // Amounts are typed in the unit that people use, and sent in the engine's.
    const volume = page.getByRole('spinbutton', { name: 'volume' });
    await volume.fill('4.5');
    await volume.press('Enter');
    await until(() => loop.acts().length === 2);
    expect(loop.acts()[1]).toEqual({ act: 'choose', name: 'volume', value: 4500 });
  });
});

describe('the keys panel', () => {
  test('changes a key by keyboard, refuses a conflict, and the browser keeps it', async () => {
    const { page, loop, url } = await openPage({}, running);
    const open = async () => {
      await page.locator('.browser-panel summary').press('Enter');
      await page.getByText('All keys as at first').waitFor();
    };
    await open();
    const cap = page.getByRole('button', { name: 'Mark now, and note it: N' });
    await cap.press('Enter');
    await page.getByText('press a key…').waitFor();
    await page.keyboard.press('s');
    await page.getByText('S is taken: Hold or release the stimulus. Change that first.').waitFor();
    expect(loop.acts()).toEqual([]);
    await cap.press('Enter');
    await page.getByText('press a key…').waitFor();
    // A pedal.
    await page.keyboard.press('PageDown');
    await page.getByRole('button', { name: 'Mark now, and note it: Page Down' }).waitFor();
    await page.goto(url);
    await page.getByText('Mark now').first().waitFor();
    await tap(page, 'KeyN');
    await tap(page, 'PageDown');
    await until(() => loop.acts().length === 1);
    expect(loop.acts()).toEqual([{ act: 'mark' }]);

    await open();
    await page.getByRole('button', { name: 'Stop everything, beside Esc: add' }).press('Enter');
    await tap(page, 'F13');
    await page.getByRole('button', { name: 'Stop everything, beside Esc: F13' }).waitFor();
    await tap(page, 'F13');
    await page.waitForTimeout(500);
    expect(loop.heard.some((one) => one.say === 'quiet')).toBe(false);
    await hold(page, 'F13', () => page.getByText('Stopped: the loop confirmed').waitFor());
    await page.getByRole('button', { name: 'All keys as at first' }).press('Enter');
    await page.getByRole('button', { name: 'Mark now, and note it: N' }).waitFor();
  });
});

describe('alarms', () => {
  test('are told with their remedy, seen by key, and then stay in one quiet line with who saw them', async () => {
    const { page, loop } = await openPage({}, running);
    raise(loop, alarm('drops', 'warn', '3 drops were given and not licked'));
    await page.getByText('3 drops were given and not licked', { exact: true }).waitFor();
    await page.getByText('Look at it.').waitFor();
    await tap(page, 'KeyA');
    await page.getByText('seen by').waitFor();
    expect(loop.acts()).toEqual([{ act: 'acknowledge', alarm: 'drops' }]);
    expect(await page.locator('.alarm').count()).toBe(0);

    raise(loop, alarm('link', 'bad', 'No board'), alarm('still', 'warn', 'The belt stands'));
    await page.getByRole('button', { name: 'All 2 seen' }).waitFor();
    await tap(page, 'NumpadDivide');
    await until(() => loop.acts().length === 2);
    expect(loop.acts()[1]).toEqual({ act: 'acknowledge', alarm: 'all' });
    raise(loop);
    await until(async () => (await page.locator('.alarms-seen').count()) === 0);
  });

  test('sound where it is wished, and stay silent where it is not', async () => {
    const { page, loop } = await openPage({}, running);
    await page.evaluate(() => {
      const counted = window as unknown as { tones: number };
      counted.tones = 0;
      const { start } = OscillatorNode.prototype;
      OscillatorNode.prototype.start = function (when?: number) {
        counted.tones++;
        return start.call(this, when);
      };
    });
    const tones = () => page.evaluate(() => (window as unknown as { tones: number }).tones);
    raise(loop, alarm('seam', 'warn', 'A mark was missed'));
    await page.getByText('A mark was missed', { exact: true }).waitFor();
    expect(await tones()).toBe(0);
    await page.locator('.browser-panel summary').click();
    await page.getByLabel('Alarms sound here').click();
    await page.getByRole('slider', { name: 'Volume' }).waitFor();
    await until(async () => (await page.getByText('keeps this page silent').count()) === 0);
    // What was there before is not news; what comes now is.
    raise(loop, alarm('seam', 'warn', 'A mark was missed'), alarm('link', 'bad', 'No board'));
    await until(async () => (await tones()) === 4);
    await page.getByRole('button', { name: 'Hear what is to look at' }).click();
    await until(async () => (await tones()) === 6);
  });
});

const RULES = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];

/** The greenest and the bluest pixel of a picture of the page. */
async function mostGreenAndBlue(
  page: Page,
  fullPage = true,
): Promise<{ green: number; blue: number; red: number }> {
  const png = (await page.screenshot({ fullPage })).toString('base64');
  return page.evaluate(async (text) => {
    const bytes = Uint8Array.from(atob(text), (letter) => letter.charCodeAt(0));
    const picture = await createImageBitmap(new Blob([bytes], { type: 'image/png' }));
    const canvas = new OffscreenCanvas(picture.width, picture.height);
    const context = canvas.getContext('2d')!;
    context.drawImage(picture, 0, 0);
    const { data } = context.getImageData(0, 0, picture.width, picture.height);
    const most = { red: 0, green: 0, blue: 0 };
    for (let n = 0; n < data.length; n += 4) {
      most.red = Math.max(most.red, data[n]!);
      most.green = Math.max(most.green, data[n + 1]!);
      most.blue = Math.max(most.blue, data[n + 2]!);
    }
    return most;
  }, png);
}

describe('in the dark', () => {
  test('the red theme shows nothing but red, from the first paint on, whatever is on the screen', async () => {
    const { page, loop, url } = await openPage({}, running, 'red');
    await page.route('**/assets/*.js', (route) => route.abort());
    await page.goto(url);
    const bare = await mostGreenAndBlue(page);
    expect(bare.green).toBeLessThan(144);
    await page.unroute('**/assets/*.js');
    raise(loop, alarm('link', 'bad', 'No board'), alarm('still', 'warn', 'The belt stands'));
    await page.goto(url);
    await page.getByText('The belt stands', { exact: true }).waitFor();
    await page.locator('.browser-panel summary').click();
    await page.getByLabel('Alarms sound here').click();
    await page.getByRole('spinbutton', { name: 'target' }).fill('161');
    await page.locator('.stop').click();
    await page.getByText('Stopped: the loop confirmed').waitFor();
    const most = await mostGreenAndBlue(page);
    // Of white, 255 of each.
    expect(most.green).toBeLessThan(144);
    expect(most.blue).toBeLessThan(130);
    expect(most.red).toBeGreaterThan(200);
  });

  test('it can be dimmed, canvases too, and stays so when the page is loaded anew', async () => {
    const { page, url } = await openPage({}, running, 'red');
    await page.locator('.browser-panel summary').click();
    await page.getByLabel('Brightness').fill('0.3');
    await page.getByText('30 %').waitFor();
    const dim = await mostGreenAndBlue(page, false);
    expect(dim.red).toBeLessThan(90);
    await page.route('**/assets/*.js', (route) => route.abort());
    await page.goto(url);
    expect((await mostGreenAndBlue(page, false)).red).toBeLessThan(90);
    await page.unroute('**/assets/*.js');
    await page.goto(url);
    await page.locator('.session-running').waitFor();
    // A page that is dimmed still takes clicks.
    await page.locator('.stop').click();
    await page.getByText('Stopped: the loop confirmed').waitFor();
  });
});

describe('for everybody', () => {
  test('nothing moves where the system asks for stillness, and being held still shows', async () => {
    const { page, loop } = await openPage({ reducedMotion: 'reduce' }, running);
    await page.getByText('Ask for induce').waitFor();
    const filled = await watchFilling(page);
    await hold(page, 'Digit3', () => until(() => loop.acts().length === 1));
    expect(await filled()).toEqual([{ text: 'Next lap', outlineStyle: 'solid', moves: '0s' }]);
  });

  test.each([
    ['desk', {}],
    ['phone', { viewport: { width: 390, height: 844 }, isMobile: true }],
  ] as const)(
    'axe finds nothing in the whole of the page at %s size, in any theme',
    { timeout: 120_000 },
    async (_, size) => {
      const { page, loop } = await openPage(size, running);
      loop.animal.mark();
      loop.animal.ask('induce', 3);
      raise(loop, alarm('link', 'bad', 'No board'), alarm('still', 'warn', 'The belt stands'), {
        ...alarm('end', 'note', 'It ends soon'),
        seenBy: { who: 'KL', from: 'x' },
      });
      await page.getByText('It ends soon').waitFor();
      await page.locator('.browser-panel summary').press('Enter');
      await page.getByLabel('Alarms sound here').check();
      await hold(page, 'KeyC', () => page.getByText('phases and counts begin anew').waitFor());
      await page.evaluate(axe.source);
      for (const theme of ['Dark', 'Red', 'Light']) {
        await page.getByText(theme, { exact: true }).click();
        await until(async () => {
          // The structure is the same in every theme; the colours are not.
          const rules = theme === 'Dark' ? RULES : ['color-contrast'];
          const found = await page.evaluate(async (runOnly) => {
            const { run } = (window as unknown as { axe: typeof axe }).axe;
            const { violations } = await run(document, { runOnly });
            return violations.map(
              ({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join(' | ')}`,
            );
          }, rules);
          // A page that axe holds up on a slow machine may be stale, and faded, for a moment.
          if ((await page.locator('.shown.stale').count()) > 0) return false;
          expect(found).toEqual([]);
          return true;
        });
      }
      if (size !== undefined && 'isMobile' in size) {
        expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(390);
      }
    },
  );
});
