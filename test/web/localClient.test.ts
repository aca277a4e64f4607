import { createServer } from 'node:net';
import { join } from 'node:path';
import fc from 'fast-check';
import { afterEach, describe, expect, test } from 'vitest';
import { LapwingError } from '../../server/errors/codes.js';
import { LineReader } from '../../server/loop/lines.js';
import { LocalClient, LoopRefusal, quietOnce } from '../../server/loop/localClient.js';
import { FakeLoop } from '../tools/fakeLoop.js';
import { until } from './webRig.js';

const ending: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end();
});

async function startLoop(): Promise<FakeLoop> {
  const loop = await new FakeLoop().start();
  ending.push(() => loop.stop());
  return loop;
}

function startClient(options: ConstructorParameters<typeof LocalClient>[0]): LocalClient {
  const client = new LocalClient(options);
  ending.push(() => client.close());
  client.start();
  return client;
}

describe('the local client', () => {
  test('greets with the token file and learns of the loop', async () => {
    const loop = await startLoop();
    const { socketPath, tokenFile } = loop;
    const client = startClient({ socketPath, tokenFile, client: 'test' });
    expect(await client.ready()).toMatchObject({ tell: 'hello', rig: 'bench belt' });
    expect(loop.heard[0]).toEqual({ say: 'hello', token: loop.token, client: 'test' });
  });

  test('resolves what is done and rejects what is refused, each to its own request', async () => {
    const loop = await startLoop();
    const client = startClient({ ...loop, client: 'test' });
    await client.ready();
    await Promise.all([client.quiet(), client.begin({ rules: 'a', subject: 'b' })]);
    loop.refusal = { code: 'X_NO', message: 'no', remedy: 'try later' };
    const refused = client.end('enough');
    await expect(refused).rejects.toBeInstanceOf(LoopRefusal);
    await expect(refused).rejects.toMatchObject({ code: 'X_NO', remedy: 'try later' });
  });

  test('a request without a connection fails at once and is never sent later', async () => {
    const loop = await startLoop();
    await loop.goAway();
    const client = startClient({ ...loop, client: 'test', firstBackoffMs: 10 });
    await expect(client.quiet()).rejects.toMatchObject({ code: 'LOOP_AWAY' });
    await loop.start();
    await client.ready();
    await client.end('a later one');
    expect(loop.heard.map((one) => one.say)).toEqual(['hello', 'end']);
  });

  test('comes back after every loss and asks for the events that it lacks', async () => {
    const loop = await startLoop();
    const numbers: number[] = [];
    let downs = 0;
    const client = startClient({
      ...loop,
      client: 'test',
      firstBackoffMs: 10,
      callbacks: {
        down: () => downs++,
        events: (events) => numbers.push(...events.map((one) => one.number)),
      },
    });
    client.watch(20);
    await client.ready();
    loop.animal.begin('induction.yaml', 'M12');
    for (let round = 1; round <= 3; round++) {
      loop.advance(20);
      await until(() => numbers.length === loop.animal.events.length);
      await loop.goAway();
      await until(() => downs === round);
      loop.animal.advance(5);
      await loop.start();
      await client.ready();
    }
    await until(() => numbers.length === loop.animal.events.length);
    expect(numbers).toEqual(loop.animal.events.map((one) => one.number));
  });

  test('a wrong token, a silent loop, no loop and garbage are each named', async () => {
    const loop = await startLoop();
    const { socketPath } = loop;
    const once = { client: 'test', reconnect: false, requestTimeoutMs: 100 };
    const wrong = startClient({ socketPath, token: 'wrong', ...once });
    await expect(wrong.ready()).rejects.toMatchObject({ code: 'LOOP_TOKEN_REFUSED' });
    loop.silent = true;
    const silent = startClient({ ...loop, ...once });
    await silent.ready();
    await expect(silent.quiet()).rejects.toMatchObject({ code: 'LOOP_SILENT' });
    const nobody = startClient({ socketPath: socketPath + 'x', token: '', ...once });
    await expect(nobody.ready()).rejects.toMatchObject({ code: 'LOOP_AWAY' });
    const noToken = startClient({ socketPath, tokenFile: '/nowhere/token', ...once });
    await expect(noToken.ready()).rejects.toMatchObject({ code: 'LOOP_AWAY' });

    for (const said of ['HTTP/1.1 400 Bad Request\r\n', 'x'.repeat(2000)]) {
      const path = join(loop.folder, `g${said.length}`);
      const server = createServer((socket) => {
        socket.on('error', () => undefined);
        socket.resume();
        socket.end(said);
      });
      await new Promise<void>((resolve) => server.listen(path, resolve));
      ending.push(() => new Promise((resolve) => server.close(resolve)));
      const garbled = startClient({ socketPath: path, token: '', ...once, capBytes: 1000 });
      await expect(garbled.ready()).rejects.toMatchObject({ code: 'LOOP_GARBLED' });
    }
  });

  test('one quiet over a connection of its own', async () => {
    const loop = await startLoop();
    await quietOnce(loop);
    expect(loop.heard.map((one) => one.say)).toEqual(['hello', 'quiet']);
    expect(loop.animal.state.held.stimulus).not.toBeNull();
  });

  test('close rejects what is pending and tries no more', async () => {
    const loop = await startLoop();
    const client = startClient({ ...loop, client: 'test' });
    await client.ready();
    loop.silent = true;
    const pending = client.quiet();
    client.close();
    await expect(pending).rejects.toMatchObject({ code: 'LOOP_AWAY' });
    await expect(client.ready()).rejects.toBeInstanceOf(LapwingError);
    await until(() => loop.connections === 0);
  });
});

describe('lines', () => {
  test('whatever the pieces, the lines are the same', () => {
    const text = fc
      .string({ unit: 'grapheme', maxLength: 30 })
      .map((one) => one.replaceAll('\n', ''));
    fc.assert(
      fc.property(fc.array(text), fc.array(fc.nat({ max: 20 })), (lines, cuts) => {
        const bytes = Buffer.from(lines.map((line) => line + '\n').join(''));
        const got: string[] = [];
        const reader = new LineReader(1000, (line) => got.push(line));
        let at = 0;
        for (const cut of cuts) {
          reader.push(bytes.subarray(at, at + cut));
          at += cut;
        }
        reader.push(bytes.subarray(at));
        expect(got).toEqual(lines.map((line) => line.trim()).filter((line) => line !== ''));
      }),
      { seed: 5, numRuns: 200 },
    );
  });

  test('a line over the cap throws, in one piece or in many, and one at the cap does not', () => {
    const reader = new LineReader(10, () => undefined);
    reader.push(Buffer.from('0123456789\n'));
    expect(() => reader.push(Buffer.from('01234567890\n'))).toThrow(LapwingError);
    const slow = new LineReader(10, () => undefined);
    for (let n = 0; n < 10; n++) slow.push(Buffer.from('x'));
    expect(() => slow.push(Buffer.from('x'))).toThrow(LapwingError);
  });
});
