import { existsSync, readdirSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { AnimalsDesk } from '../../server/animals/animalsDesk.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { noticeFor } from '../../server/animals/askBook.js';
import { dayOf } from '../../server/animals/days.js';
import { waterOn } from '../../server/animals/waterBook.js';
import { readDescription } from '../../server/session/description.js';
import { finished, LiveRig, lapwing } from '../tools/liveRig.js';
import { newFolder } from './helpers.js';

const RULES = `title: Two laps
belt: 30 cm
rules:
  water:
    when: reaches 15 cm
    do: give 4 uL
    within: 1 cm
end: laps done this session >= 2
`;

let rig: LiveRig | undefined;
afterEach(async () => {
  await rig?.stop();
  rig = undefined;
});

describe('a real session with an animal that is kept', { timeout: 240_000 }, () => {
  it('does not begin without the weight of the day, unless there is a reason, and fills the book', async () => {
    const folder = newFolder();
    const animals = ['--animals', folder];
    rig = await LiveRig.start({ rules: RULES });
    const desk = new AnimalsDesk(new AnimalsFolder(folder));
    const set = { baselineG: 25, targetUl: 1000, protocol: 'P-17' };
    await desk.folder.addAnimal('m1', { kind: 'card', set }, 'kl');

    const refused = await finished(rig.run(...animals));
    expect(refused.status).not.toBe(0);
    expect(refused.err).toMatch(/m1 has not been weighed today/);
    expect(refused.err).toMatch(/ANIMALS_AGAINST/);
    expect(existsSync(rig.recordFolder)).toBe(false);

    const reason = 'the balance is broken';
    expect((await finished(rig.run(...animals, '--despite', reason))).status, rig.output).toBe(0);
    const first = readDescription(rig.session);
    expect(first.animal).toMatchObject({ kept: true, weightG: null, despite: reason });
    expect(first.animal!.against[0]).toMatch(/not been weighed/);
    expect(first.protocolNumber).toBe('P-17');

    const weighed = await finished(lapwing('weigh', 'm1', '22', ...animals, '--json'));
    expect(JSON.parse(weighed.out), weighed.err).toMatchObject({ percent: 88, level: 'fine' });
    await desk.give('m1', 100, { by: 'kl' });
    expect((await finished(rig.run(...animals))).status, rig.output).toBe(0);
    const [, name] = readdirSync(rig.recordFolder).sort();
    const second = readDescription(join(rig.recordFolder, name!));
    expect(second.animal).toMatchObject({ weightG: 22, percent: 88, against: [] });
    expect(second.animal!.despite).toBeUndefined();
    expect(second.waterEarlierUl).toBeCloseTo(100 + first.water!.givenUl, 6);

    const { history, reading } = await desk.history('m1');
    const water = waterOn(history, dayOf(new Date(), reading.zone));
    expect(water.sessions).toHaveLength(2);
    expect(water.open).toEqual([]);
    expect(water.sessions[0]!.override).toEqual({ reason, against: first.animal!.against });
    expect(water.earnedUl).toBeCloseTo(first.water!.givenUl + second.water!.givenUl, 6);
  });
});

describe('a session that no book looks after', () => {
  it('says so, but for nobody, who is no animal', () => {
    expect(noticeFor('m1', undefined)).toMatch(/No animals folder is set for this rig.*m1/);
    expect(noticeFor('nobody', undefined)).toBeUndefined();
  });
});
