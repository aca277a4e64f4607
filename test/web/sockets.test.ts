import { connect, type Socket } from 'node:net';
import { networkInterfaces } from 'node:os';
import { afterEach, describe, expect, test } from 'vitest';
import { startGuarded } from './access/signedIn.js';
import { startWeb, until, Viewer } from './webRig.js';

const sockets: Socket[] = [];
afterEach(() => {
  for (const socket of sockets.splice(0)) socket.destroy();
});

interface Raw {
  readonly socket: Socket;
  said: string;
  closed: boolean;
}

/** A bare connection, for what no client library would send. */
function open(url: string, first = '', host?: string): Raw {
  const { hostname, port } = new URL(url);
  const socket = connect(Number(port), host ?? hostname);
  const raw: Raw = { socket, said: '', closed: false };
  sockets.push(socket);
  socket.on('data', (bytes) => {
    raw.said += bytes.toString('latin1');
  });
  socket.on('error', () => undefined);
  socket.on('close', () => {
    raw.closed = true;
  });
  if (first !== '') socket.write(first);
  return raw;
}

const HURRY = { headersMs: 300, requestMs: 600, keepAliveMs: 200 };
const HEAD = 'POST /api/quiet HTTP/1.1\r\nhost: 127.0.0.1\r\ncontent-type: application/json\r\n';

describe('a socket that wastes time', () => {
  test('is closed: silent, half a head, a body that never comes, idle after its answer', async () => {
    const { url, app } = await startWeb({ sockets: HURRY });
    const silent = open(url);
    const halfHead = open(url, 'GET /healthz HTTP/1.1\r\nhost:');
    const noBody = open(url, `${HEAD}content-length: 2\r\n\r\n{`);
    const idle = open(url, 'GET /healthz HTTP/1.1\r\nhost: 127.0.0.1\r\n\r\n');
    await until(() => [silent, halfHead, noBody, idle].every((one) => one.closed));
    expect(halfHead.said).toContain(' 408 ');
    expect(noBody.said).toContain(' 408 ');
    expect(idle.said).toContain(' 200 ');
    expect((await app.inject('/healthz')).statusCode).toBe(200);
  });

  test('does not take the stream from pages that only listen', async () => {
    const { url, loop } = await startWeb({ sockets: { ...HURRY, idleMs: 300 } });
    const page = new Viewer(url);
    await until(() => page.told.length > 0);
    const slow = open(url);
    await until(() => slow.closed);
    // By now the page has been still for longer than any of these.
    expect(page.closed).toBe(false);
    loop.animal.state.lap = 9;
    loop.show();
    await until(() => page.all('state').at(-1)!.state.lap === 9);
  });
});

describe('a socket that talks nonsense', () => {
  const nonsense: [string, string][] = [
    ['no HTTP at all', '\x16\x03\x01\x02\x00\x01\x00\x01\xfc\x03\x03'],
    ['no host', 'GET /healthz HTTP/1.1\r\n\r\n'],
    ['two hosts', 'GET /healthz HTTP/1.1\r\nhost: 127.0.0.1\r\nhost: evil.example\r\n\r\n'],
    [
      'a head of 100 kB',
      `GET /healthz HTTP/1.1\r\nhost: 127.0.0.1\r\nx: ${'x'.repeat(100_000)}\r\n\r\n`,
    ],
    // Request smuggling: two lengths (RFC 9112, 6.3).
    ['two lengths', `${HEAD}content-length: 2\r\ntransfer-encoding: chunked\r\n\r\n0\r\n\r\n`],
    ['a path with a line break', 'GET /a\nb HTTP/1.1\r\nhost: 127.0.0.1\r\n\r\n'],
    [
      'an upgrade to something else',
      'GET /api/stream HTTP/1.1\r\nhost: 127.0.0.1\r\nconnection: upgrade\r\nupgrade: h2c\r\n\r\n',
    ],
    [
      'a websocket of an unknown version',
      'GET /api/stream HTTP/1.1\r\nhost: 127.0.0.1\r\nconnection: upgrade\r\nupgrade: websocket\r\nsec-websocket-version: 99\r\nsec-websocket-key: AAAAAAAAAAAAAAAAAAAAAA==\r\n\r\n',
    ],
  ];
  test.each(nonsense)(
    '%s is answered with a refusal, and costs the others nothing',
    async (_what, text) => {
      const { url, loop, app } = await startWeb();
      const page = new Viewer(url);
      await until(() => page.told.length > 0);
      const raw = open(url, text);
      await until(() => raw.closed || raw.said !== '');
      expect(raw.said).toMatch(/^(HTTP\/1\.1 4\d\d |$)/);
      expect(loop.heard.some((one) => one.say === 'quiet')).toBe(false);
      expect((await app.inject('/healthz')).statusCode).toBe(200);
      loop.animal.state.lap = 3;
      loop.show();
      await until(() => page.all('state').at(-1)!.state.lap === 3);
    },
  );
});

describe('too many sockets', () => {
  const mine = Object.values(networkInterfaces())
    .flatMap((all) => all ?? [])
    .find(({ internal, family }) => !internal && family === 'IPv4')?.address;

  test('of one caller on the network are closed at once, and those of this machine are not', async () => {
    expect(mine, 'this test wants a network address of this machine').toBeDefined();
    const { app, url } = await startGuarded({ sockets: { mostOfOne: 5 }, host: '0.0.0.0' });
    const { port } = new URL(url);
    const at = `http://${mine}:${port}`;
    const many = Array.from({ length: 12 }, () => open(at));
    await until(() => many.filter((one) => one.closed).length === 7);
    // Room comes back when one goes.
    many.find((one) => !one.closed)!.socket.destroy();
    const health = `GET /healthz HTTP/1.1\r\nhost: ${mine}\r\n\r\n`;
    let found = open(at, health);
    await until(() => {
      if (found.closed) found = open(at, health);
      return found.said.includes(' 200 ');
    });
    const local = Array.from({ length: 12 }, () => open(`http://127.0.0.1:${port}`));
    expect((await fetch(`http://127.0.0.1:${port}/healthz`)).status).toBe(200);
    expect(local.some((one) => one.closed)).toBe(false);
    // Its own bare address is a name of the service; that of a neighbour is not.
    const neighbour = { host: '10.255.255.1' };
    expect((await app.inject({ url: '/healthz', headers: neighbour })).statusCode).toBe(421);
  });
});
