/**
 * The web process's server: a guest of the loop. It mirrors what the loop says to any number of
 * pages, and passes on what an operator asks.
 *
 * There is no sign-in: it may be bound to loopback only, where whoever can reach it can also reach
 * the rig's own processes.
 */
import type { Socket } from 'node:net';
import fastifyStatic from '@fastify/static';
import Fastify, { type FastifyInstance, type FastifyRequest, LogController } from 'fastify';
import { LapwingError } from '../errors/codes.js';
import { type Beginning, LocalClient, quietOnce } from '../loop/localClient.js';
import { packageVersion } from '../packageRoot.js';
import type { OperatorAct } from '../session/inputs.js';
import type { Rig } from '../session/rig/rig.js';
import { checkAct } from './acts.js';
import { checkSender, RateLimit, SECURITY_HEADERS } from './gates.js';
import { Mirror } from './mirror.js';
import { openapi } from './openapi.js';
import { PROBLEM_TYPE, problem, problemFrom, sendProblem } from './problems.js';
import type { Rehearsals } from './rehearsal/rehearsals.js';
import { addRulesRoutes } from './rules/routes.js';
import { bodies } from './schemas.js';
import { STREAM_LIMITS, Stream, type StreamLimits } from './stream.js';

export interface WebOptions {
  /** The loop's socket and its token, given or in a file. */
  readonly socketPath: string;
  readonly token?: string;
  readonly tokenFile?: string;
  /** The built dashboard; without it only the HTTP interface is served. */
  readonly dashboard?: string;
  readonly version?: string;
  /** For editing and rehearsing rules: the rig that the loop runs, and its rules folder if another. */
  readonly rig?: Rig | undefined;
  readonly rulesFolder?: string;
  readonly rehearsals?: Rehearsals;
  /** Further host names that this service answers to, without port. */
  readonly allowedHosts?: readonly string[];
  /** `false` is silent; else pino's level, to stderr. */
  readonly log?: string | false;
  readonly limits?: Partial<StreamLimits>;
  /** Events kept for pages that join: forty laps of a busy session. */
  readonly keepEvents?: number;
  readonly requestsPerS?: number;
  readonly loopTimeoutMs?: number;
}

const BODY_BYTES = 16 << 10;
/** For files whose name carries a hash of what is in them. */
const FOR_GOOD = 'public, max-age=31536000, immutable';

