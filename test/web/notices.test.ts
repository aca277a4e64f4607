import { readFileSync } from 'node:fs';
import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import pino from 'pino';
import { afterEach, describe, expect, test } from 'vitest';
import type { AlarmView } from '../../server/loop/alarms/alarms.js';
import { packageRoot } from '../../server/packageRoot.js';
import { parseRig } from '../../server/session/rig/readRig.js';
import type { RigNotify } from '../../server/session/rig/rig.js';
import { bodyOf, type Notice } from '../../server/web/notices/body.js';
import { NOTIFY_URL, Notices, notifyOf } from '../../server/web/notices/notices.js';
import { SENDER_TIMES, Sender, type SenderTimes } from '../../server/web/notices/sender.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';
import { startWeb, until } from './webRig.js';

const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');
const log = pino({ level: 'silent' });
/** As in life, a thousand times as quick. */
const QUICK: SenderTimes = {
  ...{ gatherMs: 20, timeoutMs: 400, firstRetryMs: 20, mostRetryMs: 80, windowMs: 600 },
};

/** A colleague's HTTP service: keeps what it is sent, and answers as the test says. */
class Hook {
  readonly bodies: string[] = [];
  readonly types: string[] = [];
  answer: (response: ServerResponse, request: IncomingMessage) => void = (r) =>
    void r.end('thanks');
  private server: Server | undefined;
  url = '';

  async start(): Promise<this> {
    this.server = createServer((request, response) => {
      let body = '';
      request.on('data', (bytes: Buffer) => {
        body += bytes.toString('utf8');
      });
      request.on('end', () => {
        this.bodies.push(body);
        this.types.push(String(request.headers['content-type']));
        this.answer(response, request);
      });
    });
    await new Promise<void>((resolve) => this.server!.listen(0, '127.0.0.1', resolve));
    this.url = `http://127.0.0.1:${(this.server!.address() as AddressInfo).port}/hook`;
    return this;
  }
  stop(): void {
    this.server?.closeAllConnections();
    this.server?.close();
  }
}

const hooks: Hook[] = [];
const closing: { close(): void }[] = [];
afterEach(() => {
  for (const one of [
    ...closing.splice(0),
    ...hooks.splice(0).map((h) => ({ close: () => h.stop() })),
  ]) {
    one.close();
  }
  delete process.env[NOTIFY_URL];
});
async function hook(): Promise<Hook> {
  const one = await new Hook().start();
  hooks.push(one);
  return one;
}

const settings = (url: string, more: Partial<RigNotify> = {}): RigNotify => ({
  ...{ url, from: 'warn', body: undefined, contentType: 'application/json', mostPerMin: 60 },
  ...more,
});
const alarm = (name: AlarmView['alarm'], level: AlarmView['level'] = 'warn'): AlarmView => ({
  ...{ alarm: name, level, text: `${name} it is`, remedy: 'Look.', sinceUs: 1, seenBy: null },
});

function watching(url: string, more: Partial<RigNotify> = {}, times = QUICK) {
  const notices = new Notices(settings(url, more), log, times, 30);
  closing.push(notices);
  const animal = new ScriptedAnimal();
  animal.begin('induction.yaml', 'M12');
  animal.advance(40);
  const show = (...alarms: AlarmView[]) => notices.see({ ...animal.state, alarms }, animal.setup);
  return { notices, show };
}
const told = (one: Hook, n = one.bodies.length - 1) => JSON.parse(one.bodies[n]!);

