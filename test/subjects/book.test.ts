import { appendFileSync, readdirSync, rmSync } from 'node:fs';
import { basename, join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { AnimalsDesk } from '../../server/animals/animalsDesk.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { askBefore, tellBegan, tellEnded } from '../../server/animals/askBook.js';
import { before, ended } from '../../server/animals/book.js';
import { sessionWaterOf } from '../../server/animals/sessionWater.js';
import { waterOn } from '../../server/animals/waterBook.js';
import { readDescription, updateDescription } from '../../server/session/description.js';
import { describeEnd } from '../../server/session/store.js';
import { recordedSession } from '../analysis/recorded.js';
import { newFolder } from './helpers.js';

/** The day of the recorded session, just after it. */
const NOW = new Date('2026-03-04T11:00:00Z');
const DAY = '2026-03-04';
let session: ReturnType<typeof recordedSession>;

beforeAll(() => {
  session = recordedSession({ minutes: 4, simulated: { trained: true } });
});
afterAll(() => session.remove());

/** A desk at a new folder that keeps m07, the animal of the recorded session. */
async function desk(folder = newFolder()): Promise<AnimalsDesk> {
  const animals = new AnimalsFolder(folder, () => NOW);
  await animals.addAnimal('m07', { kind: 'card', set: { baselineG: 25, targetUl: 1000 } }, 'kl');
  return new AnimalsDesk(animals, () => NOW);
}

const ask = (folder: string, subject = 'm07') =>
  before({ ask: 'before', folder, subject, rig: 'demo', recordFolder: session.root }, NOW);

describe('the water of a recorded session', () => {
  it('is what the guard counted by the board’s word, drop by drop', async () => {
    const water = await sessionWaterOf(session.folder);
    expect(water.givenUl).toBeCloseTo(session.core.guard.waterGivenNl / 1_000, 6);
    expect(water.drops).toBeGreaterThan(5);
    // A trained animal licks for its drops.
    expect(water.notLickedDrops).toBeLessThan(water.drops / 2);
    expect(water.licksUnknown).toBeUndefined();
  });

  it('is the same from the decisions, once the session has described its end', async () => {
    const fromInputs = await sessionWaterOf(session.folder);
    const kept = readDescription(session.folder);
    describeEnd(session.folder, session.core, 'rules');
    expect(await sessionWaterOf(session.folder)).toEqual(fromInputs);
    updateDescription(session.folder, { ...kept });
  });
});

describe('a session that no book was told of', () => {
  it('is filed before the next one of its animal on that rig, and then only once', async () => {
    const { folder } = (await desk()).folder;
    const first = await ask(folder);
    const givenUl = session.core.guard.waterGivenNl / 1_000;
    expect(first.hadTodayUl).toBeCloseTo(givenUl, 6);
    const entries = readdirSync(join(folder, 'm07')).length;
    expect((await ask(folder)).hadTodayUl).toBeCloseTo(givenUl, 6);
    expect(readdirSync(join(folder, 'm07'))).toHaveLength(entries);
  });

  it('counts the water of another rig and of the hand', async () => {
    const at = await desk();
    const water = { givenUl: 200, uncertainUl: 4, drops: 50, notLickedUl: 0, notLickedDrops: 0 };
    const fact = { kind: 'session ended', session: 'elsewhere', rig: 'other', water } as const;
    await at.folder.add('m07', { ...fact, at: '2026-03-04T08:00:00Z' }, 'kl');
    await at.give('m07', 100, { by: 'kl', at: '08:30' });
    const { hadTodayUl } = await ask(at.folder.folder);
    expect(hadTodayUl).toBeCloseTo(304 + session.core.guard.waterGivenNl / 1_000, 6);
  });

  it('is told in words when its record is gone, and does not stop the others', async () => {
    const at = await desk();
    const fact = { kind: 'session began', at: '2026-03-04T08:00:00Z', rig: 'other' } as const;
    await at.folder.add('m07', { ...fact, session: 'lost' }, 'kl');
    const { animal } = await ask(at.folder.folder);
    expect(animal.against).toContain(
      'what session lost on other gave is not in the water book yet',
    );
  });
});

describe('before a session', () => {
  it('asks for a weight, and is content with one', async () => {
    const at = await desk();
    expect((await ask(at.folder.folder)).animal.against.join()).toMatch(/has not been weighed/);
    await at.weigh('m07', 22, { by: 'kl' });
    expect((await ask(at.folder.folder)).animal).toMatchObject({
      ...{ kept: true, weightG: 22, percent: 88, against: [] },
    });
  });

  it('does not let a mistyped name pass as an animal that nobody keeps', async () => {
    const { animal, hadTodayUl } = await ask((await desk()).folder.folder, 'm70');
    expect(animal.kept).toBe(false);
    expect(animal.against[0]).toMatch(/No animal is called "m70"; did you mean m07/);
    expect(hadTodayUl).toBeUndefined();
  });

  it('lets nobody run, since that is no animal, and says when the share is away', async () => {
    const { folder } = (await desk()).folder;
    expect((await ask(folder, 'nobody')).animal.against).toEqual([]);
    rmSync(folder, { recursive: true });
    expect((await ask(folder)).animal.against[0]).toMatch(/ENOENT/);
  });
});

describe('the book’s own process', { timeout: 240_000 }, () => {
  it('answers who asks before a session, and files what it is told', async () => {
    const at = await desk();
    const { folder } = at.folder;
    const question = { folder, subject: 'm07', rig: 'demo', recordFolder: session.root };
    await expect(askBefore(question, undefined)).rejects.toMatchObject({ code: 'ANIMALS_AGAINST' });
    const { animal } = await askBefore(question, 'a guest');
    expect(animal).toMatchObject({ kept: true, despite: 'a guest' });
    const kept = readDescription(session.folder);
    updateDescription(session.folder, { animal: { ...animal, against: ['x'] } });
    await tellBegan(session.folder);
    await tellEnded(session.folder);
    updateDescription(session.folder, kept);
    const { history } = await at.history('m07');
    expect(history.sessions[0]!.override).toEqual({ reason: 'a guest', against: ['x'] });
    expect(history.sessions[0]!.water!.drops).toBeGreaterThan(5);
  });
});

describe('filing a session', () => {
  it('refuses to count again what a person has corrected', async () => {
    const at = await desk();
    const { folder } = at.folder;
    await ended({ ask: 'ended', sessionFolder: session.folder, folder });
    const { history } = await at.history('m07');
    const { endId } = history.sessions[0]!;
    await at.correct('m07', endId!, { ul: 12 }, 'the spout had slipped', 'kl');
    await expect(ended({ ask: 'ended', sessionFolder: session.folder, folder })).rejects.toThrow(
      /corrected by hand \(the spout had slipped\)/,
    );
    expect(waterOn((await at.history('m07')).history, DAY).earnedUl).toBe(12);
  });

  it('keeps a session’s water in its day, its name and its rig', async () => {
    const at = await desk();
    await ended({ ask: 'ended', sessionFolder: session.folder, folder: at.folder.folder });
    const { history } = await at.history('m07');
    expect(history.sessions[0]).toMatchObject({
      ...{ session: basename(session.folder), day: DAY, override: null },
    });
  });

  it('falls back on the session’s own sums where the record cannot be read', async () => {
    const at = await desk();
    const lost = recordedSession({ minutes: 1 });
    describeEnd(lost.folder, lost.core, 'rules');
    for (const name of readdirSync(lost.folder)) {
      if (name.endsWith('.mcap')) rmSync(join(lost.folder, name));
    }
    appendFileSync(join(lost.folder, 'rules.yaml'), '\n');
    const water = await ended({
      ask: 'ended',
      sessionFolder: lost.folder,
      folder: at.folder.folder,
    });
    expect(water).toMatchObject({ licksUnknown: true });
    expect(water!.givenUl).toBeCloseTo(lost.core.guard.waterGivenNl / 1_000, 6);
    lost.remove();
  });
});
