/**
 * A client of the loop process: the web process and the command line speak through it.
 *
 * It keeps one connection, says `hello` with the token, asks for the watch again after every
 * reconnection (from the event number where it left off), and matches answers to requests.
 */
import { readFileSync } from 'node:fs';
import { connect, type Socket } from 'node:net';
import { LapwingError } from '../errors/codes.js';
import type { OperatorAct } from '../session/inputs.js';
import { LineReader } from './lines.js';
import type {
  AskedBy,
  BenchItem,
  BenchNow,
  ClientMessage,
  LoopMessage,
  NumberedEvent,
  Setup,
  Snapshot,
  Tried,
  TryRequest,
} from './protocol.js';

export interface LocalClientOptions {
  readonly socketPath: string;
  /** The token, or the file that holds it; a file is read again at each connection. */
  readonly token?: string;
  readonly tokenFile?: string;
  /** Names this client in the loop's log: `web`, `lapwing quiet`. */
  readonly client: string;
  /** False: one attempt; the first failure or loss is final. */
  readonly reconnect?: boolean;
  /**
   * True: after a reconnection events are asked for from the oldest kept, since a loop that was
   * restarted numbers them anew. Else only those after the last that was told.
   */
  readonly fromOldest?: boolean;
  readonly firstBackoffMs?: number;
  readonly mostBackoffMs?: number;
  readonly requestTimeoutMs?: number;
  /** Longest line accepted from the loop; the setup holds the whole rules text. */
  readonly capBytes?: number;
  readonly callbacks?: LocalCallbacks;
}

export interface LocalCallbacks {
  up?(hello: Hello): void;
  /** Not connected any more, or not yet: why. Once for each loss, and for the first failed attempt. */
  down?(why: LapwingError): void;
  setup?(setup: Setup): void;
  state?(state: Snapshot): void;
  events?(events: readonly NumberedEvent[]): void;
  gap?(from: number, to: number): void;
  bench?(now: BenchNow, items: readonly BenchItem[]): void;
}

export type Hello = Extract<LoopMessage, { tell: 'hello' }>;
type Asking = ClientMessage extends infer M
  ? M extends unknown
    ? Omit<M, 'request'>
    : never
  : never;
const ANSWER_MS = 3000;
/** The animals folder is asked first, on a share that may be slow, and files are synced. */
const BEGIN_MS = 25_000;

export type Beginning = Omit<Extract<ClientMessage, { say: 'begin' }>, 'say' | 'request'>;

/** The loop understood the request and said no; `code` and `remedy` are the loop's own. */
export class LoopRefusal extends Error {
  constructor(
    readonly code: string,
    message: string,
    readonly remedy: string,
  ) {
    super(message);
    this.name = 'LoopRefusal';
  }
}

interface Pending {
  resolve(result: unknown): void;
  reject(error: Error): void;
  timer: NodeJS.Timeout;
}

export class LocalClient {
  private socket: Socket | undefined;
  private hello: Hello | undefined;
  private closed = false;
  private toldDown = false;
  private backoffMs: number;
  private retry: NodeJS.Timeout | undefined;
  private nextRequest = 1;
  private readonly pending = new Map<number, Pending>();
  private readonly waiting: { resolve(hello: Hello): void; reject(error: Error): void }[] = [];
  private watching: { hz: number; after: number } | undefined;
  private lastFailure: LapwingError | undefined;

  constructor(private readonly options: LocalClientOptions) {
    this.backoffMs = options.firstBackoffMs ?? 100;
  }

  /** What the loop said of itself, while connected. */
  get loop(): Hello | undefined {
    return this.hello;
  }

  /** Why there is no connection; undefined while there is one. */
  get failure(): LapwingError | undefined {
    return this.hello ? undefined : this.lastFailure;
  }

  /** Begins to connect, and goes on trying; returns at once. */
  start(): void {
    if (!this.socket && !this.closed) this.open();
  }