describe('notices of alarms over HTTP', () => {
  test('an alarm is told once when it is raised and once when it is over, with where the rig was', async () => {
    const there = await hook();
    const { show } = watching(there.url);
    for (let n = 0; n < 20; n++) show(alarm('still'));
    await until(() => there.bodies.length === 1);
    expect(there.types[0]).toBe('application/json');
    expect(told(there)).toMatchObject({
      ...{ rig: 'bench belt', subject: 'M12', phase: 'baseline' },
      alarms: [
        { alarm: 'still', level: 'warn', state: 'raised', text: 'still it is', remedy: 'Look.' },
      ],
    });
    expect(told(there).lap).toBeGreaterThan(1);
    show();
    await until(() => there.bodies.length === 2);
    expect(told(there).alarms).toMatchObject([{ alarm: 'still', state: 'cleared' }]);
  });

  test('what comes together goes together, the gravest first; what is below the level is not told', async () => {
    const there = await hook();
    const { show } = watching(there.url);
    show(alarm('end', 'note'), alarm('trust'), alarm('link', 'bad'));
    await until(() => there.bodies.length === 1);
    expect(told(there).alarms.map((one: Notice) => one.alarm)).toEqual(['link', 'trust']);
  });

  test('a storm of alarms is no storm of requests: at most so many in a window, none lost', async () => {
    const there = await hook();
    const { show } = watching(there.url, { mostPerMin: 3 });
    const names = [
      'trust',
      'seam',
      'drops',
      'still',
      'no lick',
      'lick fast',
      'disk',
      'host',
    ] as const;
    const started = performance.now();
    for (let n = 1; n <= names.length; n++) {
      show(...names.slice(0, n).map((name) => alarm(name)));
      await new Promise((resolve) => setTimeout(resolve, 45));
    }
    await until(() => there.bodies.flatMap((body) => JSON.parse(body).alarms).length >= 8);
    // However slow the machine: three in each window that has begun.
    const windows = Math.ceil((performance.now() - started) / QUICK.windowMs);
    expect(there.bodies.length).toBeLessThanOrEqual(3 * windows + 1);
    const all = there.bodies.flatMap((body) => JSON.parse(body).alarms.map((a: Notice) => a.alarm));
    expect([...new Set(all)].sort()).toEqual([...names].sort());
  });

  test('is tried again with growing pauses while the service fails, hangs or is away, and then told as it stands', async () => {
    const there = await hook();
    const { show } = watching(there.url);
    const seen: number[] = [];
    there.answer = (response) => {
      seen.push(performance.now());
      if (seen.length === 1) response.writeHead(500).end();
      else if (seen.length === 2) response.socket!.destroy();
      // The third is never answered.
      else if (seen.length > 3) response.end();
    };
    show(alarm('trust'));
    await until(() => seen.length === 3);
    show(alarm('trust'), alarm('link', 'bad'));
    await until(() => seen.length === 4);
    expect(told(there).alarms.map((one: Notice) => one.alarm)).toEqual(['link', 'trust']);
    // Not before the third had been given up.
    expect(seen[3]! - seen[2]!).toBeGreaterThanOrEqual(QUICK.timeoutMs);
    show(alarm('trust'), alarm('link', 'bad'), alarm('drops'));
    await until(() => seen.length === 5);
    expect(told(there).alarms).toHaveLength(1);
  });

  test('an address that says it was asked wrongly is not asked the same again', async () => {
    const there = await hook();
    there.answer = (response) => void response.writeHead(404).end();
    const { show } = watching(there.url);
    show(alarm('trust'));
    await until(() => there.bodies.length === 1);
    await new Promise((resolve) => setTimeout(resolve, 300));
    expect(there.bodies).toHaveLength(1);
    show(alarm('trust'), alarm('seam'));
    await until(() => there.bodies.length === 2);
    expect(told(there).alarms).toMatchObject([{ alarm: 'seam' }]);
  });

  test('follows no redirect, and closing leaves nothing behind', async () => {
    const there = await hook();
    const away = await hook();
    there.answer = (response) => void response.writeHead(302, { location: away.url }).end();
    const sender = new Sender(
      { url: there.url, contentType: 'text/plain', most: 60, body: () => 'x' },
      log,
      QUICK,
    );
    sender.add({ alarm: 'a', level: 'bad', state: 'raised', text: 't', remedy: 'r', at: 'now' });
    await until(() => there.bodies.length >= 2);
    sender.close();
    const count = there.bodies.length;
    await new Promise((resolve) => setTimeout(resolve, 300));
    expect(there.bodies.length).toBeLessThanOrEqual(count + 1);
    expect(away.bodies).toEqual([]);
  });

  test('a loop that stays away is told by the web process itself, and so is its coming back', async () => {
    const there = await hook();
    const { notices, show } = watching(there.url);
    show();
    notices.loopAway('it was killed', 'Look at the terminal.');
    await until(() => there.bodies.length === 1);
    expect(told(there).alarms).toMatchObject([{ alarm: 'loop', level: 'bad', state: 'raised' }]);
    show();
    await until(() => there.bodies.length === 2);
    expect(told(there).alarms).toMatchObject([{ alarm: 'loop', state: 'cleared' }]);
  });

  test('one that comes back soon is not told at all', async () => {
    const there = await hook();
    const notices = new Notices(settings(there.url), log, QUICK, 10_000);
    closing.push(notices);
    notices.loopAway('x', 'y');
    const animal = new ScriptedAnimal();
    notices.see({ ...animal.state, alarms: [alarm('still')] }, animal.setup);
    await until(() => there.bodies.length === 1);
    expect(told(there).alarms.map((one: Notice) => one.alarm)).toEqual(['still']);
  });

  test('an address in the environment goes before the one in the rig file', () => {
    const { rig } = parseRig('rig.yaml', `${demo}notify:\n  url: http://named\n  from: bad\n`);
    expect(notifyOf(rig!)).toMatchObject({ url: 'http://named', from: 'bad' });
    process.env[NOTIFY_URL] = 'http://secret';
    expect(notifyOf(rig!)).toMatchObject({ url: 'http://secret', from: 'bad' });
    expect(notifyOf({ ...rig!, notify: undefined })).toMatchObject({
      url: 'http://secret',
      from: 'warn',
    });
  });

  test('the web process sends what its loop tells, and pages do not wait for it', async () => {
    const there = await hook();
    // It never answers.
    there.answer = () => {};
    const { loop, app } = await startWeb({ notify: settings(there.url) });
    loop.animal.begin('induction.yaml', 'M12');
    loop.animal.state.alarms = [alarm('link', 'bad')];
    loop.run(1);
    await until(() => there.bodies.length === 1);
    expect((await app.inject('/api/state')).json().alarms).toMatchObject([{ alarm: 'link' }]);
  });
});

