import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readFileSync,
  rmSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { FastifyInstance } from 'fastify';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import type { CheckAnswer, RehearsalState } from '../../server/web/rules/rulesMessages.js';
import { startWeb, until } from './webRig.js';

const RULES = `title: Water and light
belt: 180 cm
places:
  zone: 170 to 10 cm
  target: 45 cm, but 60 cm in probe
draws:
  spot: 20 to 140 cm, every lap
phases:
  first: for 5 laps
  probe: for 5 laps
rules:
  water:
    when: reaches 90 cm
    do: give 4 uL
  light:
    when: reaches target
    do: pulse gate for 100 ms
    limit: 1 per lap
  late:
    when: 500 ms after enters zone
    if: speed > 1 cm/s
    do: note
    limit: 1 per lap
  drawn:
    when: reaches spot
    do: note
end: time >= 20 min
`;

let root: string;
let folder: string;

beforeEach(() => {
  root = mkdtempSync(join(tmpdir(), 'lapwing-rules-'));
  folder = join(root, 'rules');
  mkdirSync(join(folder, 'day1'), { recursive: true });
  writeFileSync(join(folder, 'a.yaml'), RULES);
  writeFileSync(join(folder, 'day1/b.yml'), RULES);
  writeFileSync(join(folder, 'notes.txt'), 'not rules');
  writeFileSync(join(root, 'secret.yaml'), 'outside');
});
afterEach(() => rmSync(root, { recursive: true, force: true }));

const start = async () => (await startWeb({ rulesFolder: folder })).app;

async function check(app: FastifyInstance, text: string, path?: string): Promise<CheckAnswer> {
  const payload = { text, ...(path === undefined ? {} : { path }) };
  const answer = await app.inject({ method: 'POST', url: '/api/rules/check', payload });
  expect([answer.statusCode, answer.body.slice(0, 200)]).toEqual([200, expect.any(String)]);
  return answer.json();
}

const save = (app: FastifyInstance, payload: object) =>
  app.inject({ method: 'PUT', url: '/api/rules/file', payload });
const open = (app: FastifyInstance, path: string) =>
  app.inject(`/api/rules/file?path=${encodeURIComponent(path)}`);

describe('rules files', () => {
  test('are listed with the names of the rig, and opened as they are', async () => {
    const app = await start();
    const list = (await app.inject('/api/rules')).json();
    expect(list.files).toEqual(['a.yaml', 'day1/b.yml']);
    expect(list.rig.outputs).toContainEqual({ name: 'gate', kind: 'stimulus' });
    expect((await open(app, 'day1/b.yml')).json()).toMatchObject({ text: RULES });
    expect((await open(app, 'none.yaml')).statusCode).toBe(404);
  });

  test('are saved whole, what was there before is kept, and the setup offers a new one', async () => {
    const app = await start();
    const { version } = (await open(app, 'a.yaml')).json();
    const saved = await save(app, { path: 'a.yaml', text: 'title: µ\n', version });
    expect(saved.json()).toEqual({ done: true, version: expect.any(String) });
    expect(readFileSync(join(folder, 'a.yaml'), 'utf8')).toBe('title: µ\n');
    expect(readFileSync(join(folder, 'a.yaml.bak'), 'utf8')).toBe(RULES);
    expect((await open(app, 'a.yaml')).json().version).toBe(saved.json().version);
    expect((await save(app, { path: 'day1/new.yaml', text: RULES })).statusCode).toBe(200);
    expect((await app.inject('/api/setup')).json().rulesFiles).toContain('day1/new.yaml');
    const payload = { rules: 'day1/new.yaml', subject: 'M12' };
    const began = await app.inject({ method: 'POST', url: '/api/session', payload });
    expect(began.statusCode).toBe(200);
  });

  test('are not overwritten when they changed since they were opened, nor by chance', async () => {
    const app = await start();
    const { version } = (await open(app, 'a.yaml')).json();
    writeFileSync(join(folder, 'a.yaml'), 'changed elsewhere');
    const refused = [
      { path: 'a.yaml', text: 'mine', version },
      { path: 'a.yaml', text: 'mine' },
      { path: 'gone.yaml', text: 'mine', version },
    ];
    for (const body of refused) {
      const answer = await save(app, body);
      expect([answer.statusCode, answer.json().code]).toEqual([409, 'WEB_RULES_CHANGED']);
    }
    expect(readFileSync(join(folder, 'a.yaml'), 'utf8')).toBe('changed elsewhere');
    expect(existsSync(join(folder, 'gone.yaml'))).toBe(false);
  });

  test('outside of the folder can be neither read, written, checked against nor brought in', async () => {
    symlinkSync(join(root, 'secret.yaml'), join(folder, 'link.yaml'));
    symlinkSync(root, join(folder, 'up'));
    mkdirSync(join(folder, 'folder.yaml'));
    const app = await start();
    const paths = [
      '../secret.yaml',
      'day1/../../secret.yaml',
      join(root, 'secret.yaml'),
      'link.yaml',
    ];
    paths.push(
      'up/secret.yaml',
      'folder.yaml',
      'none/x.yaml',
      'a.yaml/x.yaml',
      'a.yaml\0',
      'con.yaml',
    );
    paths.push(
      '..\\secret.yaml',
      'C:x.yaml',
      '~/x.yaml',
      './a.yaml',
      'notes.txt',
      '.hidden.yaml',
      '',
    );
    for (const path of paths) {
      const read = await open(app, path);
      expect([path, read.statusCode >= 400 && read.statusCode < 500]).toEqual([path, true]);
      expect(read.body).not.toContain('outside');
      const wrote = await save(app, { path, text: 'x' });
      expect([path, wrote.statusCode >= 400 && wrote.statusCode < 500]).toEqual([path, true]);
    }
    for (const path of ['link.yaml', 'up/secret.yaml', '../secret.yaml']) {
      const { problems } = await check(app, `include: ${path}\n${RULES}`, 'a.yaml');
      expect(JSON.stringify(problems)).not.toContain('outside');
      expect(problems[0]!.code).toMatch(/^(badPath|unreadableFile)$/);
    }
    expect(readFileSync(join(root, 'secret.yaml'), 'utf8')).toBe('outside');
  });
});

