/**
 * The websocket side: every page gets the setup, the newest state and the events it lacks. Each
 * client is served at its own pace: one that does not read is skipped, then ended, and costs the
 * others nothing.
 */
import type { IncomingMessage } from 'node:http';
import type { Duplex } from 'node:stream';
import type { FastifyBaseLogger } from 'fastify';
import { type WebSocket, WebSocketServer } from 'ws';
import type { Actor } from '../session/inputs.js';
import type { Held, YouMessage } from './access/accessMessages.js';
import type { SignIn } from './access/signIns.js';
import type { Visitor } from './access/visitor.js';
import type { Mirror } from './mirror.js';
import { STREAM_VERSION, type StreamMessage } from './streamMessages.js';

export interface StreamLimits {
  /** A client with more than this waiting gets nothing more until it has read. */
  readonly softBytes: number;
  /** With more than this waiting, or over `softBytes` for `stallMs`, it is ended. */
  readonly hardBytes: number;
  readonly stallMs: number;
  readonly mostClients: number;
  /** Least time between two states to one client. */
  readonly stateMs: number;
  /** A client that answers no ping for two of these is gone. */
  readonly pingMs: number;
}

export const STREAM_LIMITS: StreamLimits = {
  softBytes: 256 << 10,
  hardBytes: 4 << 20,
  stallMs: 10_000,
  mostClients: 256,
  stateMs: 48,
  pingMs: 15_000,
};

/** Who watches, as the door let them in. */
export interface Watcher {
  readonly visitor: Visitor;
  readonly address: string;
}

/** What the stream needs of the rest of the service. */
export interface StreamPort {
  readonly version: string;
  you(visitor: Visitor): YouMessage;
  /** Undefined where nobody signs in. */
  controls(): Held | undefined;
  quiet(by: Actor): Promise<void>;
  /** A page of this sign-in is still there. */
  seen(signIn: SignIn): void;
}

/** Clients served at a stretch, and the pause after them: 256 are served within `stateMs`. */
const AT_ONCE = 32;
const BETWEEN_MS = 5;

/** Close codes of our own (RFC 6455, 7.4.2: 4000 and up are for applications). */
export const CLOSED = { signedOut: 4401 } as const;

/** What is sent to many is made a buffer once, and is text all the same. */
const AS_TEXT = { binary: false };

/** Events in one message: about 60 kB, well below `softBytes`. */
const EVENTS_A_MESSAGE = 250;

interface Viewer {
  readonly socket: WebSocket;
  readonly watcher: Watcher;
  after: number;
  stateCount: number;
  stalledSinceMs: number;
  alive: boolean;
  quietAsks: number;
}

export class Stream {
  private readonly server = new WebSocketServer({
    noServer: true,
    maxPayload: 1024,
    perMessageDeflate: false,
    clientTracking: false,
  });
  private readonly viewers = new Set<Viewer>();
  private readonly ping: NodeJS.Timeout;
  private lastPumpMs = Number.NEGATIVE_INFINITY;
  private pumpTimer: NodeJS.Timeout | undefined;
  /** Those who are still to be served in this round; undefined between rounds. */
  private round: Iterator<Viewer> | undefined;
  private changedInRound = false;
  private closing = false;
  /** Clients ended because they did not read. */
  dropped = 0;

  constructor(
    private readonly mirror: Mirror,
    private readonly log: FastifyBaseLogger,
    private readonly limits: StreamLimits,
    private readonly port: StreamPort,
  ) {
    this.ping = setInterval(() => this.checkAlive(), limits.pingMs);
    this.ping.unref();
  }

  get clients(): number {
    return this.viewers.size;
  }

  get full(): boolean {
    return this.closing || this.viewers.size >= this.limits.mostClients;
  }

  /** Takes over a checked upgrade request. */
  accept(request: IncomingMessage, socket: Duplex, head: Buffer, watcher: Watcher): void {
    const query = new URL(request.url ?? '/', 'http://any').searchParams;
    const asked = Number(query.get('after'));
    const life = query.get('life') ?? this.mirror.loop.life;
    this.server.handleUpgrade(request, socket, head, (ws) => {
      const known = life === this.mirror.loop.life && Number.isSafeInteger(asked) && asked > 0;
      const after = known ? asked : 0;
      this.add({
        socket: ws,
        watcher,
        after,
        stateCount: -1,
        stalledSinceMs: Number.NaN,
        alive: true,
        quietAsks: 0,
      });
    });
  }

  /** Something new to show: goes out now, or when the least time between states has passed. */
  changed(): void {
    if (this.closing) return;
    if (this.round) this.changedInRound = true;
    if (this.pumpTimer || this.round) return;
    this.changedInRound = false;
    const waitMs = this.lastPumpMs + this.limits.stateMs - performance.now();
    if (waitMs <= 0) this.pump();
    else this.pumpTimer = setTimeout(() => this.pump(), waitMs);
  }

  /** The loop came (back): everybody is told its events from the oldest kept. */
  startOver(): void {
    this.announce(this.mirror.loop);
    for (const viewer of this.viewers) viewer.after = 0;
  }

  /** A message for every client, outside the latest-only order: setup, loop up or away. */
  announce(message: StreamMessage): void {
    const text = Buffer.from(JSON.stringify(message));
    for (const viewer of this.viewers) viewer.socket.send(text, AS_TEXT);
  }