describe('the body', () => {
  const notice = (more: Partial<Notice> = {}): Notice => ({
    ...{ alarm: 'trust', level: 'warn', state: 'raised', text: 'Position is "doubtful"' },
    ...{ remedy: 'Look at\nthe belt.', at: '2026-12-01T09:30:00Z' },
    ...more,
  });
  const scene = { rig: 'rig "1"', subject: 'M12', title: 'A day', lap: 31, phase: 'probe' };
  const json = 'application/json';

  test('is filled in, and stays JSON whatever is in the words', () => {
    const body =
      '{"text": "{rig}, lap {lap}: {text} {remedy}", "n": {count}, "x": {"y": "{level}"}}';
    expect(JSON.parse(bodyOf([notice()], scene, { body, contentType: json }))).toEqual({
      ...{ text: 'rig "1", lap 31: Position is "doubtful" Look at\nthe belt.', n: 1 },
      x: { y: 'warn' },
    });
  });

  test('tells several as one, what is over as such', () => {
    const body = '{state} {level} {alarm}: {text}';
    const over = notice({ alarm: 'link', level: 'bad', state: 'cleared', text: 'No board' });
    expect(bodyOf([notice(), over], scene, { body, contentType: 'text/plain' })).toBe(
      'raised bad link; trust: Over: No board; Position is "doubtful"',
    );
  });

  test('braces around anything else are left as they are', () => {
    const body = '{"a":{}, "b":"{Rig}{rig }"}';
    expect(bodyOf([notice()], scene, { body, contentType: json })).toBe(body);
  });
});

describe('`notify` in a rig file', () => {
  const read = (lines: string) => parseRig('rig.yaml', `${demo}notify:\n${lines}`);
  test('is read, with what is not said filled in', () => {
    const { rig } = read('  url: https://example.net/hook\n  body: \'{"text": "{text}"}\'\n');
    expect(rig!.notify).toEqual({
      ...{ url: 'https://example.net/hook', from: 'warn', body: '{"text": "{text}"}' },
      ...{ contentType: 'application/json', mostPerMin: 6 },
    });
    expect(parseRig('rig.yaml', demo).rig!.notify).toBeUndefined();
  });

  test.each([
    ['  url: ftp://example.net\n', /an address that begins with http/],
    ['  url: http://x\n  body: "{txt}"\n', /no name `{txt}`: expected one of rig, subject/],
    ['  url: http://x\n  most_per_min: "100"\n', /most requests in a minute, 1 to 60/],
    ['  url: http://x\n  from: loud\n', /expected note or warn or bad/],
  ])('%j is refused', (lines, why) => {
    expect(
      read(lines)
        .problems.map(({ message }) => message)
        .join(),
    ).toMatch(why);
  });

  test('the times of a real one are those of people, not of tests', () => {
    expect(SENDER_TIMES).toMatchObject({ timeoutMs: 5_000, mostRetryMs: 60_000, windowMs: 60_000 });
  });
});