describe('a check', () => {
  test('tells every mistake with its place, what was expected and the nearest name', async () => {
    const app = await start();
    const wrong = RULES.replace('reaches target', 'reaches tarqet').replace('give 4 uL', 'give 4');
    const { right, problems, explain } = await check(app, wrong, 'a.yaml');
    expect(right).toBe(false);
    expect(explain).toBe('');
    const errors = problems.filter((one) => one.severity === 'error');
    const named = errors.find((one) => one.message.includes('tarqet'))!;
    expect(named).toMatchObject({ nearest: 'target', here: true, line: 16, column: 19 });
    expect(wrong.slice(named.from, named.to)).toBe('tarqet');
    expect(errors.some((one) => one.line === 14)).toBe(true);
  });

  test('outlines places and rules on the belt, though something is wrong elsewhere', async () => {
    const app = await start();
    const wrong = RULES.replace('give 4 uL', 'give 4');
    const { outline, right } = await check(app, wrong);
    expect(right).toBe(false);
    expect(outline!.beltCm).toBe(180);
    expect(outline!.places.map((one) => [one.name, one.spots])).toEqual([
      ['zone', [{ fromCm: 170, toCm: 10, kind: 'span' }]],
      [
        'target',
        [
          { fromCm: 45, toCm: 45, kind: 'point' },
          { fromCm: 60, toCm: 60, kind: 'point' },
        ],
      ],
    ]);
    const rules = new Map(outline!.rules.map((one) => [one.name, one]));
    expect(rules.get('light')!.spots).toHaveLength(2);
    expect(rules.get('late')!.spots).toEqual([{ fromCm: 170, toCm: 10, kind: 'span' }]);
    expect(rules.get('drawn')!.spots).toEqual([{ fromCm: 20, toCm: 140, kind: 'somewhere' }]);
    expect(wrong.slice(rules.get('light')!.from)).toMatch(/^light:/);
  });

  test('explains a file that is right', async () => {
    const app = await start();
    const { right, explain, problems } = await check(app, RULES);
    expect([right, problems.filter((one) => one.severity === 'error')]).toEqual([true, []]);
    expect(explain).toContain('Phase by phase');
  });

  test('of a hostile file is answered in bounded time', async () => {
    const app = await start();
    const doubling = Array.from({ length: 60 }, (_, n) => `  a${n + 1}: a${n} + a${n}\n`).join('');
    const hostile = [
      RULES.replace('  zone:', `  a0: 1 cm\n${doubling}  zone:`).replace('90 cm', 'a60'),
      RULES.replace('90 cm', `${'('.repeat(900)}1 cm${')'.repeat(900)}`),
      RULES.replace('zone: 170', 'zone: loop\n  loop: zone\n  other: 170'),
      `${'- '.repeat(50_000)}x`,
      `a: &a [x]\nb: [*a, *a]\n`.repeat(2000),
      'x'.repeat(200_000),
      '__proto__: 1\nconstructor: 2\nrules:\n  __proto__:\n    when: lap begins\n    do: note\n',
      '\ufeff\0\u202e',
      '',
    ];
    for (const text of hostile) {
      const beganMs = performance.now();
      const { right } = await check(app, text);
      expect(right).toBe(false);
      // Far above the second that is promised: this only tells bounded from boundless.
      expect(performance.now() - beganMs).toBeLessThan(10_000);
    }
  });

  test('has a limit of its own, and refuses a body that is too long or has another form', async () => {
    const app = await start();
    const post = (payload: object) =>
      app.inject({ method: 'POST', url: '/api/rules/check', payload });
    expect((await post({ text: 'x'.repeat(300_000) })).statusCode).toBe(413);
    expect((await post({})).statusCode).toBe(400);
    expect((await post({ text: 7 })).statusCode).toBe(400);
    expect((await post({ text: '', path: '../a.yaml' })).statusCode).toBe(422);
    const codes = await Promise.all(
      Array.from({ length: 60 }, async () => (await post({ text: '' })).statusCode),
    );
    expect(codes).toContain(429);
    const quiet = await app.inject({ method: 'POST', url: '/api/quiet', payload: {} });
    expect(quiet.statusCode).toBe(200);
  });
});

