import { spawn } from 'node:child_process';
import fs from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { AnimalsDesk } from '../../server/animals/animalsDesk.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { entryText, readEntryText } from '../../server/animals/entryFile.js';
import { historyOf } from '../../server/animals/history.js';
import { packageRoot } from '../../server/packageRoot.js';
import { newFolder, weight } from './helpers.js';

const CARD = { kind: 'card', set: { baselineG: 25, targetUl: 1000 } } as const;
const AT = '2026-12-01T12:00:00.000+00:00';

async function withM31(folder = newFolder()): Promise<AnimalsFolder> {
  const animals = new AnimalsFolder(folder);
  await animals.addAnimal('m31', CARD, 'kl');
  return animals;
}

/** The entry files of m31. */
const filesOf = (folder: string) => fs.readdirSync(join(folder, 'm31')).sort();

describe('the animals folder', () => {
  it('holds an entry a file, as its schema says, and reads back what was written', async () => {
    const animals = await withM31();
    const made = await animals.add('m31', { kind: 'weight', at: AT, grams: 23.4 }, 'kl');
    const text = fs.readFileSync(join(animals.folder, 'm31', `${made.id}.json`), 'utf8');
    expect(readEntryText(text, made.id)).toEqual(made);
    expect(made).toMatchObject({ step: 2, by: 'kl', animal: 'm31', grams: 23.4 });
    const { entries, troubles } = await new AnimalsFolder(animals.folder).read();
    expect(entries.get('m31')).toHaveLength(2);
    expect(troubles).toEqual([]);
  });

  it('has one zone for all who share it, its first writer’s', async () => {
    const { folder } = await withM31();
    const colony = join(folder, 'colony.json');
    const own = Intl.DateTimeFormat().resolvedOptions().timeZone;
    expect(JSON.parse(fs.readFileSync(colony, 'utf8'))).toEqual({ format: 1, zone: own });
    fs.writeFileSync(colony, '{"format": 1, "zone": "Asia/Tokyo"}');
    const other = new AnimalsFolder(folder, () => new Date('2026-12-01T20:00:00Z'));
    const made = await other.add('m31', { kind: 'weight', at: AT, grams: 23 }, 'kl');
    expect(made.written).toBe('2026-12-02T05:00:00.000+09:00');
    fs.writeFileSync(colony, '{"format": 1, "zone": "Mars/Olympus"}');
    await expect(new AnimalsFolder(folder).read()).rejects.toThrow(/colony\.json.*zone/);
  });

  it('leaves out a file torn at any byte, says so, and reads all the others', async () => {
    const animals = await withM31();
    const whole = entryText(weight(AT, 23.4));
    const { id } = JSON.parse(whole) as { id: string };
    // All but the last, a line break, is missed.
    for (let bytes = 0; bytes < whole.length - 1; bytes++) {
      expect(readEntryText(whole.slice(0, bytes), id), `${bytes}`).toHaveProperty('why');
    }
    expect(readEntryText(whole, id)).toHaveProperty('grams', 23.4);
    fs.writeFileSync(join(animals.folder, 'm31', `${id}.json`), whole.slice(0, 200));
    const { entries, troubles } = await new AnimalsFolder(animals.folder).read();
    expect(entries.get('m31')).toHaveLength(1);
    expect(troubles[0]!.what).toMatch(/cannot be used: it stops in the middle/);
  });

  it('takes up a file that was being written when it looked, once it is whole', async () => {
    const animals = await withM31();
    const text = entryText(weight(AT, 23.4));
    const { id } = JSON.parse(text) as { id: string };
    const file = join(animals.folder, 'm31', `${id}.json`);
    fs.writeFileSync(file, text.slice(0, 100));
    expect((await animals.read()).troubles).toHaveLength(1);
    fs.writeFileSync(file, text);
    const { entries, troubles } = await animals.read();
    expect(troubles).toEqual([]);
    expect(entries.get('m31')).toHaveLength(2);
  });

  it('does not believe an entry that was edited, renamed or put with another animal', async () => {
    const animals = await withM31();
    const made = await animals.add('m31', { kind: 'weight', at: AT, grams: 23.4 }, 'kl');
    const file = join(animals.folder, 'm31', `${made.id}.json`);
    const text = fs.readFileSync(file, 'utf8');
    fs.writeFileSync(file, text.replace('23.4', '24.4'));
    const edited = await new AnimalsFolder(animals.folder).read();
    expect(edited.troubles[0]!.what).toMatch(/altered after it was written/);
    fs.writeFileSync(file, text);
    fs.renameSync(file, file.replace(/.{6}\.json$/, '000000.json'));
    expect((await new AnimalsFolder(animals.folder).read()).troubles[0]!.what).toMatch(/calls its/);
    const other = join(animals.folder, 'm32');
    fs.mkdirSync(other);
    fs.writeFileSync(join(other, `${made.id}.json`), text);
    const { entries } = await new AnimalsFolder(animals.folder).read();
    expect(entries.has('m32')).toBe(false);
  });

  it('never writes over what is there', async () => {
    const animals = await withM31();
    const before = filesOf(animals.folder).map((name) => [
      name,
      fs.readFileSync(join(animals.folder, 'm31', name), 'utf8'),
    ]);
    const desk = new AnimalsDesk(animals);
    const { id } = await desk.weigh('m31', 24, { by: 'kl' });
    await desk.correct('m31', id, { grams: 23 }, 'misread', 'kl');
    await desk.change('m31', { targetUl: 900 }, 'kl');
    for (const [name, text] of before) {
      expect(fs.readFileSync(join(animals.folder, 'm31', name!), 'utf8')).toBe(text);
    }
    expect(filesOf(animals.folder)).toHaveLength(before.length + 3);
  });

  it('refuses amounts and names that cannot be, and writes nothing', async () => {
    const animals = await withM31();
    const weigh = (grams: number) => animals.add('m31', { kind: 'weight', at: AT, grams }, 'kl');
    for (const grams of [0, -1, 2001, Number.NaN, Number.POSITIVE_INFINITY]) {
      await expect(weigh(grams)).rejects.toMatchObject({ code: 'ANIMALS_ENTRY_BAD' });
    }
    for (const name of ['../m31', '', 'a/b', '.hidden', 'nul', 'é', 'x'.repeat(41)]) {
      await expect(animals.addAnimal(name, CARD, 'kl'), name).rejects.toMatchObject({
        code: 'ANIMALS_ENTRY_BAD',
      });
      await expect(
        animals.add(name, { kind: 'weight', at: AT, grams: 23 }, 'kl'),
      ).rejects.toMatchObject({ code: 'ANIMALS_UNKNOWN' });
    }
    await expect(animals.addAnimal('M31', CARD, 'kl')).rejects.toThrow('m31 is kept already');
    expect(filesOf(animals.folder)).toHaveLength(1);
  });

  it('says that it cannot be read, rather than that there are no animals', async () => {
    const gone = join(newFolder(), 'share');
    await expect(new AnimalsFolder(gone).read()).rejects.toMatchObject({
      code: 'ANIMALS_FOLDER_BAD',
    });
  });
});

