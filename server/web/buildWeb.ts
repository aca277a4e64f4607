/**
 * The web process's server: a guest of the loop. It mirrors what the loop says to any number of
 * pages, and passes on what an operator asks.
 *
 * On loopback there is no sign-in: whoever can reach it can also reach the rig's own processes. Over
 * the network people sign in (`access/`).
 */
import type { Socket } from 'node:net';
import fastifyStatic from '@fastify/static';
import Fastify, { type FastifyInstance, LogController } from 'fastify';
import { LapwingError } from '../errors/codes.js';
import { packageVersion } from '../packageRoot.js';
import type { Rig, RigNotify } from '../session/rig/rig.js';
import { Access } from './access/access.js';
import type { AccessFiles } from './access/people.js';
import { addAccessRoutes, youOf } from './access/routes.js';
import type { Cost } from './access/secrets.js';
import { addAnimalsRoutes } from './animals/routes.js';
import { Door, guardRoutes } from './door.js';
import { httpServer, SOCKET_LIMITS, type SocketLimits } from './httpServer.js';
import { Jobs } from './jobs/jobs.js';
import { addJobRoutes } from './jobs/routes.js';
import { type LoopPlace, LoopSide } from './loopSide.js';
import { Mirror } from './mirror.js';
import { Notices } from './notices/notices.js';
import { openapi } from './openapi.js';
import { PROBLEM_TYPE, problem, problemFrom, sendProblem } from './problems.js';
import { addRecordsRoutes } from './records/routes.js';
import type { Rehearsals } from './rehearsal/rehearsals.js';
import { addRigRoutes } from './rig/routes.js';
import { addRulesRoutes } from './rules/routes.js';
import { Senders } from './senders.js';
import { addSessionRoutes } from './sessionRoutes.js';
import { STREAM_LIMITS, Stream, type StreamLimits } from './stream.js';
import type { TlsFiles } from './tls.js';

export interface WebOptions extends LoopPlace {
  /** The built dashboard; without it only the HTTP interface is served. */
  readonly dashboard?: string;
  readonly version?: string;
  /** For editing and rehearsing rules: the rig that the loop runs, and its rules folder if another. */
  readonly rig?: Rig | undefined;
  readonly rulesFolder?: string;
  /** Where alarms are pushed to. */
  readonly notify?: RigNotify | undefined;
  readonly rehearsals?: Rehearsals;
  /** Where the sessions are; absolute. */
  readonly records?: string;
  /** Where animals are kept, if not where the rig file says. */
  readonly animals?: string;
  readonly jobs?: Jobs;
  /** Further host names that this service answers to, without port. */
  readonly allowedHosts?: readonly string[];
  /** Who may sign in, and who is signed in; without them nobody needs to (loopback). */
  readonly access?: AccessFiles | undefined;
  /** Of hashes made for nobody; tests take a cheap one. */
  readonly hashCost?: Cost;
  readonly tls?: TlsFiles | undefined;
  /** Reverse proxies whose word on callers is believed: addresses or subnets. */
  readonly proxies?: readonly string[];
  /** `false` is silent; else pino's level, to stderr. */
  readonly log?: string | false;
  readonly limits?: Partial<StreamLimits>;
  readonly sockets?: Partial<SocketLimits>;
  /** Events kept for pages that join: forty laps of a busy session. */
  readonly keepEvents?: number;
  readonly requestsPerS?: number;
}

const BODY_BYTES = 16 << 10;
/** For files whose name carries a hash of what is in them. */
const FOR_GOOD = 'public, max-age=31536000, immutable';

