/** Who may speak to the web process at all: checks made before any handler runs. */
import type { IncomingMessage } from 'node:http';
import { isIP } from 'node:net';
import { LapwingError } from '../errors/codes.js';
import { plainAddress } from './senders.js';

const LOOPBACK_NAMES = new Set(['localhost', '127.0.0.1', '[::1]']);

/** True for an address that only this machine can reach. */
export function isLoopback(host: string): boolean {
  return host === 'localhost' || host === '::1' || (isIP(host) === 4 && host.startsWith('127.'));
}

/**
 * Refuses a request that names another host (DNS rebinding: a hostile page whose name was made to
 * point here) or that a browser says comes from another site. A caller that is no browser sends no
 * origin, and holds no cookie that could be abused.
 *
 * The bare address that the caller connected to is always ours: no name can be made to point at it.
 *
 * @param hosts names that this service answers to, lower case, without port
 * @param secure the caller came over TLS
 */
export function checkSender(
  request: IncomingMessage,
  hosts: ReadonlySet<string>,
  secure: boolean,
): void {
  // Node keeps the first of several; a request with more than one is to be refused (RFC 9112, 3.2).
  const hostsNamed = request.rawHeaders.filter((text, n) => n % 2 === 0 && /^host$/i.test(text));
  const host = hostsNamed.length > 1 ? hostsNamed.join() : (request.headers.host ?? '');
  const bare = host.replace(/:\d+$/, '').toLowerCase();
  if (!LOOPBACK_NAMES.has(bare) && !hosts.has(bare) && !isWhereItCame(request, bare)) {
    throw new LapwingError(
      'webHostRefused',
      `Asked for host ${JSON.stringify(host.slice(0, 80))}.`,
    );
  }
  const { origin } = request.headers;
  if (origin !== undefined && !sameOrigin(origin, host, secure)) {
    throw new LapwingError('webOriginRefused', `Origin ${JSON.stringify(origin.slice(0, 80))}.`);
  }
  const site = request.headers['sec-fetch-site'];
  const asking = request.method !== 'GET' || request.headers.upgrade !== undefined;
  if (asking && site !== undefined && site !== 'same-origin') {
    throw new LapwingError('webOriginRefused', `The browser calls this request ${String(site)}.`);
  }
}

function isWhereItCame(request: IncomingMessage, bareHost: string): boolean {
  const literal = bareHost.replace(/^\[(.*)\]$/, '$1');
  return isIP(literal) !== 0 && literal === plainAddress(request.socket.localAddress);
}

/** Over TLS a page that came without it is another site: anybody on the way may have written it. */
function sameOrigin(origin: string, host: string, secure: boolean): boolean {
  try {
    const url = new URL(origin);
    const protocols = secure ? ['https:'] : ['http:', 'https:'];
    return protocols.includes(url.protocol) && url.host === host.toLowerCase();
  } catch {
    return false;
  }
}

/** A token bucket for each address: `perS` a second, `burst` at once. Forgets addresses that rest. */
export class RateLimit {
  private readonly buckets = new Map<string, { left: number; atMs: number }>();

  constructor(
    private readonly perS: number,
    private readonly burst: number,
    private readonly nowMs: () => number = () => performance.now(),
    private readonly mostAddresses = 1000,
  ) {}

  /** True when this request may go on. */
  take(address: string): boolean {
    const now = this.nowMs();
    let bucket = this.buckets.get(address);
    if (!bucket) {
      if (this.buckets.size >= this.mostAddresses) this.forgetFull(now);
      if (this.buckets.size >= this.mostAddresses) return false;
      bucket = { left: this.burst, atMs: now };
      this.buckets.set(address, bucket);
    }
    bucket.left = Math.min(this.burst, bucket.left + ((now - bucket.atMs) * this.perS) / 1000);
    bucket.atMs = now;
    if (bucket.left < 1) return false;
    bucket.left--;
    return true;
  }

  private forgetFull(now: number): void {
    const refillMs = (this.burst / this.perS) * 1000;
    for (const [address, bucket] of this.buckets) {
      if (now - bucket.atMs > refillMs) this.buckets.delete(address);
    }
  }
}

/** Over TLS: browsers come back over TLS only, for half a year (RFC 6797). */
export const STRICT_TRANSPORT = 'max-age=15724800';

/**
 * No inline script or style, nothing from elsewhere, no framing. Chosen after the OWASP Secure
 * Headers Project's list.
 */
export const SECURITY_HEADERS: Readonly<Record<string, string>> = {
  'content-security-policy': [
    "default-src 'none'",
    "script-src 'self'",
    "style-src 'self'",
    "img-src 'self' data:",
    "connect-src 'self'",
    "font-src 'self'",
    "manifest-src 'self'",
    // The Records page frames reports that this service made.
    "frame-src 'self'",
    "base-uri 'none'",
    "form-action 'self'",
    "frame-ancestors 'none'",
    "require-trusted-types-for 'script'",
  ].join('; '),
  'x-content-type-options': 'nosniff',
  'x-frame-options': 'DENY',
  'referrer-policy': 'no-referrer',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
  'permissions-policy': 'camera=(), microphone=(), geolocation=(), usb=(), serial=()',
};