describe('what a person enters', () => {
  it('is questioned when it looks mistyped, and taken when it is sure', async () => {
    const desk = new AnimalsDesk(await withM31());
    await expect(desk.weigh('m31', 2.35, { by: 'kl' })).rejects.toMatchObject({
      code: 'ANIMALS_UNLIKELY',
    });
    await expect(desk.give('m31', 4000, { by: 'kl' })).rejects.toThrow(/4 mL for m31/);
    await desk.weigh('m31', 12, { by: 'kl', sure: true });
    await desk.give('m31', 4000, { by: 'kl', sure: true });
    const { history } = await desk.history('m31');
    expect(history.weighings[0]!.grams).toBe(12);
    expect(history.handWater[0]!.ul).toBe(4000);
  });

  it('cannot be of the future, and an unknown name is told the nearest', async () => {
    const now = () => new Date('2026-12-01T12:00:00Z');
    const desk = new AnimalsDesk(await withM31(), now);
    await expect(desk.weigh('m31', 24, { by: 'kl', at: '23:59' })).rejects.toThrow(/future/);
    await expect(desk.weigh('m13', 24, { by: 'kl' })).rejects.toThrow(/did you mean m31/);
  });

  it('is corrected by the first letters of its entry, when they are enough', async () => {
    const desk = new AnimalsDesk(await withM31());
    const { id } = await desk.weigh('m31', 24, { by: 'kl' });
    const correct = (of: string, to: object) => desk.correct('m31', of, to, 'misread', 'kl');
    await expect(correct('', { grams: 23 })).rejects.toThrow(/not enough/);
    await expect(correct('zzzz', { grams: 23 })).rejects.toThrow(/no entry/);
    await expect(correct(id.slice(-16, -8), { ul: 23 })).rejects.toThrow(/is a weight/);
    await correct(id.slice(-16, -8), { grams: 23 });
    const { history } = await desk.history('m31');
    expect(history.weighings.map(({ grams }) => grams)).toEqual([23]);
  });
});