  /** Sign-ins have ended: their pages see nothing more. */
  signedOut(signIns: readonly SignIn[]): void {
    for (const viewer of this.viewers) {
      const { socket, watcher } = viewer;
      const { signIn } = watcher.visitor;
      if (!signIn || !signIns.includes(signIn)) continue;
      // At once: what is told from now on is not for them.
      this.viewers.delete(viewer);
      socket.close(CLOSED.signedOut, 'Signed out.');
      setTimeout(() => socket.terminate(), 1000).unref();
    }
  }

  /** Tells the clients to come back, then ends the ones that do not answer. */
  async close(): Promise<void> {
    this.closing = true;
    clearInterval(this.ping);
    clearTimeout(this.pumpTimer);
    const leaving = [...this.viewers].map(
      (viewer) => new Promise<void>((resolve) => viewer.socket.once('close', () => resolve())),
    );
    for (const viewer of this.viewers) viewer.socket.close(1001, 'The web process is stopping.');
    const impatience = setTimeout(() => {
      for (const viewer of this.viewers) viewer.socket.terminate();
    }, 500);
    await Promise.all(leaving);
    clearTimeout(impatience);
    this.server.close();
  }

  private add(viewer: Viewer): void {
    const { socket } = viewer;
    this.viewers.add(viewer);
    socket.on('close', () => this.viewers.delete(viewer));
    socket.on('error', () => socket.terminate());
    socket.on('pong', () => {
      viewer.alive = true;
    });
    socket.on('message', (data) => this.hear(viewer, String(data)));
    const say = (message: StreamMessage) => socket.send(JSON.stringify(message));
    const { visitor } = viewer.watcher;
    const { version: lapwing } = this.port;
    say({ tell: 'welcome', version: STREAM_VERSION, lapwing, you: this.port.you(visitor) });
    const controls = this.port.controls();
    if (controls) say({ tell: 'controls', controls });
    say(this.mirror.loop);
    if (this.mirror.setup) say({ tell: 'setup', setup: this.mirror.setup });
    this.serve(viewer);
  }

  /** The one thing a page may ask here; anything else is ignored, and too much of it ends it. */
  private hear(viewer: Viewer, text: string): void {
    viewer.quietAsks++;
    if (viewer.quietAsks > 1000) {
      viewer.socket.terminate();
      return;
    }
    let ask: unknown;
    try {
      ask = (JSON.parse(text) as { ask?: unknown } | null)?.ask;
    } catch {
      return;
    }
    if (ask !== 'quiet') return;
    const answer = (done: boolean, detail: string) => {
      const message: StreamMessage = { tell: 'quiet', done, detail };
      if (viewer.socket.readyState === viewer.socket.OPEN) {
        viewer.socket.send(JSON.stringify(message));
      }
    };
    const { visitor, address } = viewer.watcher;
    if (visitor.role !== 'operator') {
      answer(false, `${visitor.name} is signed in as ${visitor.role}.`);
      return;
    }
    const by = { who: visitor.name || 'operator', from: `dashboard ${address}` };
    this.port.quiet(by).then(
      () => answer(true, ''),
      (error: Error) => answer(false, error.message),
    );
  }

  private pump(): void {
    this.lastPumpMs = performance.now();
    this.round = this.viewers.values();
    this.serveSome();
  }

  /**
   * Serves some of the round, and the rest a little later: two hundred at once would take a core for
   * some milliseconds, and on a small machine that core may be the one that the loop wakes up on.
   */
  private serveSome(): void {
    this.pumpTimer = undefined;
    for (let n = 0; n < AT_ONCE; n++) {
      const next = this.round!.next();
      if (next.done) {
        this.round = undefined;
        if (this.changedInRound) this.changed();
        return;
      }
      this.serve(next.value);
    }
    this.pumpTimer = setTimeout(() => this.serveSome(), BETWEEN_MS);
  }

  /** Sends what this client lacks, if it has read what it was sent before. */
  private serve(viewer: Viewer): void {
    const { socket } = viewer;
    if (socket.readyState !== socket.OPEN || this.isStalled(viewer)) return;
    for (;;) {
      const { messages, upTo } = this.mirror.eventsAfter(viewer.after, EVENTS_A_MESSAGE);
      viewer.after = upTo;
      for (const message of messages) socket.send(message, AS_TEXT);
      if (messages.length === 0 || socket.bufferedAmount > this.limits.softBytes) break;
    }
    const state = this.mirror.stateMessage();
    if (state && viewer.stateCount !== this.mirror.stateCount) {
      viewer.stateCount = this.mirror.stateCount;
      socket.send(state, AS_TEXT);
    }
  }

  private isStalled(viewer: Viewer): boolean {
    const waiting = viewer.socket.bufferedAmount;
    if (waiting <= this.limits.softBytes) {
      viewer.stalledSinceMs = Number.NaN;
      return false;
    }
    const now = performance.now();
    if (Number.isNaN(viewer.stalledSinceMs)) viewer.stalledSinceMs = now;
    if (waiting > this.limits.hardBytes || now - viewer.stalledSinceMs > this.limits.stallMs) {
      this.dropped++;
      this.log.warn({ waiting }, 'a page that does not read was dropped');
      viewer.socket.terminate();
    }
    return true;
  }

  private checkAlive(): void {
    for (const viewer of this.viewers) {
      const { signIn } = viewer.watcher.visitor;
      if (!viewer.alive) viewer.socket.terminate();
      else if (signIn) this.port.seen(signIn);
      viewer.alive = false;
      if (viewer.socket.readyState === viewer.socket.OPEN) viewer.socket.ping();
    }
  }
}
