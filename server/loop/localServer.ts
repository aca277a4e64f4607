import { timingSafeEqual } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { createServer, type Server, type Socket } from 'node:net';
import { asKnown } from '../errors/asKnown.js';
import { LapwingError } from '../errors/codes.js';
import type { EventRing } from './eventRing.js';
import { LineReader } from './lines.js';
import {
  type AskedBy,
  type BenchItem,
  type BenchNow,
  type ClientMessage,
  LOCAL_PROTOCOL,
  type LoopMessage,
  type Setup,
  type Snapshot,
  type Tried,
} from './protocol.js';
import { leaveRig, type RigAddress, takeRig } from './rigLock.js';

/** What clients may ask of the loop; each throws a LapwingError to say no. */
export interface LoopService {
  readonly version: string;
  readonly rig: string;
  readonly events: EventRing;
  setup(): Setup;
  snapshot(): Snapshot;
  quiet(by: AskedBy): void;
  end(reason: string, by: AskedBy): void;
  begin(message: Extract<ClientMessage, { say: 'begin' }>): Promise<void>;
  act(message: Extract<ClientMessage, { say: 'act' }>): void;
  readonly bench: {
    readonly items: EventRing<BenchItem>;
    readonly now: BenchNow;
    /** Whether anybody watches it, and whether frames are to be timed. */
    watch(watched: boolean, timed: boolean): void;
  };
  tryOutput(message: Extract<ClientMessage, { say: 'try' }>): Promise<Tried>;
  reload(): void;
}

const MOST_CLIENTS = 40;
const LONGEST_LINE_BYTES = 64 * 1024;
/** Beyond this much unsent a client gets no state, and beyond the second it is dropped. */
const SLOW_BYTES = 256 * 1024;
const LOST_BYTES = 8 * 1024 * 1024;
const STATE_MS = 20;
const STALE_MS = 2_500;
const EVENTS_AT_ONCE = 200;
const ITEMS_AT_ONCE = 1_000;

/**
 * The loop's only door: local clients over a Unix socket. Nothing here runs on the frame path; state
 * is made at most 50 times a second, and only while somebody watches.
 */
export class LocalServer {
  readonly #server: Server;
  readonly #clients = new Set<Client>();
  readonly #service: LoopService;
  readonly #address: RigAddress;
  #timer: NodeJS.Timeout | undefined;
  #token = '';

  constructor(service: LoopService, address: RigAddress) {
    this.#service = service;
    this.#address = address;
    this.#server = createServer((socket) => this.#accept(socket));
  }

