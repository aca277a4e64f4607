import { cpSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import axe from 'axe-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { AnimalsDesk } from '../../server/animals/animalsDesk.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { keepDemoAnimals } from '../../server/main/animals/demoAnimals.js';
import { openPage, useBrowser } from '../dashboard/pageRig.js';
import { until } from '../web/webRig.js';
import { newFolder } from './helpers.js';

useBrowser();

let colony: string;

/** The demo's animals, one session of sim1 in the book; each test has a copy. */
beforeAll(async () => {
  colony = mkdtempSync(join(tmpdir(), 'lapwing-colony-'));
  await keepDemoAnimals(colony);
  const at = new Date().toISOString();
  const water = { givenUl: 320, uncertainUl: 4, drops: 81, notLickedUl: 24, notLickedDrops: 6 };
  const fact = { kind: 'session ended', at, session: 'a session', rig: 'demo', water } as const;
  await new AnimalsFolder(colony).add('sim1', fact, 'demo');
});
afterAll(() => rmSync(colony, { recursive: true, force: true }));

async function openAnimals(at = '/#animals', context = {}) {
  const animals = newFolder();
  cpSync(colony, animals, { recursive: true });
  const rig = await openPage(context, (loop) => loop.run(), 'dark', { animals, at });
  await rig.page.locator('.animals-table').first().waitFor();
  return { ...rig, animals, desk: new AnimalsDesk(new AnimalsFolder(animals)) };
}

describe('the Animals page, in a real browser', () => {
  test('shows each animal’s weight as percent, with level, and who is due water this evening', async () => {
    const { page, troubles } = await openAnimals();
    const row = (name: string) => page.locator('.animals-table tr', { hasText: name });
    // By hand: (23.1 - 1.2) / 24.6 and (23.6 - 1.2) / 27.1.
    expect(await row('sim1').textContent()).toMatch(/23\.1 g, 89\.0 %.*above its limit/);
    expect(await row('sim2').textContent()).toMatch(/23\.6 g, 82\.7 %.*near its limit/);
    expect(await row('sim1').textContent()).toMatch(/0\.68–0\.70 mL/);
    const evening = page.locator('.evening li');
    expect(await evening.allTextContents()).toEqual([
      expect.stringMatching(/sim1.*less than its target/),
      expect.stringMatching(/sim2.*no water today/),
    ]);
    await page.getByText(/approved protocol decides these limits, and the veterinarian/).waitFor();
    expect(troubles).toEqual([]);
  });

  test('takes a weight and water from the keyboard alone, and the list follows', async () => {
    const { page, desk } = await openAnimals('/#animals/sim2');
    await page.getByLabel(/Weight, g/).focus();
    await page.keyboard.type('21,4');
    await page.keyboard.press('Enter');
    await page.getByText('below its limit').first().waitFor();
    await page.getByLabel(/Water given by hand, mL/).focus();
    await page.keyboard.type('1.0');
    await page.keyboard.press('Enter');
    await until(async () => (await page.locator('.evening li').count()) === 1);
    const { history } = await desk.history('sim2');
    expect(history.weighings.at(-1)!.grams).toBe(21.4);
    expect(history.handWater.at(-1)!.ul).toBe(1000);
  });

  test('asks whether a weight that looks mistyped is right, and takes it when it is', async () => {
    const { page, desk } = await openAnimals('/#animals/sim1');
    await page.getByLabel(/Weight, g/).fill('2.31');
    await page.getByRole('button', { name: 'Write weight down' }).click();
    await page.getByText(/sim1 weighed 23.1 g .* and now 2.31 g/).waitFor();
    await page.getByRole('button', { name: 'It is right: write it down' }).click();
    await until(async () => {
      const { history } = await desk.history('sim1');
      return history.weighings.at(-1)!.grams === 2.31;
    });
  });

  test('corrects an entry by a new one, with its reason', async () => {
    const { page, desk } = await openAnimals('/#animals/sim1');
    await page.locator('.entries button').first().click();
    await page.getByLabel(/Right amount, mL/).fill('0.2');
    await page.getByLabel('Why').fill('the valve was blocked');
    await page.getByRole('button', { name: 'Write the correction down' }).click();
    await page.locator('.entries li', { hasText: 'corrects an entry: 0.20 mL' }).waitFor();
    const { history } = await desk.history('sim1');
    expect(history.sessions[0]!.water!.givenUl).toBe(200);
    expect(await page.locator('.entries .corrected').textContent()).toMatch(/gave 0\.32 mL/);
  });

  test('keeps a new animal, changes one, and tells what cannot be', async () => {
    const { page, desk } = await openAnimals();
    await page.getByRole('button', { name: 'Keep a new animal…' }).click();
    await page.getByLabel('name', { exact: true }).fill('sim 4');
    await page.getByLabel('baseline, g').fill('26.1');
    await page.getByRole('button', { name: 'Keep this animal' }).click();
    await page.getByText(/expected 1 to 40 letters/).waitFor();
    await page.getByLabel('name', { exact: true }).fill('sim4');
    await page.getByRole('button', { name: 'Keep this animal' }).click();
    await page.getByRole('heading', { name: 'sim4' }).waitFor();
    await page.getByRole('button', { name: 'Change what is known…' }).click();
    await page.getByLabel('water a day, µL').fill('1200');
    await page.getByLabel('reason').fill('the protocol');
    await page.getByRole('button', { name: 'Write the change down' }).click();
    await page.locator('.entries li', { hasText: 'water a day, µL 1200' }).waitFor();
    const { history } = await desk.history('sim4');
    expect(history.cards.map(({ set }) => set)).toEqual([
      expect.objectContaining({ baselineG: 26.1, state: 'restricted' }),
      { targetUl: 1200 },
    ]);
  });

  test('says beside Begin what speaks against a session, and takes the reason to begin all the same', async () => {
    const animals = newFolder();
    cpSync(colony, animals, { recursive: true });
    const { page, loop } = await openPage({}, (loop) => loop.run(), 'dark', { animals });
    const animal = page.getByLabel('Animal', { exact: true });
    await animal.fill('sim1');
    await page.getByText(/23\.1 g, 89\.0 %, above its limit; still due 0\.68–0\.70 mL/).waitFor();
    expect(await page.getByLabel(/Reason to begin all the same/).count()).toBe(0);
    await animal.fill('sim9');
    await page.getByText('It is not kept in the animals folder.').waitFor();
    await page.getByLabel(/Reason to begin all the same/).fill('a guest for a day');
    await page.getByRole('button', { name: 'Begin', exact: true }).click();
    await until(() => loop.heard.some(({ say }) => say === 'begin'));
    expect(loop.heard.find(({ say }) => say === 'begin')).toMatchObject({
      ...{ subject: 'sim9', despite: 'a guest for a day' },
    });
  });

  test('says that no folder was named, and what to do', async () => {
    const { page } = await openPage({}, undefined, 'dark', { at: '/#animals' });
    await page.getByText(/names no animals folder.*animals: FOLDER/).waitFor();
  });

  // Looking at the whole page three times takes long on a machine with other work.
  const patient = { timeout: 120_000 };
  test(
    'has nothing that axe finds, in any theme, and is one column on a phone',
    patient,
    async () => {
      const { page } = await openAnimals('/#animals/sim1');
      await page.locator('.animal-chart').first().waitFor();
      await page.getByRole('button', { name: 'Change what is known…' }).click();
      await page.evaluate(axe.source);
      for (const theme of ['Dark', 'Red', 'Light']) {
        await page.getByText(theme, { exact: true }).click();
        const found = await page.evaluate(async () => {
          const run = (window as unknown as { axe: typeof axe }).axe.run;
          const tags = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];
          const { violations } = await run(document, { runOnly: tags });
          return violations.map(
            ({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join()}`,
          );
        });
        expect(found, theme).toEqual([]);
      }
      await page.setViewportSize({ width: 360, height: 740 });
      expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBe(360);
    },
  );
});
