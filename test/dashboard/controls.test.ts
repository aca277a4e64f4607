import axe from 'axe-core';
import type { Page } from 'playwright-core';
import { describe, expect, test, vi } from 'vitest';
import { People, type Role } from '../../server/web/access/people.js';
import { CHEAP, newFiles } from '../web/access/signedIn.js';
import { until } from '../web/webRig.js';
import { openPage, type PageRig, useBrowser } from './pageRig.js';

useBrowser();
// Several browsers at once, on a machine that may have much else to do.
vi.setConfig({ testTimeout: 120_000 });

interface GuardedPage extends PageRig {
  /** In a browser of its own. */
  another(name: string, theme?: string): Promise<Page>;
}

/** A running session behind a sign-in; the first page is at the sign-in. */
async function openGuarded(names: Readonly<Record<string, Role>>): Promise<GuardedPage> {
  const access = newFiles();
  const people = new People(access.peopleFile, CHEAP);
  const secrets = new Map<string, string>();
  for (const [name, role] of Object.entries(names)) secrets.set(name, await people.add(name, role));
  const begun = (loop: PageRig['loop']) => loop.animal.begin('induction.yaml', 'M12');
  const rig = await openPage({}, begun, 'dark', { access, hashCost: CHEAP });
  const browser = rig.page.context().browser()!;
  const another = async (name: string, theme = 'dark') => {
    const context = await browser.newContext({ viewport: { width: 1440, height: 1000 } });
    const page = await context.newPage();
    page.setDefaultTimeout(60_000);
    await page.addInitScript((one) => localStorage.setItem('lapwing.theme', one), theme);
    await page.goto(rig.url);
    await signIn(page, name, secrets.get(name)!);
    return page;
  };
  return { ...rig, another };
}

async function signIn(page: Page, name: string, secret: string): Promise<void> {
  await page.getByLabel('Name').fill(name);
  await page.getByLabel('Secret', { exact: true }).fill(secret);
  await page.getByRole('button', { name: 'Sign in' }).click();
  await page.locator('.controls-bar').waitFor();
}

/** What axe finds in this part of the page that is serious. */
async function serious(page: Page, part: string): Promise<string[]> {
  await page.evaluate(axe.source);
  const { violations } = await page.evaluate(
    (selector) => (window as unknown as { axe: typeof axe }).axe.run(selector),
    part,
  );
  return violations
    .filter(({ impact }) => impact === 'serious' || impact === 'critical')
    .map(({ id, nodes }) => `${id}: ${nodes[0]?.html}`);
}

describe('the sign-in page', () => {
  test('is where a browser that is not signed in arrives, and says what was wrong', async () => {
    const { page, url, another } = await openGuarded({ anna: 'operator' });
    expect(page.url()).toBe(`${url}/sign-in.html`);
    expect(await serious(page, 'html')).toEqual([]);
    // By keyboard alone: the first field has the focus.
    await page.keyboard.type('anna');
    await page.keyboard.press('Tab');
    await page.keyboard.type('not the secret');
    await page.keyboard.press('Enter');
    await page.getByRole('alert').filter({ hasText: 'The name or the secret is wrong' }).waitFor();
    const secret = page.getByLabel('Secret', { exact: true });
    expect(await secret.getAttribute('type')).toBe('password');
    await page.getByLabel('Show the secret').check();
    expect(await secret.getAttribute('type')).toBe('text');
    expect(await secret.getAttribute('autocomplete')).toBe('current-password');
    const signedIn = await another('anna');
    expect(new URL(signedIn.url()).pathname).toBe('/');
    // Nothing of it lies where a script could find it.
    const kept = await signedIn.evaluate(() => [document.cookie, ...Object.keys(localStorage)]);
    expect(kept.filter((one) => one !== '' && !one.startsWith('lapwing.'))).toEqual([]);
    expect(await signedIn.evaluate(() => sessionStorage.length)).toBe(0);
    // Who is signed in has nothing to do there.
    await signedIn.goto(`${url}/sign-in.html`);
    await signedIn.locator('.controls-bar').waitFor();
  });

  test('is where a page lands that is signed out while it watches', async () => {
    const { another, url } = await openGuarded({ vera: 'viewer' });
    const page = await another('vera');
    await page.getByRole('button', { name: 'Sign out' }).click();
    await page.waitForURL(`${url}/sign-in.html`);
    await page.getByLabel('Name').waitFor();
  });
});

describe('the controls on the page', () => {
  test('are taken, and taken over with a confirmation that everybody sees the outcome of', async () => {
    const rig = await openGuarded({ anna: 'operator', ben: 'operator' });
    const [anna, ben] = [await rig.another('anna'), await rig.another('ben')];
    await anna.getByText('Nobody holds the controls').waitFor();
    expect(await anna.getByRole('button', { name: 'End session…' }).isDisabled()).toBe(true);
    await anna.getByRole('button', { name: 'Take the controls' }).click();
    await anna.getByText('You hold the controls').waitFor();
    expect(await anna.getByRole('button', { name: 'End session…' }).isEnabled()).toBe(true);

    await ben.getByText('anna holds the controls').waitFor();
    await ben.getByRole('button', { name: 'Take over from anna…' }).click();
    await ben.getByRole('button', { name: 'Leave them' }).click();
    await anna.getByText('You hold the controls').waitFor();
    await ben.getByRole('button', { name: 'Take over from anna…' }).click();
    await ben.getByRole('button', { name: 'Take them over' }).click();
    await ben.getByText('You hold the controls').waitFor();
    await anna.getByText('Viewing only').waitFor();
    expect(await anna.getByRole('button', { name: 'End session…' }).isDisabled()).toBe(true);
    // Those who look can still stop it.
    await anna.getByRole('button', { name: /^Stop everything/ }).click();
    await until(() => rig.loop.heard.some((one) => one.say === 'quiet' && one.who === 'anna'));
    await anna.getByText('Stopped: the loop confirmed').waitFor();
    for (const page of [anna, ben]) expect(await serious(page, '.controls-bar')).toEqual([]);
  });

  test('are not offered to a viewer, whose stop says that nothing was stopped', async () => {
    const rig = await openGuarded({ vera: 'viewer' });
    const page = await rig.another('vera', 'light');
    await page.getByText('You are signed in as a viewer').waitFor();
    expect(await page.getByRole('button', { name: /controls/ }).count()).toBe(0);
    expect(await page.getByRole('button', { name: 'Hold stimulus' }).isDisabled()).toBe(true);
    await page.getByRole('button', { name: /^Stop everything/ }).click();
    await page.getByText('Nothing was stopped').waitFor();
    expect(rig.loop.heard.some((one) => one.say === 'quiet')).toBe(false);
    expect(await serious(page, '.controls-bar')).toEqual([]);
  });

  test('are not spoken of where nobody signs in', async () => {
    const { page } = await openPage();
    await page.locator('#lap').waitFor();
    expect(await page.locator('.controls-bar').count()).toBe(0);
  });
});
