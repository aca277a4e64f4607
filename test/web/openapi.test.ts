import { readFileSync } from 'node:fs';
import { Ajv2020 } from 'ajv/dist/2020.js';
import type { FastifyInstance } from 'fastify';
import { describe, expect, test } from 'vitest';
import { newFolder } from '../subjects/helpers.js';
import { cookieOf, startGuarded } from './access/signedIn.js';
import { describedSession } from './records/folders.js';
import { startWeb, until } from './webRig.js';

interface Description {
  openapi: string;
  paths: Record<string, Record<string, { requestBody?: unknown }>>;
  components: { schemas: Record<string, object> };
}

const page = readFileSync(new URL('../../server/web/HTTP.md', import.meta.url), 'utf8');
/** Rows of the page's table of requests. */
const EXAMPLES = [...page.matchAll(/^\| `POST (\S+)` +\| `(.+)` +\|$/gm)].map(
  ([, path, body]) => [path!, body!] as const,
);

async function describedBy(app: FastifyInstance): Promise<Description> {
  return (await app.inject('/api/openapi.json')).json() as Description;
}

/** Whether an answer has the shape that the description gives it. */
function checker(description: Description): (name: string) => (body: unknown) => boolean {
  // `discriminator` is OpenAPI's word, not JSON Schema's; `uri` is only a format.
  const ajv = new Ajv2020({ strict: false, validateFormats: false });
  ajv.addSchema({ $id: 'lapwing', components: description.components });
  return (name) => ajv.compile({ $ref: `lapwing#/components/schemas/${name}` });
}