  /** Resolves once connected and greeted; rejects when the one attempt failed or `close` was called. */
  ready(): Promise<Hello> {
    if (this.hello) return Promise.resolve(this.hello);
    if (this.closed) return Promise.reject(this.lastFailure ?? away('The client is closed.'));
    return new Promise((resolve, reject) => this.waiting.push({ resolve, reject }));
  }

  /** Asks for state at most `hz` times a second, and for events after number `after`. */
  watch(hz: number, after = 0): void {
    this.watching = { hz, after };
    if (this.hello) this.send({ say: 'watch', hz, after });
  }

  /** All outputs idle; resolves when the loop says it is done. */
  quiet(by: AskedBy = {}): Promise<void> {
    return this.ask({ say: 'quiet', ...by });
  }

  end(reason: string, by: AskedBy = {}): Promise<void> {
    return this.ask({ say: 'end', reason, ...by });
  }

  begin(session: Beginning): Promise<void> {
    return this.ask({ say: 'begin', ...session }, BEGIN_MS);
  }

  act(act: OperatorAct, who: string, from: string): Promise<void> {
    return this.ask({ say: 'act', act, who, from });
  }

  /** Raw edges from now on, or no longer; `frames` times every frame too. Not asked again by itself. */
  bench(on: boolean, frames = false): Promise<void> {
    return this.ask({ say: 'bench', on, frames });
  }

  /** One pulse of one output, between sessions; resolves when the board has said what became of it. */
  tryOutput(request: TryRequest): Promise<Tried> {
    return this.ask<Tried>({ say: 'try', ...request });
  }

  /** Lets the loop read its rig file again, between sessions. */
  reload(): Promise<void> {
    return this.ask({ say: 'reload' });
  }

  /** Ends the connection and every attempt at one; what is pending is rejected. */
  close(): void {
    this.closed = true;
    clearTimeout(this.retry);
    this.lose(away('The client was closed.'), true);
  }

  private open(): void {
    const socket = connect(this.options.socketPath);
    this.socket = socket;
    let failure: Error | undefined;
    const lines = new LineReader(this.options.capBytes ?? 4 << 20, (line) => this.take(line));
    const greeting = setTimeout(() => {
      socket.destroy(
        new LapwingError('loopSilent', 'The loop took the connection and said nothing.'),
      );
    }, this.options.requestTimeoutMs ?? 3000);
    socket.on('connect', () => {
      try {
        this.send({ say: 'hello', token: this.token(), client: this.options.client });
      } catch (error) {
        socket.destroy(error as Error);
      }
    });
    socket.on('data', (bytes) => {
      if (socket.destroyed) return;
      try {
        lines.push(bytes);
        if (this.hello) clearTimeout(greeting);
      } catch (error) {
        socket.destroy(error as Error);
      }
    });
    socket.on('error', (error) => {
      failure = error;
    });
    socket.on('close', () => {
      clearTimeout(greeting);
      if (this.socket === socket) this.lose(explain(failure, this.options.socketPath), false);
    });
  }

  private token(): string {
    if (this.options.token !== undefined) return this.options.token;
    if (this.options.tokenFile === undefined) return '';
    try {
      return readFileSync(this.options.tokenFile, 'utf8').trim();
    } catch (cause) {
      throw away(`The token file ${this.options.tokenFile} cannot be read.`, cause);
    }
  }

  private take(line: string): void {
    let message: LoopMessage;
    try {
      message = JSON.parse(line) as LoopMessage;
    } catch {
      throw new LapwingError('loopGarbled', `Not JSON: ${line.slice(0, 80)}`);
    }
    const { callbacks } = this.options;
    switch (message.tell) {
      case 'hello':
        this.greeted(message);
        return;
      case 'done':
        this.settle(message.request)?.resolve(message.result);
        return;
      case 'error':
        this.refused(message);
        return;
      case 'setup':
        callbacks?.setup?.(message.setup);
        return;
      case 'state':
        callbacks?.state?.(message.state);
        return;
      case 'events': {
        const last = message.events.at(-1);
        if (this.watching && last) this.watching.after = last.number;
        callbacks?.events?.(message.events);
        return;
      }
      case 'bench':
        callbacks?.bench?.(message.now, message.items);
        return;
      case 'gap':
        if (this.watching) this.watching.after = message.to;
        callbacks?.gap?.(message.from, message.to);
        return;
      default:
        // A newer loop may say more than this client knows.
        return;
    }
  }

