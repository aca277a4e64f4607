import { mkdtempSync, rmSync } from 'node:fs';
import type { OutgoingHttpHeaders } from 'node:http';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach } from 'vitest';
import { type AccessFiles, People, type Role } from '../../../server/web/access/people.js';
import type { WebOptions } from '../../../server/web/buildWeb.js';
import { startWeb, until, type WebRig } from '../webRig.js';

/** A hash that costs nothing: what is tested is not how long it takes. */
export const CHEAP = { n: 16, r: 1, p: 1 };

const folders: string[] = [];
afterEach(() => {
  for (const folder of folders.splice(0)) rmSync(folder, { recursive: true, force: true });
});

/** Files of their own for one test. */
export function newFiles(): AccessFiles {
  const folder = mkdtempSync(join(tmpdir(), 'lapwing-people-'));
  folders.push(folder);
  return { peopleFile: join(folder, 'people.json'), signedInFile: join(folder, 'signed-in.json') };
}

export interface GuardedRig extends WebRig {
  readonly files: AccessFiles;
  readonly people: People;
  readonly secrets: Map<string, string>;
  /** Adds somebody. */
  add(name: string, role: Role): Promise<void>;
  /** Signs somebody in, and gives the headers of the browser that did. */
  signIn(name: string): Promise<{ cookie: string }>;
  /** Asks as that browser; anonymously without headers. */
  ask(
    method: 'GET' | 'POST' | 'PUT' | 'DELETE',
    url: string,
    headers?: OutgoingHttpHeaders,
    payload?: object,
  ): Promise<Answer>;
  /** A signed-in operator who holds the controls. */
  holder(name?: string): Promise<{ cookie: string }>;
}

export interface Answer {
  readonly status: number;
  readonly headers: OutgoingHttpHeaders;
  // Whatever the route answers; tests know.
  // biome-ignore lint/suspicious/noExplicitAny: parsed JSON
  readonly body: any;
}

/** A web process where people sign in: `anna` and `ben` are operators, `vera` is a viewer. */
export async function startGuarded(
  options: Partial<WebOptions> & { readonly host?: string } = {},
): Promise<GuardedRig> {
  const files = options.access ?? newFiles();
  const people = new People(files.peopleFile, CHEAP);
  const secrets = new Map<string, string>();
  const add = async (name: string, role: Role) => {
    secrets.set(name, await people.add(name, role));
  };
  if (people.all.length === 0) {
    await add('anna', 'operator');
    await add('ben', 'operator');
    await add('vera', 'viewer');
  }
  const web = await startWeb({ access: files, hashCost: CHEAP, ...options });
  const { app } = web;
  const ask: GuardedRig['ask'] = async (method, url, headers = {}, payload) => {
    const answer = await app.inject({
      ...{ method, url, headers: headers as Record<string, string> },
      ...(payload ? { payload } : {}),
    });
    const isJson = String(answer.headers['content-type']).includes('json');
    const body = isJson ? answer.json() : answer.body;
    return { status: answer.statusCode, headers: answer.headers, body };
  };
  const signIn = async (name: string) => {
    const answer = await ask('POST', '/api/sign-in', {}, { name, secret: secrets.get(name)! });
    if (answer.status !== 200) throw new Error(JSON.stringify(answer.body));
    return { cookie: cookieOf(answer) };
  };
  const holder = async (name = 'anna') => {
    const browser = await signIn(name);
    const seen = (await ask('GET', '/api/controls', browser)).body.change;
    await ask('POST', '/api/controls', browser, { take: true, seen });
    return browser;
  };
  return { ...web, files, people, secrets, add, signIn, ask, holder };
}

/** What a browser sends back of a `set-cookie`. */
export function cookieOf({ headers }: Answer): string {
  return String(headers['set-cookie']).split(';')[0]!;
}

/** Begins a session in the fake loop, and waits until the web process knows. */
export async function beginSession({ loop, ask }: GuardedRig, browser: { cookie: string }) {
  loop.animal.begin('induction.yaml', 'M12');
  loop.broadcast(`${JSON.stringify({ tell: 'setup', setup: loop.animal.setup })}\n`);
  await until(async () => (await ask('GET', '/api/setup', browser)).body.session !== null);
}