/** Every route with its methods, from the tree that Fastify prints: four columns a level. */
function routesOf(app: FastifyInstance): [path: string, methods: string][] {
  const above: string[] = [];
  return app
    .printRoutes({ commonPrefix: false })
    .split('\n')
    .flatMap((line): [string, string][] => {
      const [, indent, part, methods] = /^(.*?)([/*]\S*)(?: \((.+?)\))?$/.exec(line) ?? [];
      if (indent === undefined || part === undefined) return [];
      const depth = indent.length / 4 - 1;
      above[depth] = (above[depth - 1] ?? '') + part;
      return methods === undefined ? [] : [[above[depth], methods]];
    });
}

describe('the description', () => {
  test('names every route that there is, and no other', async () => {
    const { app } = await startWeb();
    const described = await describedBy(app);
    expect(described.openapi).toBe('3.1.0');
    for (const [path, methods] of Object.entries(described.paths)) {
      for (const method of Object.keys(methods)) {
        const url = path.replace(/\{(\w+)\}/g, ':$1');
        expect(app.hasRoute({ method: method.toUpperCase(), url })).toBe(true);
      }
    }
    const routes = routesOf(app);
    expect(routes.length).toBeGreaterThanOrEqual(12);
    for (const [path, methods] of routes) {
      if (path === '/*') continue;
      for (const method of methods.split(', ')) {
        if (method === 'HEAD' || method === 'OPTIONS') continue;
        const told = described.paths[path.replace(/:(\w+)/g, '{$1}')];
        expect(told?.[method.toLowerCase()], `${method} ${path}`).toBeDefined();
      }
    }
  });

  test('is what the answers look like, good and bad', async () => {
    const { app, loop } = await startWeb();
    const matches = checker(await describedBy(app));
    const quiet = await app.inject({ method: 'POST', url: '/api/quiet', payload: {} });
    expect(matches('Done')(quiet.json())).toBe(true);
    const bad = await app.inject({ method: 'POST', url: '/api/acts', payload: { act: {} } });
    expect(matches('Problem')(bad.json())).toBe(true);
    const lost = await app.inject('/api/nowhere');
    expect(matches('Problem')(lost.json())).toBe(true);
    await loop.goAway();
    const away = await app.inject({ method: 'POST', url: '/api/quiet', payload: {} });
    expect(matches('Problem')(away.json())).toBe(true);
    expect(matches('Problem')({ status: 404 })).toBe(false);
  });
});

/** Their examples want a service that people sign in to. */
const ACCESS: Readonly<Record<string, string>> = {
  '/api/sign-in': 'SignIn',
  '/api/sign-out': 'SignOut',
  '/api/controls': 'TakeControls',
};

/** Their examples want a bench: test/web/rigRoutes.test.ts runs them. */
const BENCH: Readonly<Record<string, string>> = {
  '/api/rig/try': 'RigTry',
  '/api/rig/guide': 'RigGuide',
  '/api/rig/guide/answer': 'RigAnswer',
  '/api/rig/preflight': 'RigNothing',
  '/api/rig/calibrations/use': 'RigUse',
};

describe('the page about it', () => {
  test('has an example of every request that changes something', async () => {
    const { app } = await startWeb();
    const { paths } = await describedBy(app);
    const posts = Object.keys(paths).filter((path) => paths[path]!.post);
    expect([...new Set(EXAMPLES.map(([path]) => path))].sort()).toEqual(posts.sort());
  });

  test('every example of it works as written', async () => {
    const records = newFolder();
    const sessions = ['2026-03-04_09-30-00_M12_Induction', '2026-03-05_09-28-00_M12_Induction'];
    for (const name of sessions) describedSession(records, name);
    const { app, loop } = await startWeb({ animals: newFolder(), records });
    const matches = checker(await describedBy(app));
    const schemas: Record<string, string> = {
      ...{ '/api/session': 'Begin', '/api/acts': 'Act', '/api/end': 'End', '/api/quiet': 'Quiet' },
      ...{ '/api/rules/check': 'CheckRules', '/api/rehearse': 'Rehearse' },
      ...{ '/api/animals': 'AnimalEntry', '/api/records/{name}/work': 'Work' },
      '/api/comparisons': 'Compare',
      ...ACCESS,
      ...BENCH,
    };
    for (const [path, body] of EXAMPLES) {
      expect(matches(schemas[path]!)(JSON.parse(body))).toBe(true);
      const headers = { 'content-type': 'application/json' };
      // Only where people sign in: below.
      if (path in ACCESS || path in BENCH) continue;
      const url = path.replace('{name}', sessions[0]!);
      const answer = await app.inject({ method: 'POST', url, payload: body, headers });
      expect([path, body, answer.statusCode]).toEqual([path, body, 200]);
      if (path === '/api/session') {
        await until(async () => (await app.inject('/api/setup')).json().session !== null);
      }
    }
    expect(loop.acts().map((act) => act.act)).toEqual([
      ...['choose', 'press', 'hold', 'phase', 'note', 'exclude lap', 'new cell'],
      ...['ask', 'withdraw', 'mark', 'put off', 'acknowledge', 'allow stimulation'],
    ]);
  });

  test('and every example of signing in, one after the other', async () => {
    const { ask, signIn, secrets } = await startGuarded();
    let browser = await signIn('anna');
    const tried: number[] = [];
    for (const [path, body] of EXAMPLES.filter(([one]) => one in ACCESS)) {
      const payload = JSON.parse(body) as { secret?: string };
      if (payload.secret) payload.secret = secrets.get('anna')!;
      const answer = await ask('POST', path, browser, payload);
      if (path === '/api/sign-in') browser = { cookie: cookieOf(answer) };
      tried.push(answer.status);
    }
    expect(tried).toEqual([200, 200, 200, 200]);
  });

  test('names every kind of message of the stream', () => {
    const source = readFileSync(
      new URL('../../server/web/streamMessages.ts', import.meta.url),
      'utf8',
    );
    const kinds = [...source.matchAll(/readonly tell: '(\w+)'/g)].map(([, kind]) => kind!);
    const told = [...page.matchAll(/^\| `(\w+)` +\|/gm)].map(([, kind]) => kind!);
    expect(told.sort()).toEqual(kinds.sort());
  });
});