  /** @throws LapwingError LOOP_RIG_TAKEN */
  async open(): Promise<void> {
    await takeRig(this.#server, this.#address);
    this.#token = readFileSync(this.#address.tokenFile, 'utf8');
  }

  /** Tells every client about a new session, or the end of one. */
  announceSetup(): void {
    const line = lineOf({ tell: 'setup', setup: this.#service.setup() });
    for (const client of this.#clients) if (client.watching) client.socket.write(line);
  }

  close(): void {
    clearInterval(this.#timer);
    for (const client of this.#clients) client.socket.destroy();
    this.#server.close();
    leaveRig(this.#address);
  }

  #accept(socket: Socket): void {
    if (this.#clients.size >= MOST_CLIENTS) {
      socket.destroy();
      return;
    }
    const client = new Client(socket);
    this.#clients.add(client);
    const lines = new LineReader(LONGEST_LINE_BYTES, (line) => this.#take(client, line));
    socket.on('data', (bytes) => {
      if (socket.destroyed) return;
      try {
        lines.push(bytes);
      } catch (error) {
        this.#refuse(client, undefined, error);
        socket.destroySoon();
      }
    });
    socket.on('error', () => socket.destroy());
    socket.on('close', () => {
      this.#clients.delete(client);
      this.#benchChanged();
    });
  }

  #take(client: Client, line: string): void {
    const message = parse(line);
    if (message.say === 'hello') {
      this.#greet(client, message.token);
      return;
    }
    if (!client.greeted) {
      throw new LapwingError('loopTokenRefused', 'The first line must be `hello` with the token.');
    }
    void this.#answer(client, message);
  }

  async #answer(client: Client, message: ClientMessage): Promise<void> {
    try {
      const result = await this.#obey(client, message);
      const { request } = message;
      if (request !== undefined) client.socket.write(lineOf({ tell: 'done', request, result }));
    } catch (error) {
      this.#refuse(client, message.request, error);
    }
  }

  #greet(client: Client, token: unknown): void {
    if (typeof token !== 'string' || !sameText(token, this.#token)) {
      throw new LapwingError('loopTokenRefused', 'The token is not the one in the token file.');
    }
    client.greeted = true;
    const { version, rig } = this.#service;
    client.socket.write(lineOf({ tell: 'hello', protocol: LOCAL_PROTOCOL, version, rig }));
  }

  #obey(client: Client, message: ClientMessage): Promise<unknown> | void {
    switch (message.say) {
      case 'quiet':
        this.#service.quiet(askedBy(message));
        return;
      case 'end':
        this.#service.end(textOf(message.reason) || 'asked to end', askedBy(message));
        return;
      case 'begin':
        refuseStale(message);
        return this.#service.begin(message);
      case 'act':
        refuseStale(message);
        this.#service.act(message);
        return;
      case 'watch':
        client.everyMs = 1000 / Math.min(50, Math.max(0.2, Number(message.hz) || 20));
        client.sentEvent = Math.max(0, Number(message.after) || 0);
        client.watching = true;
        client.socket.write(lineOf({ tell: 'setup', setup: this.#service.setup() }));
        this.#tickOnlyWhileWatched();
        return;
      case 'bench':
        client.bench = message.on === true;
        client.timed = client.bench && message.frames === true;
        client.sentItem = this.#service.bench.items.last;
        this.#benchChanged();
        return;
      case 'try':
        refuseStale(message);
        if (!client.bench) throw new LapwingError('loopGarbled', 'Say `bench` before `try`.');
        return this.#service.tryOutput(message);
      case 'reload':
        this.#service.reload();
        return;
      default:
        throw new LapwingError('loopGarbled', `Unknown request ${JSON.stringify(message)}.`);
    }
  }

  #refuse(client: Client, request: number | undefined, error: unknown): void {
    const { code, message, remedy } = asKnown(error);
    const which = request === undefined ? {} : { request };
    client.socket.write(lineOf({ tell: 'error', ...which, code, message, remedy }));
  }

  #benchChanged(): void {
    const clients = [...this.#clients];
    this.#service.bench.watch(
      clients.some((client) => client.bench),
      clients.some((client) => client.timed),
    );
    this.#tickOnlyWhileWatched();
  }

  #tickOnlyWhileWatched(): void {
    const watched = [...this.#clients].some((client) => client.watching || client.bench);
    if (watched && !this.#timer) this.#timer = setInterval(() => this.#tick(), STATE_MS);
    if (!watched) {
      clearInterval(this.#timer);
      this.#timer = undefined;
    }
  }

  /** One state for all who are due one, serialised once. */
  #tick(): void {
    const now = performance.now();
    let line: string | undefined;
    for (const client of this.#clients) {
      if (!client.watching && !client.bench) continue;
      const behind = client.socket.writableLength;
      if (behind > LOST_BYTES) {
        client.socket.destroy();
        continue;
      }
      if (behind > SLOW_BYTES) continue;
      if (client.bench) this.#sendBench(client);
      if (!client.watching) continue;
      this.#sendEvents(client);
      if (now < client.dueMs) continue;
      client.dueMs = Math.max(client.dueMs + client.everyMs, now);
      line ??= lineOf({ tell: 'state', state: this.#service.snapshot() });
      client.socket.write(line);
    }
  }

  #sendBench(client: Client): void {
    const { items, now } = this.#service.bench;
    const next = items.after(client.sentItem, ITEMS_AT_ONCE);
    client.sentItem = next.at(-1)?.number ?? client.sentItem;
    client.socket.write(lineOf({ tell: 'bench', now, items: next.map(({ event }) => event) }));
  }

  #sendEvents(client: Client): void {
    const { events } = this.#service;
    // A number from before a restart of the loop would hide everything that is new.
    if (client.sentEvent > events.last) client.sentEvent = 0;
    if (client.sentEvent === events.last) return;
    if (client.sentEvent + 1 < events.first) {
      const to = events.first - 1;
      client.socket.write(lineOf({ tell: 'gap', from: client.sentEvent + 1, to }));
      client.sentEvent = to;
    }
    const next = events.after(client.sentEvent, EVENTS_AT_ONCE);
    client.sentEvent = next.at(-1)!.number;
    client.socket.write(lineOf({ tell: 'events', events: next }));
  }
}

class Client {
  greeted = false;
  watching = false;
  everyMs = 50;
  dueMs = 0;
  sentEvent = 0;
  bench = false;
  timed = false;
  sentItem = 0;

  constructor(readonly socket: Socket) {}
}

/** Whoever asked has given up long ago, and must not be surprised now. */
function refuseStale({ say, saidMs }: ClientMessage): void {
  const ageMs = typeof saidMs === 'number' ? Date.now() - saidMs : 0;
  if (ageMs <= STALE_MS) return;
  throw new LapwingError('loopStale', `\`${say}\` was said ${Math.round(ageMs)} ms ago.`);
}

function parse(line: string): ClientMessage {
  let value: unknown;
  try {
    value = JSON.parse(line);
  } catch {
    throw new LapwingError('loopGarbled', `Not JSON: ${line.slice(0, 80)}`);
  }
  if (typeof value !== 'object' || value === null || Array.isArray(value)) {
    throw new LapwingError('loopGarbled', 'Expected one JSON object a line.');
  }
  return value as ClientMessage;
}

function textOf(value: unknown): string {
  return typeof value === 'string' ? value.slice(0, 200) : '';
}

function askedBy({ who, from }: AskedBy): AskedBy {
  return { who: textOf(who), from: textOf(from) };
}

function sameText(a: string, b: string): boolean {
  const left = Buffer.from(a);
  const right = Buffer.from(b);
  return left.length === right.length && timingSafeEqual(left, right);
}

function lineOf(message: LoopMessage): string {
  return JSON.stringify(message) + '\n';
}
