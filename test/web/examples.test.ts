/** The examples of HTTP.md for a shell and for Python, run as they are written. */
import { execFile } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { dirname } from 'node:path';
import { promisify } from 'node:util';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { describe, expect, test } from 'vitest';
import { beginSession, type GuardedRig, startGuarded } from './access/signedIn.js';
import { until, Viewer } from './webRig.js';

const page = readFileSync(new URL('../../server/web/HTTP.md', import.meta.url), 'utf8');
const run = promisify(execFile);

/** The indented lines that hold this text, in the part about signing in. */
function example(text: string): string {
  const [, part = ''] = page.split(/^## Signing in$/m);
  const blocks = part.split(/\n{2,}(?! {4})/).filter((block) => block.includes(text));
  const lines = blocks[0]!.split('\n').filter((line) => line.startsWith('    '));
  expect(lines.length).toBeGreaterThan(5);
  return lines.map((line) => line.slice(4)).join('\n');
}

/** With this service's address and secret instead of the page's. */
function forThis(rig: GuardedRig, text: string): string {
  return text
    .replaceAll('https://rig1.example:8711', rig.url)
    .replaceAll('k7mq-2vxd-9htr-w3fb-n5ce', rig.secrets.get('anna')!);
}

async function rigInSession(): Promise<GuardedRig> {
  const rig = await startGuarded();
  await beginSession(rig, await rig.signIn('vera'));
  return rig;
}

describe('the examples of signing in', () => {
  test('from a shell work as they are written', async () => {
    const rig = await rigInSession();
    const script = forThis(rig, example('post /api/sign-in'));
    const { stdout } = await run('sh', ['-ec', script], { cwd: dirname(rig.files.peopleFile) });
    expect(stdout).toContain('"name":"anna"');
    expect(rig.loop.acts()).toContainEqual({ act: 'note', text: 'from a shell' });
    expect(rig.loop.heard.find((one) => one.say === 'quiet')).toMatchObject({ who: 'anna' });
  });

  test('from Python work as they are written', async () => {
    const rig = await rigInSession();
    await run('python3', ['-c', forThis(rig, example('http.cookiejar'))]);
    expect(rig.loop.acts()).toContainEqual({ act: 'note', text: 'from Python' });
    expect(rig.loop.heard.find((one) => one.say === 'quiet')).toMatchObject({ who: 'anna' });
  });
});

describe('the schema of the stream', () => {
  test('is what every kind of its messages looks like', async () => {
    const rig = await startGuarded({ keepEvents: 50 });
    const anna = await rig.holder('anna');
    const first = new Viewer(rig.url, '', { headers: anna });
    await beginSession(rig, anna);
    rig.loop.advance(120);
    await until(() => first.all('events').length > 0 && first.all('loop').length > 0);
    const { life } = first.all('loop')[0]!;
    // One that comes back after too long is told of a gap.
    const late = new Viewer(rig.url, `?after=1&life=${life}`, { headers: anna });
    await until(() => late.all('gap').length > 0 && late.all('state').length > 0);
    late.socket.send('{"ask":"quiet"}');
    await until(() => late.all('quiet').length > 0);
    const { components } = (await rig.ask('GET', '/api/openapi.json', anna)).body;
    const ajv = new Ajv2020({ strict: false, validateFormats: false });
    const schema = { $id: 'lapwing', components };
    ajv.addSchema(schema);
    const fits = ajv.compile({ $ref: 'lapwing#/components/schemas/StreamMessage' });
    const all = [...first.told, ...late.told];
    for (const message of all) expect(fits(message), JSON.stringify(fits.errors)).toBe(true);
    const kinds = new Set<string>(all.map(({ tell }) => tell));
    const described = components.schemas.StreamMessage.oneOf as {
      properties: { tell: { const: string } };
    }[];
    expect([...kinds].sort()).toEqual(described.map((one) => one.properties.tell.const).sort());
    expect(fits({ tell: 'nothing that there is' })).toBe(false);
  });
});
