import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import WebSocket from 'ws';
import { Mirror } from '../../server/web/mirror.js';
import type { StreamMessage } from '../../server/web/streamMessages.js';
import { ScriptedAnimal } from '../tools/scriptedAnimal.js';
import { startWeb, until, Viewer } from './webRig.js';

describe('the stream', () => {
  test('greets a page with version, loop, setup and state, in that order', async () => {
    const { url, loop } = await startWeb();
    loop.show();
    const viewer = new Viewer(url);
    await until(() => viewer.all('state').length > 0);
    expect(viewer.told.map((one) => one.tell)).toEqual(['welcome', 'loop', 'setup', 'state']);
    expect(viewer.told[0]).toMatchObject({ version: 1 });
  });

  test('tells every event once and in order, to one that joins late as well', async () => {
    const { url, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    const early = new Viewer(url);
    for (let n = 0; n < 60; n++) {
      loop.advance(2);
      if (n % 10 === 0) await new Promise((resolve) => setTimeout(resolve, 5));
    }
    const all = loop.animal.events.map((one) => one.number);
    expect(all.length).toBeGreaterThan(100);
    await until(() => early.eventNumbers.length >= all.length);
    expect(early.eventNumbers).toEqual(all);
    const late = new Viewer(url);
    await until(() => late.eventNumbers.length >= all.length);
    expect(late.eventNumbers).toEqual(all);
  });

  test('tells a page that comes back only what it lacks', async () => {
    const { url, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    loop.advance(60);
    const first = new Viewer(url);
    await until(() => first.eventNumbers.length === loop.animal.events.length);
    const last = first.eventNumbers.at(-1)!;
    first.socket.close();
    loop.advance(20);
    const expected = loop.animal.events.map((one) => one.number).filter((number) => number > last);
    const back = new Viewer(url, `?after=${last}`);
    await until(() => back.eventNumbers.length >= expected.length);
    expect(back.eventNumbers).toEqual(expected);
  });

  test('states are the latest only: many at once become few, and the last always arrives', async () => {
    const { url, loop } = await startWeb();
    const viewer = new Viewer(url);
    await until(() => viewer.all('state').length > 0);
    const before = viewer.all('state').length;
    for (let lap = 1; lap <= 400; lap++) {
      loop.animal.state.lap = lap;
      loop.show();
    }
    await until(() => viewer.all('state').at(-1)!.state.lap === 400);
    expect(viewer.all('state').length - before).toBeLessThan(200);
  });

  test('says when the loop goes away and when it is back, and then goes on', async () => {
    const { url, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    loop.advance(30);
    const viewer = new Viewer(url);
    await until(() => viewer.eventNumbers.length === loop.animal.events.length);
    const told = viewer.eventNumbers.length;
    await loop.goAway();
    await until(() => viewer.all('loop').at(-1)!.state === 'away');
    expect(viewer.all('loop').at(-1)!.remedy).toContain('250 ms');
    loop.animal.advance(10);
    await loop.start();
    await until(() => viewer.all('loop').at(-1)!.state === 'up');
    // A loop may have been restarted: all that it has is told again, under another life.
    const again = told + loop.animal.events.length;
    await until(() => viewer.eventNumbers.length >= again);
    expect(viewer.eventNumbers.slice(told)).toEqual(loop.animal.events.map((one) => one.number));
    const lives = viewer.all('loop').map((one) => one.life);
    expect(lives[1]).toBe(lives[0]);
    expect(lives[2]).not.toBe(lives[0]);
  });

  test('a page with events of another life is told everything', async () => {
    const { url, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    loop.advance(30);
    const stranger = new Viewer(url, '?after=5&life=another');
    const all = loop.animal.events.map((one) => one.number);
    await until(() => stranger.eventNumbers.length >= all.length);
    expect(stranger.eventNumbers).toEqual(all);
    const { life } = stranger.all('loop')[0]!;
    const back = new Viewer(url, `?after=5&life=${life}`);
    await until(() => back.eventNumbers.length >= all.length - 5);
    expect(back.eventNumbers).toEqual(all.filter((number) => number > 5));
  });

  test('a loop that begins anew, with numbers from 1, is told from its beginning', async () => {
    const { url, loop } = await startWeb();
    loop.animal.begin('induction.yaml', 'M12');
    loop.advance(60);
    const viewer = new Viewer(url);
    await until(() => viewer.eventNumbers.length === loop.animal.events.length);
    const told = viewer.eventNumbers.length;
    await loop.goAway();
    loop.animal = new ScriptedAnimal();
    loop.animal.begin('induction.yaml', 'M13');
    // Longer than before, so that its numbers run past the ones that were told.
    loop.animal.advance(90);
    await loop.start();
    await until(() => viewer.eventNumbers.length === told + loop.animal.events.length);
    expect(viewer.eventNumbers.slice(told)).toEqual(loop.animal.events.map((one) => one.number));
  });

  test('a page can stop everything over the stream, and is told whether it worked', async () => {
    const { url, loop } = await startWeb({ loopTimeoutMs: 100 });
    const viewer = new Viewer(url);
    await until(() => viewer.told.length > 0);
    viewer.socket.send('{"ask":"quiet"}');
    await until(() => viewer.all('quiet').length === 1);
    expect(viewer.all('quiet')[0]!.done).toBe(true);
    loop.silent = true;
    viewer.socket.send('{"ask":"quiet"}');
    await until(() => viewer.all('quiet').length === 2);
    expect(viewer.all('quiet')[1]!.done).toBe(false);
  });
});

describe('pages that misbehave', () => {
  test('one that does not read is dropped; the others get everything', async () => {
    const limits = { softBytes: 64 << 10, hardBytes: 1 << 20, stallMs: 200, stateMs: 1 };
    const { app, url, loop } = await startWeb({ limits, keepEvents: 100_000 });
    const good = new Viewer(url);
    const frozen = new Viewer(url);
    await until(() => frozen.told.length > 0 && good.told.length > 0);
    frozen.socket.pause();
    loop.animal.begin('induction.yaml', 'M12');
    // More than the kernel's buffers of one connection hold, so that the rest waits in the process.
    const long = 'x'.repeat(40_000);
    await until(async () => {
      for (let n = 0; n < 10; n++) loop.animal.tell({ kind: 'note', text: long });
      loop.show();
      return (await app.inject('/healthz')).json().dropped === 1;
    });
    frozen.socket.resume();
    await until(() => frozen.closed);
    expect(good.closed).toBe(false);
    const last = loop.animal.events.at(-1)!.number;
    await until(() => good.eventNumbers.at(-1) === last);
    expect(good.eventNumbers).toHaveLength(last);
  });

  test('one that sends rubbish, or too much, is ignored or ended; the others are untouched', async () => {
    const { url, loop } = await startWeb();
    const good = new Viewer(url);
    const rubbish = new Viewer(url);
    const flood = new Viewer(url);
    const huge = new Viewer(url);
    await until(() => [good, rubbish, flood, huge].every((one) => one.told.length > 0));
    for (const text of ['', '{', 'null', '[]', '{"ask":"begin"}', '{"ask":{"quiet":1}}']) {
      rubbish.socket.send(text);
    }
    rubbish.socket.send(Buffer.from([0xff, 0x00]));
    for (let n = 0; n < 1100; n++) flood.socket.send('{}');
    huge.socket.send('x'.repeat(5000));
    await until(() => flood.closed && huge.closed);
    loop.animal.state.lap = 5;
    loop.show();
    await until(() => good.all('state').at(-1)!.state.lap === 5);
    await until(() => rubbish.all('state').at(-1)!.state.lap === 5);
    expect(loop.heard.every((one) => one.say === 'hello' || one.say === 'watch')).toBe(true);
  });

  test('pages from other sites, for other hosts, at other paths and beyond the limit are refused', async () => {
    const { app, url } = await startWeb({ limits: { mostClients: 2 } });
    const status = (query: string, options: WebSocket.ClientOptions, path = '/api/stream') =>
      new Promise<number>((resolve) => {
        const socket = new WebSocket(`${url.replace('http', 'ws')}${path}${query}`, options);
        socket.on('error', () => undefined);
        socket.on('open', () => resolve(101));
        socket.on('unexpected-response', (_request, response) => {
          resolve(response.statusCode ?? 0);
          response.resume();
        });
      });
    expect(await status('', { origin: 'http://evil.example' })).toBe(403);
    expect(await status('', { origin: 'null' })).toBe(403);
    expect(await status('', { headers: { host: 'evil.example' } })).toBe(421);
    expect(await status('', { headers: { 'sec-fetch-site': 'cross-site' } })).toBe(403);
    expect(await status('', {}, '/api/other')).toBe(404);
    expect((await app.inject('/healthz')).json().clients).toBe(0);
    expect(await status('', { origin: url })).toBe(101);
    expect(await status('?after=nonsense', {})).toBe(101);
    expect(await status('', {})).toBe(503);
  });

  test('closing the service does not wait for pages that stay', async () => {
    const { app, url } = await startWeb();
    const viewer = new Viewer(url);
    const frozen = new Viewer(url);
    await until(() => viewer.told.length > 0 && frozen.told.length > 0);
    frozen.socket.pause();
    await app.close();
    await until(() => viewer.closed);
  });
});

describe('the mirror of events', () => {
  test('brings any client from anywhere to the end, each event once, gaps told', () => {
    const note = { kind: 'note', text: 'n', input: 0, boardUs: 0, lap: 0 } as const;
    const event = { ...note, positionCm: null, speedCmPerS: 0 };
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 60 }),
        fc.array(fc.integer({ min: 1, max: 4 }), { maxLength: 120 }),
        fc.nat({ max: 300 }),
        fc.integer({ min: 1, max: 30 }),
        (keep, steps, startAfter, most) => {
          const mirror = new Mirror(keep);
          let number = 0;
          const numbers = steps.map((step) => {
            number += step;
            return number;
          });
          for (const one of numbers) mirror.takeEvents([{ number: one, event }]);
          let after = startAfter;
          const got: number[] = [];
          for (let round = 0; round <= numbers.length; round++) {
            const { messages, upTo } = mirror.eventsAfter(after, most);
            for (const text of messages) {
              const message = JSON.parse(String(text)) as StreamMessage;
              if (message.tell === 'events') got.push(...message.events.map((one) => one.number));
              if (message.tell === 'gap') expect(message.from).toBe(after + 1);
            }
            after = upTo;
          }
          const from = startAfter > number ? 0 : startAfter;
          expect(got).toEqual(numbers.slice(-keep).filter((one) => one > from));
          expect(mirror.eventsAfter(after, most).messages).toEqual([]);
        },
      ),
      { seed: 6, numRuns: 300 },
    );
  });
});
