/**
 * The listening socket, with or without TLS, and its patience: how long a caller may take, and how
 * many sockets one may have.
 */
import http, { type RequestListener } from 'node:http';
import https from 'node:https';
import type { Socket } from 'node:net';
import { isLoopback } from './gates.js';
import { callerOf, plainAddress, type Senders } from './senders.js';
import type { TlsFiles } from './tls.js';

export interface SocketLimits {
  /** For the head of a request; sockets that say nothing count too. */
  readonly headersMs: number;
  /** For the whole of a request. */
  readonly requestMs: number;
  /** Between two requests of one socket. */
  readonly keepAliveMs: number;
  /** Nothing sent or taken, in mid-request. */
  readonly idleMs: number;
  readonly mostSockets: number;
  /** Of one caller on the network; this machine and named proxies speak for many. */
  readonly mostOfOne: number;
}

export const SOCKET_LIMITS: SocketLimits = {
  headersMs: 8_000,
  requestMs: 10_000,
  keepAliveMs: 5_000,
  idleMs: 60_000,
  mostSockets: 1_000,
  mostOfOne: 64,
};

/** Made for Fastify's `serverFactory`. */
export function httpServer(
  handler: RequestListener,
  tls: TlsFiles | undefined,
  senders: Senders,
  limits: SocketLimits,
): http.Server {
  const patience = {
    headersTimeout: limits.headersMs,
    requestTimeout: limits.requestMs,
    keepAliveTimeout: limits.keepAliveMs,
    connectionsCheckingInterval: Math.min(2_000, limits.headersMs / 2),
  };
  const server = tls
    ? https.createServer(
        {
          ...patience,
          cert: tls.cert,
          key: tls.key,
          minVersion: 'TLSv1.2',
          handshakeTimeout: limits.headersMs,
        },
        handler,
      )
    : http.createServer(patience, handler);
  server.setTimeout(limits.idleMs);
  server.maxConnections = limits.mostSockets;
  limitEach(server, senders, limits.mostOfOne);
  return server;
}

/** Before TLS or a single byte of HTTP: a socket too many costs an accept and a close. */
function limitEach(server: http.Server, senders: Senders, most: number): void {
  const open = new Map<string, number>();
  server.on('connection', (socket: Socket) => {
    const address = plainAddress(socket.remoteAddress);
    if (isLoopback(address) || senders.isProxy(address)) return;
    const caller = callerOf(address);
    const count = (open.get(caller) ?? 0) + 1;
    if (count > most) {
      socket.destroy();
      return;
    }
    open.set(caller, count);
    socket.once('close', () => {
      const left = open.get(caller)! - 1;
      if (left > 0) open.set(caller, left);
      else open.delete(caller);
    });
  });
}