/** One of two rigs that write at once, in a process of its own (what `npm run build` made). */
function rig(folder: string, computer: string, aheadMs: number, count: number, killAfter = 0) {
  const script = join(packageRoot, 'dist/test/tools/writeEntries.js');
  const args = [script, folder, computer, String(aheadMs), String(count)];
  const child = spawn(process.execPath, args, { stdio: ['ignore', 'pipe', 'inherit'] });
  let said = '';
  child.stdout.setEncoding('utf8').on('data', (text: string) => {
    said += text;
    if (killAfter > 0 && said.split('\n').length > killAfter) child.kill('SIGKILL');
  });
  return new Promise<string[]>((resolve) => {
    child.once('close', () => resolve(said.slice(0, said.lastIndexOf('\n')).split('\n')));
  });
}

describe('two rigs that write to one shared folder at once', { timeout: 240_000 }, () => {
  it('lose no entry and overwrite none, with clocks an hour apart and one killed in between', async () => {
    const { folder } = await withM31();
    const [a, b, c] = await Promise.all([
      rig(folder, 'rig-a', 0, 150),
      rig(folder, 'rig-b', -3_600_000, 150),
      rig(folder, 'rig-c', 0, 150, 40),
    ]);
    expect([a.length, b.length]).toEqual([150, 150]);
    expect(c.length).toBeGreaterThanOrEqual(40);
    expect(c.length).toBeLessThan(150);
    const reader = new AnimalsFolder(folder);
    const { entries, zone, troubles } = await reader.read();
    const found = entries.get('m31')!;
    const ids = new Set(found.map(({ id }) => id));
    // Whatever was said to be safely there is there; the killed one may have written one more.
    for (const id of [...a, ...b, ...c]) expect(ids.has(id), id).toBe(true);
    expect(found.length - 1 - a.length - b.length - c.length).toBeLessThanOrEqual(1);
    expect(troubles.length).toBeLessThanOrEqual(1);
    for (const [computer, count] of [
      ['rig-a', 150],
      ['rig-b', 150],
    ] as const) {
      const weights = found.flatMap((one) =>
        one.kind === 'weight' && one.computer === computer ? [one.grams] : [],
      );
      expect(new Set(weights).size).toBe(count);
    }
    const history = historyOf('m31', found, zone);
    expect(
      history.troubles.some(({ what }) => /clock of rig-b is behind.*(59|60) min/.test(what)),
    ).toBe(true);
    // Each writer's own entries stay in the order in which it wrote them.
    const own = history.entries.filter(({ computer }) => computer === 'rig-b').map(({ id }) => id);
    expect(own).toEqual(b);
  });

  it('both begin the same animal or the same folder without harm', async () => {
    const folder = join(newFolder(), 'animals');
    const made = await Promise.allSettled(
      ['rig-a', 'rig-b'].map((computer) =>
        new AnimalsFolder(folder, undefined, computer).addAnimal('m31', CARD, computer),
      ),
    );
    expect(made.some(({ status }) => status === 'fulfilled')).toBe(true);
    const { entries } = await new AnimalsFolder(folder).read();
    expect(entries.get('m31')!.length).toBe(
      made.filter((one) => one.status === 'fulfilled').length,
    );
  });
});