  private greeted(hello: Hello): void {
    this.hello = hello;
    this.toldDown = false;
    this.backoffMs = this.options.firstBackoffMs ?? 100;
    this.options.callbacks?.up?.(hello);
    if (this.watching && this.options.fromOldest) this.watching.after = 0;
    if (this.watching) this.send({ say: 'watch', ...this.watching });
    for (const waiter of this.waiting.splice(0)) waiter.resolve(hello);
  }

  private refused(message: Extract<LoopMessage, { tell: 'error' }>): void {
    const refusal = new LoopRefusal(message.code, message.message, message.remedy);
    if (message.request !== undefined) {
      this.settle(message.request)?.reject(refusal);
    } else if (!this.hello) {
      throw new LapwingError('loopTokenRefused', message.message);
    }
  }

  private ask<T = void>(message: Asking, usualMs = ANSWER_MS): Promise<T> {
    if (!this.hello) return Promise.reject(this.lastFailure ?? away('There is no connection yet.'));
    const request = this.nextRequest++;
    return new Promise((resolve, reject) => {
      const timer = setTimeout(() => {
        this.pending.delete(request);
        reject(new LapwingError('loopSilent', `The loop did not answer \`${message.say}\`.`));
      }, this.options.requestTimeoutMs ?? usualMs);
      this.pending.set(request, { resolve: (result) => resolve(result as T), reject, timer });
      this.send({ ...message, request, saidMs: Date.now() } as ClientMessage);
    });
  }

  private settle(request: number): Pending | undefined {
    const pending = this.pending.get(request);
    if (pending) clearTimeout(pending.timer);
    this.pending.delete(request);
    return pending;
  }

  private send(message: ClientMessage): void {
    this.socket?.write(JSON.stringify(message) + '\n');
  }

  /** The connection is gone: nothing pending will be answered, and nothing is kept to send later. */
  private lose(why: LapwingError, final: boolean): void {
    const stop = final || this.options.reconnect === false;
    this.socket?.destroy();
    this.socket = undefined;
    this.hello = undefined;
    this.lastFailure = why;
    for (const request of [...this.pending.keys()]) this.settle(request)?.reject(why);
    if (!this.toldDown && !final) {
      this.toldDown = true;
      this.options.callbacks?.down?.(why);
    }
    if (stop) {
      this.closed = true;
      for (const waiter of this.waiting.splice(0)) waiter.reject(why);
      return;
    }
    this.retry = setTimeout(() => this.open(), this.backoffMs);
    this.backoffMs = Math.min(this.backoffMs * 2, this.options.mostBackoffMs ?? 2000);
  }
}

function away(particulars: string, cause?: unknown): LapwingError {
  return new LapwingError('loopAway', particulars, cause === undefined ? undefined : { cause });
}

function explain(failure: Error | undefined, path: string): LapwingError {
  if (failure instanceof LapwingError) return failure;
  const code = (failure as NodeJS.ErrnoException | undefined)?.code;
  if (code === 'ENOENT') return away(`There is no socket at ${path}.`, failure);
  if (code === 'ECONNREFUSED') return away(`Nobody listens at ${path}.`, failure);
  if (code === 'EACCES') return away(`No permission to open ${path}.`, failure);
  return away(failure ? `The connection broke: ${failure.message}.` : 'The loop hung up.', failure);
}

/** One quiet over a connection of its own: works however the caller's own client stands. */
export async function quietOnce(
  options: Pick<LocalClientOptions, 'socketPath' | 'token' | 'tokenFile' | 'requestTimeoutMs'>,
  by: AskedBy = {},
): Promise<void> {
  const client = new LocalClient({ ...options, client: 'quiet', reconnect: false });
  client.start();
  try {
    await client.ready();
    await client.quiet(by);
  } finally {
    client.close();
  }
}
