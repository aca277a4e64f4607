/**
 * Who is at the other end of a connection: an address, and whether the way from there is encrypted.
 * What a request says of itself (`X-Forwarded-For`, `X-Forwarded-Proto`) counts only where it comes
 * from a proxy that was named at the start.
 */
import type { IncomingMessage } from 'node:http';
import { BlockList, isIP } from 'node:net';
import type { TLSSocket } from 'node:tls';
import { LapwingError } from '../errors/codes.js';

export interface Sender {
  readonly address: string;
  /** Encrypted up to here, or up to the proxy. */
  readonly secure: boolean;
}

export class Senders {
  private readonly proxies = new BlockList();
  private readonly some: boolean;

  /**
   * @param proxies addresses or subnets (`10.0.0.0/24`) of reverse proxies that are believed
   * @throws LapwingError WEB_LISTEN
   */
  constructor(proxies: readonly string[] = []) {
    this.some = proxies.length > 0;
    for (const proxy of proxies) this.believe(proxy);
  }

  /** True for an address whose forwarding headers are believed. */
  isProxy(address: string | undefined): boolean {
    const plain = plainAddress(address);
    const family = isIP(plain);
    return this.some && family !== 0 && this.proxies.check(plain, family === 4 ? 'ipv4' : 'ipv6');
  }

  of(request: IncomingMessage): Sender {
    const { socket, headers } = request;
    const direct = plainAddress(socket.remoteAddress);
    if (!this.isProxy(direct)) {
      return { address: direct, secure: (socket as Partial<TLSSocket>).encrypted === true };
    }
    // Each proxy adds whom it heard it from: the last one that is no proxy of ours is the caller.
    const way = String(headers['x-forwarded-for'] ?? '').split(',');
    const caller = way
      .map((part) => plainAddress(part.trim()))
      .findLast((part) => isIP(part) !== 0 && !this.isProxy(part));
    const protocol = String(headers['x-forwarded-proto'] ?? '')
      .split(',')
      .at(-1)!
      .trim();
    return { address: caller ?? direct, secure: protocol === 'https' };
  }

  private believe(proxy: string): void {
    const [address = '', bits] = proxy.split('/');
    const family = isIP(address);
    const most = family === 4 ? 32 : 128;
    const prefix = bits === undefined ? most : Number(bits);
    if (family === 0 || !Number.isInteger(prefix) || prefix < 1 || prefix > most) {
      throw new LapwingError(
        'webListen',
        `\`${proxy}\` is no address of a proxy: expected 10.0.0.2 or 10.0.0.0/24.`,
      );
    }
    this.proxies.addSubnet(address, prefix, family === 4 ? 'ipv4' : 'ipv6');
  }
}

/** An address without zone or IPv4-in-IPv6 wrapping, as it is compared and shown. */
export function plainAddress(address: string | undefined): string {
  return (address ?? '')
    .replace(/^::ffff:(?=\d+\.)/i, '')
    .replace(/%.*$/, '')
    .toLowerCase();
}

/**
 * What limits count by: one IPv6 subscriber has a whole /64 of addresses (RFC 4291), so that is one
 * caller.
 */
export function callerOf(address: string): string {
  if (isIP(address) !== 6) return address;
  // The last two groups may be written as an IPv4 address.
  const [head = '', tail] = address.replace(/\d+\.[\d.]+$/, '0:0').split('::');
  const front = head === '' ? [] : head.split(':');
  const back = tail === undefined || tail === '' ? [] : tail.split(':');
  const gap = Array.from({ length: Math.max(0, 8 - front.length - back.length) }, () => '0');
  return `${[...front, ...gap, ...back]
    .slice(0, 4)
    .map((part) => Number.parseInt(part, 16).toString(16))
    .join(':')}::/64`;
}
