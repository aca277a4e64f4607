/**
 * Self-signed certificates for tests, made without another program: X.509 version 3 (RFC 5280, 4.1)
 * in DER, with a P-256 key (RFC 5480) and an ECDSA signature (RFC 5758, 3.2).
 */
import { generateKeyPairSync, sign } from 'node:crypto';

export interface TestCertificate {
  readonly cert: string;
  readonly key: string;
}

/** For localhost and 127.0.0.1. */
export function selfSigned(from: Date, until: Date): TestCertificate {
  const { privateKey, publicKey } = generateKeyPairSync('ec', { namedCurve: 'P-256' });
  const ecdsaSha256 = der(0x30, Buffer.from('06082a8648ce3d040302', 'hex'));
  const commonName = der(
    0x30,
    Buffer.from('0603550403', 'hex'),
    der(0x0c, Buffer.from('lapwing test')),
  );
  const name = der(0x30, der(0x31, commonName));
  // GeneralName (4.2.1.6): [2] a DNS name, [7] an address.
  const names = der(
    0x30,
    der(0x82, Buffer.from('localhost')),
    der(0x87, Buffer.from([127, 0, 0, 1])),
  );
  const alternativeNames = der(0x30, Buffer.from('0603551d11', 'hex'), der(0x04, names));
  const toBeSigned = der(
    0x30,
    der(0xa0, der(0x02, Buffer.from([2]))),
    der(0x02, Buffer.from([1])),
    ecdsaSha256,
    name,
    der(0x30, utcTime(from), utcTime(until)),
    name,
    publicKey.export({ type: 'spki', format: 'der' }),
    der(0xa3, der(0x30, alternativeNames)),
  );
  const signature = Buffer.concat([Buffer.from([0]), sign('sha256', toBeSigned, privateKey)]);
  const certificate = der(0x30, toBeSigned, ecdsaSha256, der(0x03, signature));
  return {
    cert: pem('CERTIFICATE', certificate),
    key: String(privateKey.export({ type: 'pkcs8', format: 'pem' })),
  };
}

/** One value of DER: tag, length, content. */
function der(tag: number, ...parts: readonly Buffer[]): Buffer {
  const content = Buffer.concat(parts);
  const { length } = content;
  const head =
    length < 128 ? [length] : length < 256 ? [0x81, length] : [0x82, length >> 8, length & 255];
  return Buffer.concat([Buffer.from([tag, ...head]), content]);
}

function utcTime(at: Date): Buffer {
  return der(
    0x17,
    Buffer.from(
      `${at
        .toISOString()
        .replace(/[-:T]|\.\d+/g, '')
        .slice(2)}`,
    ),
  );
}

function pem(what: string, content: Buffer): string {
  const lines = content
    .toString('base64')
    .match(/.{1,64}/g)!
    .join('\n');
  return `-----BEGIN ${what}-----\n${lines}\n-----END ${what}-----\n`;
}
