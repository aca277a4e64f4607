/**
 * Secrets that people sign in with. Lapwing makes them, so that none is weak or used elsewhere, shows
 * each once and keeps only a hash.
 */
import { randomInt, type ScryptOptions, scrypt, timingSafeEqual } from 'node:crypto';

/** What a hash was made with; kept beside it, so that a stronger choice later spoils none. */
export interface Cost {
  readonly n: number;
  readonly r: number;
  readonly p: number;
}

/**
 * scrypt as the OWASP Password Storage Cheat Sheet gives it (from memory: one of its equivalent
 * settings, N = 2^15, r = 8, p = 3): 32 MiB and some 0.2 s for each attempt.
 */
export const COST: Cost = { n: 2 ** 15, r: 8, p: 3 };

export interface SecretHash {
  /** Base64url, 16 random bytes. */
  readonly salt: string;
  /** Base64url, 32 bytes. */
  readonly hash: string;
  readonly cost: Cost;
}

/** No letter or digit that looks like another when it is read from a screen or a label. */
const LETTERS = '23456789abcdefghjkmnpqrstuvwxyz';
const GROUPS = 5;
const GROUP = 4;
const HASH_BYTES = 32;

/** A new secret, 20 letters in groups of four: 99 bits of chance. */
export function newSecret(): string {
  const letter = () => LETTERS[randomInt(LETTERS.length)]!;
  const group = () => Array.from({ length: GROUP }, letter).join('');
  return Array.from({ length: GROUPS }, group).join('-');
}

/** Hashes a secret under a salt of its own. */
export async function hashSecret(secret: string, salt: Buffer, cost = COST): Promise<SecretHash> {
  const hash = await derive(secret, salt, cost);
  return { salt: salt.toString('base64url'), hash: hash.toString('base64url'), cost };
}

/** True when the secret is the one that was hashed; takes as long when it is not. */
export async function isSecret(secret: string, kept: SecretHash): Promise<boolean> {
  const wanted = Buffer.from(kept.hash, 'base64url');
  const found = await derive(secret, Buffer.from(kept.salt, 'base64url'), kept.cost);
  return wanted.length === found.length && timingSafeEqual(wanted, found);
}

/** As it is typed: capitals, blanks and left out hyphens are forgiven, nothing else is. */
function asMade(secret: string): string {
  return secret.normalize('NFKC').toLowerCase().replace(/[\s-]/g, '');
}

function derive(secret: string, salt: Buffer, { n, r, p }: Cost): Promise<Buffer> {
  const options: ScryptOptions = { N: n, r, p, maxmem: 256 * n * r };
  return new Promise((resolve, reject) => {
    scrypt(asMade(secret), salt, HASH_BYTES, options, (error, key) => {
      if (error) reject(error);
      else resolve(key);
    });
  });
}