/** Builds the server and begins to look for the loop; `listen` and `close` are Fastify's. */
export function buildWeb(options: WebOptions): FastifyInstance {
  const senders = new Senders(options.proxies);
  const version = options.version ?? packageVersion;
  const app = Fastify({
    bodyLimit: BODY_BYTES,
    // A session's folder has a name of some hundred characters.
    routerOptions: { maxParamLength: 200 },
    logger:
      options.log === false
        ? false
        : { level: options.log ?? 'info', stream: process.stderr, base: { from: 'web' } },
    logController: new LogController({ disableRequestLogging: true }),
    forceCloseConnections: true,
    trustProxy: (address) => senders.isProxy(address),
    serverFactory: (handler) =>
      httpServer(handler, options.tls, senders, { ...SOCKET_LIMITS, ...options.sockets }),
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
  const stream = new Stream(
    mirror,
    app.log,
    { ...STREAM_LIMITS, ...options.limits },
    {
      version,
      you: (visitor) => youOf(visitor, access),
      controls: () => (access.signInUsed ? access.controls.now : undefined),
      quiet: (by) => loop.stopEverything(by),
      seen: (signIn) => access.signIns.seen(signIn),
    },
  );
  const notices = options.notify && new Notices(options.notify, app.log);
  const loop = new LoopSide(options, mirror, stream, app.log, () => access.tellSession(), notices);
  const access = new Access({
    files: options.access,
    ...(options.hashCost ? { cost: options.hashCost } : {}),
    viewersMayHold: options.rig?.viewersMayHold ?? false,
    log: app.log,
    record: (act, by) => loop.record(act, by),
    ended: (signIns) => stream.signedOut(signIns),
    heldChanged: (controls) => stream.announce({ tell: 'controls', controls }),
  });
  const hosts = new Set((options.allowedHosts ?? []).map((host) => host.toLowerCase()));
  const door = new Door(senders, hosts, options.requestsPerS ?? 40, access);
  const needs = guardRoutes(app, door, access);
  answerProblems(app);
  // Only JSON: a form from another site cannot send that without asking first (CSRF).
  app.removeContentTypeParser('text/plain');

  app.get('/healthz', { config: { needs: 'nothing' } }, async () => ({
    status: 'ok',
    loop: mirror.loop.state,
    clients: stream.clients,
    dropped: stream.dropped,
    uptimeS: Math.floor(process.uptime()),
    memoryMb: Math.round(process.memoryUsage.rss() / 1e6),
    cpuS: cpuS(),
  }));
  const description = openapi(version, needs);
  app.get('/api/openapi.json', async () => description());
  addAccessRoutes(app, access);
  addSessionRoutes(app, loop, mirror, access, () => rulesFolder?.list() ?? []);
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

  const jobs = options.jobs ?? new Jobs();
  addJobRoutes(app, jobs);
  addRigRoutes(app, { rig: options.rig, loop: options, records: options.records });
  addAnimalsRoutes(app, options.animals ?? options.rig?.animalsFolder);
  addRecordsRoutes(app, { records: options.records, rules: rulesFolder, jobs });

  app.server.on('upgrade', (request, socket: Socket, head) => {
    socket.on('error', () => socket.destroy());
    try {
      if (request.url?.split('?')[0] !== '/api/stream') {
        throw new LapwingError('webNotFound', 'The stream is at /api/stream.');
      }
      const sender = door.senderOf(request);
      const visitor = door.admit(request, sender);
      access.check(visitor, 'signed in');
      if (stream.full) throw new LapwingError('webTooManyViewers', 'No more fit.');
      stream.accept(request, socket, head, { visitor: visitor!, address: sender.address });
    } catch (error) {
      refuseUpgrade(socket, error);
    }
  });

  if (options.dashboard !== undefined) serveDashboard(app, options.dashboard);
  app.addHook('preClose', () => stream.close());
  app.addHook('onClose', async () => {
    notices?.close();
    access.close();
    loop.client.close();
  });
  loop.start();
  return app;
}

/** What this process has used of a core since it began, s. */
function cpuS(): number {
  const { user, system } = process.cpuUsage();
  return (user + system) / 1e6;
}

function answerProblems(app: FastifyInstance): void {
  app.setErrorHandler((error, _request, reply) => {
    const body = problemFrom(error);
    if (body.status === 500) app.log.error(error);
    if (body.status === 401) reply.header('www-authenticate', 'Lapwing sign-in="/api/sign-in"');
    if (body.status === 429) {
      const { retryAfterS = 1 } = error as { retryAfterS?: number };
      reply.header('retry-after', String(retryAfterS));
    }
    return sendProblem(reply, body);
  });
  app.setNotFoundHandler((request, reply) => {
    const found = `${request.method} ${request.url.slice(0, 200)}`;
    return sendProblem(reply, problem('webNotFound', found));
  });
}

function serveDashboard(app: FastifyInstance, root: string): void {
  app.register(fastifyStatic, {
    root,
    index: 'index.html',
    cacheControl: false,
    // Names under assets/ carry a hash of their content.
    setHeaders: (response, path) => {
      const lasting = /[/\\]assets[/\\]/.test(path);
      response.setHeader('cache-control', lasting ? FOR_GOOD : 'no-cache');
    },
  });
}

function refuseUpgrade(socket: Socket, error: unknown): void {
  const body = problemFrom(error);
  const text = JSON.stringify(body);
  socket.end(
    `HTTP/1.1 ${body.status} ${body.code}\r\nconnection: close\r\ncontent-type: ${PROBLEM_TYPE}\r\n` +
      `content-length: ${Buffer.byteLength(text)}\r\n\r\n${text}`,
  );
}
