import { describe, expect, it } from 'vitest';
import { AnimalsDesk } from '../../server/animals/animalsDesk.js';
import { AnimalsFolder } from '../../server/animals/animalsFolder.js';
import { finished, lapwing } from '../tools/liveRig.js';
import { newFolder } from './helpers.js';

// Processes start slowly on a machine with other work.
describe('the commands', { timeout: 240_000 }, () => {
  it('keep, weigh, list for the evening and correct, with JSON for scripts', async () => {
    const folder = newFolder();
    const run = async (...args: string[]) => {
      const { status, out, err } = await finished(lapwing(...args, '--animals', folder));
      return { status, out, err };
    };
    const card = [
      '--baseline',
      '25.2',
      '--implant',
      '1.1',
      '--target',
      '1mL',
      '--protocol',
      'P-17',
    ];
    const added = await run('animals', 'add', 'm31', ...card);
    expect(added.status, added.err).toBe(0);
    expect(added.out).toMatch(/Alarm level 80 % \(common practice\)/);
    expect(added.out).toMatch(/approved protocol decides these limits, and the veterinarian/);

    const evening = await run('water', '--tonight', '--json');
    expect(JSON.parse(evening.out)).toMatchObject({
      due: [{ animal: 'm31', evening: 'no water today', water: { due: { mostUl: 1000 } } }],
    });
    const low = await run('weigh', 'm31', '20');
    expect(low.out).toMatch(/20 g, 75\.0 %, BELOW 80 %.*veterinarian/);
    const desk = new AnimalsDesk(new AnimalsFolder(folder));
    await desk.give('m31', 400, { by: 'kl' });
    const { id } = (await desk.history('m31')).history.weighings[0]!;
    const letters = id.slice(-16, -8);
    const right = await run('correct', 'm31', letters, '--grams', '23', '--reason', 'misread');
    expect(right.out).toContain(`${letters} corrected to 23 g (misread)`);
    const all = await run('animals');
    expect(all.out).toMatch(/m31 +restricted +23 g, 86\.9 % +0\.40 mL by hand +0\.60 mL/);
  });
});
