import { join } from 'node:path';
import type { FastifyInstance } from 'fastify';
import { afterEach } from 'vitest';
import WebSocket from 'ws';
import { packageRoot } from '../../server/packageRoot.js';
import { readRig } from '../../server/session/rig/readRig.js';
import { buildWeb, type WebOptions } from '../../server/web/buildWeb.js';
import type { StreamMessage } from '../../server/web/streamMessages.js';
import { FakeLoop } from '../tools/fakeLoop.js';

export interface WebRig {
  readonly loop: FakeLoop;
  readonly app: FastifyInstance;
  readonly url: string;
}

const running: WebRig[] = [];

afterEach(async () => {
  for (const { app, loop } of running.splice(0)) {
    await app.close();
    await loop.stop();
  }
});

/** A fake loop and a web process connected to it, both ended after the test. */
export async function startWeb(
  options: Partial<WebOptions> & { readonly host?: string } = {},
): Promise<WebRig> {
  const { host = '127.0.0.1', ...web } = options;
  const loop = await new FakeLoop().start();
  const { socketPath, tokenFile } = loop;
  const rig = readRig(join(packageRoot, 'hardware-sim/demo/rig.yaml'));
  const app = buildWeb({ socketPath, tokenFile, rig, log: false, requestsPerS: 1000, ...web });
  const at = await app.listen({ host, port: 0 });
  const url = web.tls ? at.replace(/^http:/, 'https:') : at;
  const rigged = { loop, app, url };
  running.push(rigged);
  // Once the loop's setup is there; who is not signed in is told that much and no more.
  await until(async () => [200, 401].includes((await app.inject('/api/setup')).statusCode));
  await until(async () => (await app.inject('/healthz')).json().loop === 'up');
  return rigged;
}

/** Waits for something to become true, however slow the machine; fails after 20 s unless said. */
export async function until(
  holds: () => boolean | Promise<boolean>,
  mostMs = 20_000,
): Promise<void> {
  const giveUpMs = performance.now() + mostMs;
  while (!(await holds())) {
    if (performance.now() > giveUpMs) throw new Error(`never came true: ${holds}`);
    await new Promise((resolve) => setTimeout(resolve, 10));
  }
}

/** A page as the stream sees it: keeps all that it was told. */
export class Viewer {
  readonly told: StreamMessage[] = [];
  readonly socket: WebSocket;
  closed = false;

  constructor(url: string, query = '', options: WebSocket.ClientOptions = {}) {
    this.socket = new WebSocket(`${url.replace('http', 'ws')}/api/stream${query}`, options);
    this.socket.on('message', (data) => this.told.push(JSON.parse(String(data))));
    this.socket.on('close', () => {
      this.closed = true;
    });
    this.socket.on('error', () => undefined);
  }

  all<T extends StreamMessage['tell']>(tell: T): Extract<StreamMessage, { tell: T }>[] {
    return this.told.filter((one): one is Extract<StreamMessage, { tell: T }> => one.tell === tell);
  }

  get eventNumbers(): number[] {
    return this.all('events').flatMap((message) => message.events.map((one) => one.number));
  }
}
