/** Where and for whom the web process serves: what `lapwing serve` is told, handed on as arguments. */
import { isIP } from 'node:net';
import { networkInterfaces } from 'node:os';
import { LapwingError } from '../errors/codes.js';

export interface Listening {
  readonly host: string;
  readonly port: number;
  /** Whoever comes has to sign in. */
  readonly signIn?: boolean;
  /** Host names it answers to, beside its own addresses. */
  readonly names?: readonly string[];
  readonly proxies?: readonly string[];
  readonly tls?: { readonly cert: string; readonly key: string };
}

/**
 * `0.0.0.0:8711`, `[::]:8711`, `10.0.0.7:8711` or `rig1.example:8711`.
 * @throws LapwingError WEB_LISTEN
 */
export function parseListen(text: string): { readonly host: string; readonly port: number } {
  const [, six, other, port] = /^(?:\[([\da-f:.]+)\]|([\w.-]+)):(\d{1,5})$/i.exec(text) ?? [];
  const host = six ?? other ?? '';
  if ((six !== undefined ? isIP(host) === 6 : host !== '') && Number(port) <= 65_535) {
    return { host, port: Number(port) };
  }
  throw new LapwingError('webListen', `\`${text}\`: expected an address and a port.`);
}

/** For the web process's command line. */
export function listeningArguments(listening: Listening): string[] {
  const { host, port, signIn, names = [], proxies = [], tls } = listening;
  return [
    ...['--host', host, '--port', String(port)],
    ...(signIn ? ['--sign-in'] : []),
    ...names.flatMap((name) => ['--name', name]),
    ...proxies.flatMap((proxy) => ['--proxy', proxy]),
    ...(tls ? ['--tls-cert', tls.cert, '--tls-key', tls.key] : []),
  ];
}

/** The addresses at which people find the page; `port` as it came to be. */
export function pageAddresses({ host, names = [], tls }: Listening, port: number): string[] {
  const protocol = tls ? 'https' : 'http';
  const hosts = names.length > 0 ? names : isEvery(host) ? ownAddresses(host) : [host];
  return hosts.map((one) => `${protocol}://${isIP(one) === 6 ? `[${one}]` : one}:${port}`);
}

function isEvery(host: string): boolean {
  return host === '0.0.0.0' || host === '::';
}

/** Of this machine on its networks, without those that need a zone. */
function ownAddresses(every: string): string[] {
  const found = Object.values(networkInterfaces())
    .flatMap((addresses) => addresses ?? [])
    .filter(({ internal, family }) => !internal && (every === '::' || family === 'IPv4'))
    .map(({ address }) => address)
    .filter((address) => !/^fe80:/i.test(address));
  return found.length > 0 ? found : ['127.0.0.1'];
}