/** Builds the server and begins to look for the loop; `listen` and `close` are Fastify's. */
export function buildWeb(options: WebOptions): FastifyInstance {
  const app = Fastify({
    bodyLimit: BODY_BYTES,
    logger:
      options.log === false
        ? false
        : { level: options.log ?? 'info', stream: process.stderr, base: { from: 'web' } },
    logController: new LogController({ disableRequestLogging: true }),
    forceCloseConnections: true,
    requestTimeout: 10_000,
    ajv: {
      customOptions: {
        removeAdditional: false,
        coerceTypes: false,
        useDefaults: false,
        discriminator: true,
        allowUnionTypes: true,
      },
    },
  });
  const mirror = new Mirror(options.keepEvents ?? 6000);
  const loop = makeClient(options, mirror, (message) => stream.announce(message));
  const stream = new Stream(
    mirror,
    stopEverything,
    app.log,
    { ...STREAM_LIMITS, ...options.limits },
    options.version ?? packageVersion,
  );
  const allowedHosts = new Set((options.allowedHosts ?? []).map((host) => host.toLowerCase()));
  const perS = options.requestsPerS ?? 40;
  const rate = new RateLimit(perS, perS * 4);

  function makeClient(
    { socketPath, token, tokenFile, loopTimeoutMs }: WebOptions,
    into: Mirror,
    announce: Stream['announce'],
  ): LocalClient {
    return new LocalClient({
      socketPath,
      ...(token === undefined ? {} : { token }),
      ...(tokenFile === undefined ? {} : { tokenFile }),
      ...(loopTimeoutMs === undefined ? {} : { requestTimeoutMs: loopTimeoutMs }),
      client: 'web',
      fromOldest: true,
      callbacks: {
        up: (hello) => {
          app.log.info({ rig: hello.rig }, 'connected to the loop');
          into.beginLife();
          stream.startOver();
        },
        down: (why) => {
          app.log.warn({ code: why.code }, `the loop is away: ${why.message}`);
          into.loseLoop(why.message, why.remedy);
          announce(into.loop);
        },
        setup: (setup) => {
          into.setup = setup;
          announce({ tell: 'setup', setup });
        },
        state: (state) => {
          into.takeState(state);
          stream.changed();
        },
        events: (events) => {
          into.takeEvents(events);
          stream.changed();
        },
      },
    });
  }

  /** Over the standing connection; and, if that fails in any way, over one of its own. */
  async function stopEverything(): Promise<void> {
    try {
      await loop.quiet();
    } catch {
      await quietOnce({ ...options, requestTimeoutMs: options.loopTimeoutMs ?? 2000 });
    }
  }

  app.addHook('onRequest', async (request, reply) => {
    reply.headers(SECURITY_HEADERS);
    if (request.url.startsWith('/api/')) reply.header('cache-control', 'no-store');
    checkSender(request.raw, allowedHosts);
    if (!isQuiet(request) && !rate.take(request.ip)) {
      reply.header('retry-after', '1');
      throw new LapwingError('webTooManyRequests', `More than ${perS} requests a second.`);
    }
  });
  app.setErrorHandler((error, _request, reply) => {
    const body = problemFrom(error);
    if (body.status === 500) app.log.error(error);
    return sendProblem(reply, body);
  });
  app.setNotFoundHandler((request, reply) => {
    return sendProblem(
      reply,
      problem('webNotFound', `${request.method} ${request.url.slice(0, 200)}`),
    );
  });
  // Only JSON: a form from another site cannot send that without asking first (CSRF).
  app.removeContentTypeParser('text/plain');

  app.get('/healthz', async () => ({
    status: 'ok',
    loop: mirror.loop.state,
    clients: stream.clients,
    dropped: stream.dropped,
    uptimeS: Math.floor(process.uptime()),
    memoryMb: Math.round(process.memoryUsage.rss() / 1e6),
  }));
  const description = openapi(options.version ?? packageVersion);
  app.get('/api/openapi.json', async () => description);
  app.get('/api/setup', async () => mirror.setup ?? raise(loop));
  app.get('/api/state', async () => mirror.state ?? raise(loop));

  app.post<{ Body: Beginning }>(
    '/api/session',
    { schema: { body: bodies.begin } },
    async (request) => {
      const { rules } = request.body;
      // Only a file that the loop offered, or that lies in its folder by now: no path from a request reaches the file system.
      const offered = [...(mirror.setup?.rulesFiles ?? []), ...(rulesFolder?.list() ?? [])];
      if (mirror.setup && !offered.includes(rules)) {
        throw new LapwingError('webActUnknown', `There is no rules file ${JSON.stringify(rules)}.`);
      }
      await loop.begin(request.body);
      return { done: true };
    },
  );
  app.post<{ Body: { act: OperatorAct; who?: string } }>(
    '/api/acts',
    { schema: { body: bodies.act } },
    async (request) => {
      const { act, who } = request.body;
      checkAct(act, mirror.setup);
      await loop.act(act, who ?? 'operator', `dashboard ${request.ip}`);
      return { done: true };
    },
  );
  app.post<{ Body: { reason?: string } }>(
    '/api/end',
    { schema: { body: bodies.end } },
    async (request) => {
      await loop.end(request.body.reason || 'ended from the dashboard');
      return { done: true };
    },
  );
  app.post('/api/quiet', { schema: { body: bodies.quiet } }, async () => {
    await stopEverything();
    return { done: true };
  });

  const rulesFolder = addRulesRoutes(app, {
    rig: options.rig,
    rulesFolder: options.rulesFolder,
    ...(options.rehearsals === undefined ? {} : { rehearsals: options.rehearsals }),
    saved: (rulesFiles) => {
      if (!mirror.setup) return;
      mirror.setup = { ...mirror.setup, rulesFiles };
      stream.announce({ tell: 'setup', setup: mirror.setup });
    },
  });

  app.server.on('upgrade', (request, socket: Socket, head) => {
    socket.on('error', () => socket.destroy());
    try {
      if (request.url?.split('?')[0] !== '/api/stream') {
        throw new LapwingError('webNotFound', 'The stream is at /api/stream.');
      }
      checkSender(request, allowedHosts);
      if (!rate.take(socket.remoteAddress ?? '')) {
        throw new LapwingError('webTooManyRequests', 'Too many connections at once.');
      }
      if (stream.full) throw new LapwingError('webTooManyViewers', 'No more fit.');
      stream.accept(request, socket, head);
    } catch (error) {
      refuseUpgrade(socket, error);
    }
  });

  if (options.dashboard !== undefined) {
    app.register(fastifyStatic, {
      root: options.dashboard,
      index: 'index.html',
      cacheControl: false,
      // Names under assets/ carry a hash of their content.
      setHeaders: (response, path) => {
        const lasting = /[/\\]assets[/\\]/.test(path);
        response.setHeader('cache-control', lasting ? FOR_GOOD : 'no-cache');
      },
    });
  }

  app.addHook('preClose', () => stream.close());
  app.addHook('onClose', async () => loop.close());
  loop.watch(20);
  loop.start();
  return app;
}

function isQuiet(request: FastifyRequest): boolean {
  return request.method === 'POST' && request.url === '/api/quiet';
}

function raise(loop: LocalClient): never {
  throw loop.failure ?? new LapwingError('loopAway', 'The loop has said nothing yet.');
}

function refuseUpgrade(socket: Socket, error: unknown): void {
  const body = problemFrom(error);
  const text = JSON.stringify(body);
  socket.end(
    `HTTP/1.1 ${body.status} ${body.code}\r\nconnection: close\r\ncontent-type: ${PROBLEM_TYPE}\r\n` +
      `content-length: ${Buffer.byteLength(text)}\r\n\r\n${text}`,
  );
}
