/**
 * The one way in: every request and every stream passes here before anything of it is read. Host and
 * origin, how often, who, and whether the route is theirs to use.
 */
import type { IncomingMessage } from 'node:http';
import type { FastifyInstance, FastifyRequest } from 'fastify';
import { LapwingError } from '../errors/codes.js';
import type { Access } from './access/access.js';
import { type Need, usualNeed, type Visitor } from './access/visitor.js';
import { checkSender, RateLimit, SECURITY_HEADERS, STRICT_TRANSPORT } from './gates.js';
import { callerOf, type Sender, type Senders } from './senders.js';

declare module 'fastify' {
  interface FastifyRequest {
    sender: Sender;
    /** Undefined while nobody is signed in. */
    visitor: Visitor | undefined;
  }
}

const SIGN_IN_PAGE = '/sign-in.html';

/** What each route wants, by `GET /api/state`: filled as routes are added. */
export type Needs = ReadonlyMap<string, Need>;

export class Door {
  private readonly rate: RateLimit;

  /** @param hosts names that this service answers to, lower case, beside its own addresses */
  constructor(
    private readonly senders: Senders,
    private readonly hosts: ReadonlySet<string>,
    private readonly perS: number,
    private readonly access: Access,
  ) {
    this.rate = new RateLimit(perS, perS * 4);
  }

  senderOf(request: IncomingMessage): Sender {
    return this.senders.of(request);
  }

  /**
   * Lets a caller in whom the service may talk to at all, and says who it is.
   * @param stops it asks to stop everything: an operator may do that as often as it takes
   * @throws LapwingError WEB_HOST_REFUSED, WEB_ORIGIN_REFUSED, WEB_TOO_MANY_REQUESTS
   */
  admit(request: IncomingMessage, sender: Sender, stops = false): Visitor | undefined {
    checkSender(request, this.hosts, sender.secure);
    const visitor = this.access.visitorOf(request.headers.cookie, sender.secure);
    if (stops && visitor?.role === 'operator') return visitor;
    if (!this.rate.take(visitor?.signIn?.id ?? callerOf(sender.address))) {
      throw new LapwingError('webTooManyRequests', `More than ${this.perS} requests a second.`);
    }
    return visitor;
  }
}

/** Guards every route that is added from now on, and gives what each wants. */
export function guardRoutes(app: FastifyInstance, door: Door, access: Access): Needs {
  const needs = new Map<string, Need>();
  app.decorateRequest('sender');
  app.decorateRequest('visitor');
  app.addHook('onRoute', ({ method, url, config }) => {
    for (const one of [method].flat()) needs.set(`${one} ${url}`, needOf(one, url, config?.needs));
  });
  app.addHook('onRequest', async (request, reply) => {
    request.sender = door.senderOf(request.raw);
    reply.headers(SECURITY_HEADERS);
    if (request.sender.secure) reply.header('strict-transport-security', STRICT_TRANSPORT);
    if (request.url.startsWith('/api/')) reply.header('cache-control', 'no-store');
    request.visitor = door.admit(request.raw, request.sender, isQuiet(request));
    if (!request.visitor && isPage(request)) return reply.redirect(SIGN_IN_PAGE, 303);
    const { url, config } = request.routeOptions;
    // That there is nothing at an address may be said to anybody.
    if (url !== undefined) access.check(request.visitor, needOf(request.method, url, config.needs));
  });
  return needs;
}

/** The page's own files are no secret: they are the same everywhere. */
function needOf(method: string, url: string, said: Need | undefined): Need {
  return said ?? (url.startsWith('/api/') ? usualNeed(method) : 'nothing');
}

function isQuiet({ method, url }: FastifyRequest): boolean {
  return method === 'POST' && url === '/api/quiet';
}

function isPage({ method, url }: FastifyRequest): boolean {
  return method === 'GET' && /^\/(index\.html)?([?#]|$)/.test(url);
}
