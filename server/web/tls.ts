import { createPrivateKey, type KeyObject, X509Certificate } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { LapwingError } from '../errors/codes.js';

/** A certificate (with its chain) and its key, as PEM. */
export interface TlsFiles {
  readonly cert: string;
  readonly key: string;
  /** When the certificate ends. */
  readonly until: Date;
}

/**
 * Reads and checks what TLS needs, before anything listens.
 * @throws LapwingError WEB_TLS: unreadable, no PEM, a key with a passphrase, a key of another
 * certificate
 */
export function readTls(certFile: string, keyFile: string): TlsFiles {
  const cert = read(certFile);
  const key = read(keyFile);
  const certificate = parse(certFile, 'a certificate in PEM', () => new X509Certificate(cert));
  const secret: KeyObject = parse(keyFile, 'a private key in PEM, without passphrase', () =>
    createPrivateKey(key),
  );
  if (!certificate.checkPrivateKey(secret)) {
    throw new LapwingError('webTls', `${keyFile} is not the key of ${certFile}.`);
  }
  return { cert, key, until: new Date(certificate.validTo) };
}

const SOON_DAYS = 14;

/**
 * What to say of a certificate that ends soon or has ended; undefined of any other. It is no reason not
 * to serve: browsers say so too, and a session may be running.
 */
export function certificateWarning({ until }: TlsFiles, now: Date): string | undefined {
  const days = (until.getTime() - now.getTime()) / 86_400_000;
  if (days > SOON_DAYS) return undefined;
  const verb = days > 0 ? 'ends' : 'ended';
  return `the TLS certificate ${verb} at ${until.toISOString()}; put a new one in its place and start again`;
}

function read(file: string): string {
  try {
    return readFileSync(file, 'utf8');
  } catch (cause) {
    throw new LapwingError('webTls', (cause as Error).message, { cause });
  }
}

function parse<T>(file: string, expected: string, made: () => T): T {
  try {
    return made();
  } catch (cause) {
    const why = (cause as Error).message;
    throw new LapwingError('webTls', `${file}: expected ${expected} (${why}).`, { cause });
  }
}
