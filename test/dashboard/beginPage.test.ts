import { copyFileSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { preflightStanding } from '../../dashboard/model/begin.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { packageRoot } from '../../server/packageRoot.js';
import { keepPreflight, type Preflight } from '../../server/session/preflight.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { until } from '../web/webRig.js';
import { openPage, useBrowser } from './pageRig.js';
import { axeFinds, tabTo } from './pageTools.js';

useBrowser();

const folder = mkdtempSync(join(tmpdir(), 'lapwing-begin-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

function preflight(change: Partial<Preflight> = {}): Preflight {
  return {
    ...{ format: 1, rig: 'demo', madeAt: new Date().toISOString(), by: 'KL', passed: true },
    board: { model: 'x', boardId: 1, simulated: true },
    checks: [
      { id: 'seam', title: 'Seam mark', result: 'passed', detail: '', remedy: '' },
      { id: 'disk', title: 'Disk', result: 'overridden', detail: '', remedy: '', reason: 'small' },
    ],
    ...change,
  };
}

/** A rig file of its own, so that pre-flights can be kept beside it, and one animal, not weighed. */
async function openBegin() {
  const own = mkdtempSync(join(folder, 'rig-'));
  copyFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), join(own, 'rig.yaml'));
  const rig = readRig(join(own, 'rig.yaml'));
  const animals = new AnimalsFolder(join(own, 'animals'));
  const set = { baselineG: 25, targetUl: 1000, protocol: 'P-17' };
  await animals.addAnimal('m31', { kind: 'card', set }, 'kl');
  const start = () =>
    openPage({}, (loop) => void loop.run(), 'dark', { rig, animals: animals.folder });
  return { rig, animals, start };
}

describe('beginning a session, in a real browser', { timeout: 120_000 }, () => {
  test('by keyboard alone: the animal is weighed in the form, and its session begun', async () => {
    const { animals, start } = await openBegin();
    const { page, loop } = await start();
    await page.getByText('No pre-flight in the last 12 hours.').waitFor();
    await tabTo(page, /^Animal$/);
    await page.keyboard.type('m31');
    await page.getByText('No session begins without the weight of the day.').waitFor();
    await tabTo(page, /^Weight today, g$/);
    await page.keyboard.type('23.4');
    await tabTo(page, /^Experimenter$/);
    await page.keyboard.type('KL');
    await tabTo(page, /^Protocol number$/);
    await page.keyboard.type('P-17-b');
    await tabTo(page, /^Begin$/);
    await page.keyboard.press('Enter');
    await until(() => loop.heard.some((one) => one.say === 'begin'));
    expect(loop.heard.find((one) => one.say === 'begin')).toMatchObject({
      ...{ subject: 'm31', experimenter: 'KL', protocolNumber: 'P-17-b' },
    });
    const { entries } = await animals.read();
    expect(JSON.stringify([...entries])).toContain('23.4');
  });

  test('what speaks against it wants a reason, which goes with it', async () => {
    const { rig, start } = await openBegin();
    const checks = [{ ...preflight().checks[0]!, result: 'failed' as const }];
    keepPreflight(rig, preflight({ passed: false, checks }));
    const { page, loop } = await start();
    await page.getByText(/Pre-flight of \d\d:\d\d failed: Seam mark/).waitFor();
    await page.getByLabel('Animal', { exact: true }).fill('m31');
    expect(await axeFinds(page)).toEqual([]);
    await page.getByLabel('Reason to begin all the same').fill('the mark was seen by eye');
    await page.getByRole('button', { name: 'Begin', exact: true }).click();
    await until(() => loop.heard.some((one) => one.say === 'begin'));
    expect(loop.heard.find((one) => one.say === 'begin')).toMatchObject({
      despite: 'the mark was seen by eye',
    });
  });
});

describe('the pre-flight beside the form', () => {
  test('says in words and shape how it stands, and whether a reason will be wanted', () => {
    expect(preflightStanding(undefined, false)).toMatchObject({ level: 'off', against: false });
    expect(preflightStanding(null, false)).toMatchObject({ level: 'warn', against: true });
    expect(preflightStanding(null, true)).toMatchObject({ level: 'off', against: false });
    const overridden = preflightStanding(preflight(), false);
    expect(overridden).toMatchObject({ level: 'warn', against: false });
    expect(overridden.words).toContain('overridden: Disk');
    const checks = [preflight().checks[0]!];
    expect(preflightStanding(preflight({ checks }), false)).toMatchObject({ level: 'good' });
    const failed = preflight({ passed: false, checks: [{ ...checks[0]!, result: 'failed' }] });
    expect(preflightStanding(failed, true)).toMatchObject({ level: 'bad', against: true });
  });
});
