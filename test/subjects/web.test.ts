import { Ajv2020 } from 'ajv/dist/2020.js';
import type { FastifyInstance } from 'fastify';
import { describe, expect, it } from 'vitest';
import type { AnimalsAsk, AnimalsTold } from '../../server/web/animals/animalsMessages.js';
import { startWeb } from '../web/webRig.js';
import { newFolder } from './helpers.js';

async function web() {
  const folder = newFolder();
  const { app } = await startWeb({ animals: folder });
  const ask = async (payload: unknown) => {
    const answer = await app.inject({
      method: 'POST',
      url: '/api/animals',
      payload: payload as object,
    });
    return { status: answer.statusCode, body: answer.json() };
  };
  const say = (payload: AnimalsAsk) => ask(payload);
  return { app, folder, ask, say };
}

const M31: AnimalsAsk = {
  ...{ do: 'add', animal: 'm31', by: 'kl' },
  set: { baselineG: 25, targetUl: 1000, protocol: 'P-17', state: 'restricted' },
};

async function list(app: FastifyInstance): Promise<AnimalsTold> {
  return (await app.inject('/api/animals')).json() as AnimalsTold;
}

describe('animals over HTTP', () => {
  it('are added, weighed, watered, changed and corrected, each by an entry of its own', async () => {
    const { app, say } = await web();
    expect((await say(M31)).status).toBe(200);
    const weighed = await say({ do: 'weigh', animal: 'm31', grams: 42, sure: true });
    await say({ do: 'correct', animal: 'm31', of: weighed.body.id, grams: 24, reason: 'swapped' });
    await say({ do: 'water', animal: 'm31', ul: 400, note: 'gel' });
    await say({ do: 'change', animal: 'm31', set: { targetUl: 900 }, reason: 'new protocol' });
    const { animals } = await list(app);
    expect(animals[0]).toMatchObject({
      ...{ animal: 'm31', today: { grams: 24, percent: 96, level: 'fine' } },
      water: { byHandUl: 400, due: { leastUl: 500, mostUl: 500 } },
      evening: 'less than its target',
    });
    const one = await app.inject('/api/animals/m31');
    expect(one.json().entries).toHaveLength(5);
    expect(one.json().entries[0].by).toBe('operator');
  });

  it('look as the description says', async () => {
    const { app, say } = await web();
    await say(M31);
    await say({ do: 'weigh', animal: 'm31', grams: 24 });
    const { components } = (await app.inject('/api/openapi.json')).json();
    const ajv = new Ajv2020({ strict: false, validateFormats: false });
    ajv.addSchema({ $id: 'lapwing', components });
    const check = (name: string) => ajv.compile({ $ref: `lapwing#/components/schemas/${name}` });
    expect(check('Animals')(await list(app))).toBe(true);
    expect(check('Animal')((await app.inject('/api/animals/m31')).json())).toBe(true);
    expect(check('Animal')({ animal: 'm31' })).toBe(false);
  });

  it('are refused in problem details: what is unknown, unlikely, or not as the schema says', async () => {
    const { app, ask, say } = await web();
    await say(M31);
    const code = async (payload: unknown) => {
      const { status, body } = await ask(payload);
      return [status, body.code];
    };
    const weigh = { do: 'weigh', animal: 'm31', grams: 24 };
    expect(await code(M31)).toEqual([409, 'ANIMALS_EXISTS']);
    expect(await code({ ...weigh, animal: 'm13' })).toEqual([404, 'ANIMALS_UNKNOWN']);
    expect(await code({ ...weigh, grams: 2.4 })).toEqual([422, 'ANIMALS_UNLIKELY']);
    expect(await code({ ...weigh, at: 'noon' })).toEqual([422, 'ANIMALS_ENTRY_BAD']);
    expect(await code({ ...weigh, grams: '24' })).toEqual([400, 'WEB_BODY_INVALID']);
    expect(await code({ ...weigh, more: 1 })).toEqual([400, 'WEB_BODY_INVALID']);
    expect(await code({ ...weigh, do: 'remove' })).toEqual([400, 'WEB_BODY_INVALID']);
    expect(await code({ do: 'change', animal: 'm31', set: {} })).toEqual([400, 'WEB_BODY_INVALID']);
    expect(await code({ ...M31, animal: '../up' })).toEqual([422, 'ANIMALS_ENTRY_BAD']);
    const bad = { bornOn: '2026-02-30' };
    expect(await code({ do: 'change', animal: 'm31', set: bad })).toEqual([
      422,
      'ANIMALS_ENTRY_BAD',
    ]);
    expect((await app.inject('/api/animals/..%2f..%2fetc')).statusCode).toBe(404);
    expect((await list(app)).animals[0]!.today).toBeNull();
  });

  it('say that no folder was named, rather than that there are none', async () => {
    const { app } = await startWeb();
    const answer = await app.inject('/api/animals');
    expect(answer.json()).toMatchObject({ folder: null, animals: [] });
    const one = await app.inject('/api/animals/m31');
    expect([one.statusCode, one.json().code]).toEqual([503, 'ANIMALS_NO_FOLDER']);
  });
});