const SLOW_MS = 100_000;

describe('a rehearsal', { timeout: 3 * SLOW_MS }, () => {
  const begin = (app: FastifyInstance, payload: object) =>
    app.inject({ method: 'POST', url: '/api/rehearse', payload });
  const state = async (app: FastifyInstance): Promise<RehearsalState> =>
    (await app.inject('/api/rehearse')).json();
  const ended = async (app: FastifyInstance): Promise<RehearsalState> => {
    // A process is started for it, which starts threads for many sessions.
    await until(async () => (await state(app)).state !== 'running', SLOW_MS);
    return state(app);
  };

  test('tells what fired where, the same each time for the same seeds', async () => {
    const app = await start();
    expect(await state(app)).toEqual({ state: 'none' });
    const body = { text: RULES, seed: 'x', animalSeed: 4, trained: true, minutes: 4 };
    expect((await begin(app, body)).json()).toEqual({ done: true, number: 1 });
    const first = await ended(app);
    if (first.state !== 'done') throw new Error(JSON.stringify(first));
    const { result } = first;
    expect(result).toMatchObject({ seed: 'x', beltCm: 180, marksLeftOut: 0 });
    expect(result.laps).toBeGreaterThan(2);
    const water = result.rules.find((rule) => rule.name === 'water')!;
    expect(water.fired).toBeGreaterThan(0);
    const drops = result.raster.flatMap((lap) => lap.mm.filter((_, n) => lap.kinds[n] === 'water'));
    expect(drops).toHaveLength(water.fired);
    // Within a count of the place, to the tenth of a millimetre and the animal's slip.
    for (const mm of drops) expect(Math.abs(mm - 900)).toBeLessThan(20);
    expect(result.phases[0]).toMatchObject({ name: 'first' });
    await begin(app, body);
    const second = await ended(app);
    if (second.state !== 'done') throw new Error(JSON.stringify(second));
    expect(second.number).toBe(2);
    expect({ ...second.result, tookS: 0 }).toEqual({ ...result, tookS: 0 });
  });

  test('is one at a time, and can be cancelled', async () => {
    const app = await start();
    const text = RULES.replace('for 5 laps', 'for 5000 laps').replace('20 min', '2000 min');
    expect((await begin(app, { text, minutes: 240 })).statusCode).toBe(200);
    const busy = await begin(app, { text, minutes: 240 });
    expect([busy.statusCode, busy.json().code]).toEqual([409, 'WEB_REHEARSAL_BUSY']);
    expect((await app.inject({ method: 'DELETE', url: '/api/rehearse' })).statusCode).toBe(200);
    expect(await state(app)).toEqual({ state: 'cancelled', number: 1 });
    expect((await begin(app, { text: 'nonsense' })).statusCode).toBe(200);
    expect(await ended(app)).toMatchObject({ state: 'failed', number: 2, code: 'RULES_INVALID' });
  });

  test('of many sessions tells how they differ, and how far it is', async () => {
    const app = await start();
    await begin(app, { text: RULES, seed: 'x', minutes: 2, runs: 3 });
    expect(await state(app)).toMatchObject({ state: 'running', runs: 3, runsDone: 0 });
    const many = await ended(app);
    if (many.state !== 'many done') throw new Error(JSON.stringify(many));
    const { report } = many.result;
    expect(report).toMatchObject({ runs: 3, seed: 'x', animal: 'usual, trained' });
    expect(report.minutes.most).toBeLessThanOrEqual(2.1);
    expect(report.rules.find(({ name }) => name === 'water')!.fired.median).toBeGreaterThan(0);
    await begin(app, { text: 'nonsense', runs: 3 });
    expect(await ended(app)).toMatchObject({ state: 'failed', code: 'RULES_INVALID' });
  });

  test('refuses seeds and lengths that are none', async () => {
    const app = await start();
    const bad = [{ minutes: 0 }, { minutes: 241 }, { runs: 0 }, { runs: 1001 }, { animalSeed: -1 }];
    for (const one of [...bad, { trained: 'yes' }, { seed: 'x'.repeat(65) }]) {
      expect((await begin(app, { text: RULES, ...one })).statusCode).toBe(400);
    }
    expect(await state(app)).toEqual({ state: 'none' });
  });
});

test('without a rig file, editing says so and all else goes on', async () => {
  const { app } = await startWeb({ rig: undefined });
  expect((await app.inject('/api/rules')).json().code).toBe('WEB_NO_RIG');
  expect((await app.inject('/api/state')).statusCode).toBe(200);
});
