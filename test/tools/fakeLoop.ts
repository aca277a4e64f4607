/**
 * A loop process for tests: a real socket server that speaks the loop's protocol, over a scripted
 * animal. It has what tests want to do to a loop: go away, fall silent, flood, hang up.
 */
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { createServer, type Server, type Socket } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { LineReader } from '../../server/loop/lines.js';
import {
  type ClientMessage,
  LOCAL_PROTOCOL,
  type LoopMessage,
} from '../../server/loop/protocol.js';
import type { OperatorAct } from '../../server/session/inputs.js';
import { ScriptedAnimal } from './scriptedAnimal.js';

interface Client {
  readonly socket: Socket;
  known: boolean;
  watching: boolean;
  after: number;
}

export class FakeLoop {
  readonly folder = mkdtempSync(join(tmpdir(), 'lapwing-fake-'));
  readonly socketPath: string;
  readonly tokenFile = join(this.folder, 'token');
  readonly token = 'a token of the test';
  /** Everything that clients said, in order. */
  readonly heard: ClientMessage[] = [];
  animal = new ScriptedAnimal();
  /** Requests are heard and not answered. */
  silent = false;
  /** Refuses every request with this, when set. */
  refusal: { code: string; message: string; remedy: string } | undefined;
  private server: Server | undefined;
  private readonly clients = new Set<Client>();
  private clock: NodeJS.Timeout | undefined;

  constructor() {
    this.socketPath =
      process.platform === 'win32' ? `\\\\.\\pipe\\${this.folder}` : join(this.folder, 'loop.sock');
    writeFileSync(this.tokenFile, this.token + '\n', { mode: 0o600 });
  }

  get connections(): number {
    return this.clients.size;
  }

  acts(): OperatorAct[] {
    return this.heard.flatMap((message) => (message.say === 'act' ? [message.act] : []));
  }

  async start(): Promise<this> {
    const server = createServer((socket) => this.welcome(socket));
    this.server = server;
    await new Promise<void>((resolve) => server.listen(this.socketPath, resolve));
    return this;
  }

  /** Lets the animal live in real time, or `factor` times as fast. */
  run(factor = 1): this {
    clearInterval(this.clock);
    this.clock = setInterval(() => this.advance(0.05 * factor), 50);
    return this;
  }

  /** The board falls silent, or the test takes time into its own hands. */
  freeze(): void {
    clearInterval(this.clock);
  }

  advance(seconds: number): void {
    this.animal.advance(seconds);
    this.show();
  }

  /** Sends the state and the events that each watching client lacks. */
  show(): void {
    const { state, events } = this.animal;
    if (events.length > 20_000) this.animal.events = events.slice(-10_000);
    const stateLine = lineOf({ tell: 'state', state });
    for (const client of this.clients) {
      if (!client.watching) continue;
      this.sendEvents(client);
      client.socket.write(stateLine);
    }
  }

  broadcast(line: string): void {
    for (const client of this.clients) client.socket.write(line);
  }

  /** As a killed process: connections break, and nothing listens any more. */
  async goAway(): Promise<void> {
    this.freeze();
    for (const client of this.clients) client.socket.destroy();
    this.clients.clear();
    const { server } = this;
    this.server = undefined;
    if (server) await new Promise<void>((resolve) => server.close(() => resolve()));
  }

  async stop(): Promise<void> {
    await this.goAway();
    rmSync(this.folder, { recursive: true, force: true });
  }

  private welcome(socket: Socket): void {
    const client: Client = { socket, known: false, watching: false, after: 0 };
    this.clients.add(client);
    const lines = new LineReader(1 << 20, (line) => this.hear(client, JSON.parse(line)));
    socket.on('data', (bytes) => lines.push(bytes));
    socket.on('error', () => socket.destroy());
    socket.on('close', () => this.clients.delete(client));
  }

  private hear(client: Client, message: ClientMessage): void {
    this.heard.push(message);
    const say = (answer: LoopMessage) => client.socket.write(lineOf(answer));
    if (message.say === 'hello') {
      client.known = message.token === this.token;
      if (client.known) {
        const { rig } = this.animal.setup;
        say({ tell: 'hello', protocol: LOCAL_PROTOCOL, version: '0.0.0', rig });
        say({ tell: 'setup', setup: this.animal.setup });
      } else {
        const message = 'The token is not the one in the token file.';
        say({ tell: 'error', code: 'LOOP_TOKEN_REFUSED', message, remedy: 'Ask its owner.' });
        client.socket.end();
      }
      return;
    }
    if (!client.known || this.silent) return;
    if (message.say === 'watch') {
      client.watching = true;
      client.after = message.after > (this.animal.events.at(-1)?.number ?? 0) ? 0 : message.after;
      this.sendEvents(client);
      say({ tell: 'state', state: this.animal.state });
      return;
    }
    if (this.refusal) {
      say({ tell: 'error', ...withRequest(message), ...this.refusal });
      return;
    }
    if (message.say === 'bench') {
      const { boardUs: atUs } = this.animal.state;
      const board = { model: 'scripted', boardId: 0, firmware: 1, simulated: false };
      say({ tell: 'bench', now: { atUs: atUs + 1, count: 0, board }, items: [] });
    }
    this.obey(message);
    if (message.request !== undefined) say({ tell: 'done', request: message.request });
    this.show();
  }

  private obey(message: ClientMessage): void {
    const { animal } = this;
    if (message.say === 'quiet') animal.quiet();
    if (message.say === 'begin') {
      animal.begin(message.rules, message.subject, message.experimenter, message.seed);
    }
    if (message.say === 'end') animal.end(message.reason);
    if (message.say === 'begin') {
      this.broadcast(lineOf({ tell: 'setup', setup: animal.setup }));
    }
    if (message.say !== 'act') return;
    const { act, who, from } = message;
    animal.tell({ kind: 'operator', act, who, from });
    if (act.act === 'hold') animal.hold(act.what, act.on);
    if (act.act === 'note') animal.note(act.text, act.mark);
    if (act.act === 'mark') animal.mark();
    if (act.act === 'ask') animal.ask(act.rule, act.laps);
    if (act.act === 'withdraw') animal.ask(act.rule, undefined);
    if (act.act === 'put off') animal.putOff(act.laps, act.minutes);
    if (act.act === 'acknowledge') animal.acknowledge(act.alarm, who, from);
    if (act.act === 'new cell') animal.state.cell++;
    if (act.act === 'choose' && typeof act.value === 'number') animal.choose(act.value);
    if (act.act === 'end') animal.end(act.reason);
    if (act.act === 'allow stimulation') animal.hold('stimulus', false);
  }

  private sendEvents(client: Client): void {
    const { events } = this.animal;
    const oldest = events[0]?.number;
    if (oldest === undefined) return;
    if (client.after > 0 && oldest > client.after + 1) {
      client.socket.write(lineOf({ tell: 'gap', from: client.after + 1, to: oldest - 1 }));
    }
    const fresh = events.slice(Math.max(0, client.after - oldest + 1));
    if (fresh.length === 0) return;
    client.after = fresh.at(-1)!.number;
    client.socket.write(lineOf({ tell: 'events', events: fresh }));
  }
}

function withRequest(message: ClientMessage): { request?: number } {
  return message.request === undefined ? {} : { request: message.request };
}

function lineOf(message: LoopMessage): string {
  return JSON.stringify(message) + '\n';
}
