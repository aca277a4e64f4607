import { createCipheriv, createDecipheriv, createHash, randomBytes } from 'node:crypto';
import { LapwingError } from '../../errors/codes.js';
import { uniform } from '../../rules/engine/hash.js';

/** Which arm a session is to have: of one animal, every session or the one of that number. */
export interface Slot {
  readonly subject: string;
  /** null: every session of the animal. */
  readonly session: number | null;
  readonly arm: string;
}

/** What is written down before the study, and may be shown to anybody. */
export interface SealedAllocation {
  readonly format: 1;
  /** Made up once; every sealed arm is bound to it. */
  readonly id: string;
  readonly madeAt: string;
  readonly by: string;
  /** How the arms were allotted, in words. */
  readonly how: string;
  readonly arms: readonly string[];
  readonly slots: readonly SealedSlot[];
  /** SHA-256 of the opening: whoever opens it can show that nothing was changed since. */
  readonly commitment: string;
  /** The opening itself, sealed. */
  readonly opening: string;
}
export interface SealedSlot {
  readonly subject: string;
  readonly session: number | null;
  readonly sealed: string;
}

/** What the commitment is made over: all arms, and a nonce so that they cannot be guessed from it. */
export interface Opening {
  readonly id: string;
  readonly slots: readonly Slot[];
  readonly nonce: string;
}

/** AES in Galois/counter mode, NIST SP 800-38D: 256-bit key, 96-bit nonce, 128-bit tag. */
const CIPHER = 'aes-256-gcm';
const KEY_BYTES = 32;
const IV_BYTES = 12;
const TAG_BYTES = 16;
/** Arms are padded, so that the length of what is sealed says nothing. */
const ARM_BYTES = 64;

/** A new key, as its file holds it. */
export function newKey(): string {
  return randomBytes(KEY_BYTES).toString('hex');
}

/** Seals an allocation under a key. @throws LapwingError BLINDING_BAD for slots that clash */
export function sealAllocation(
  slots: readonly Slot[],
  key: string,
  about: Pick<SealedAllocation, 'madeAt' | 'by' | 'how'>,
): SealedAllocation {
  const names = slots.map(nameOf);
  const twice = names.find((name, n) => names.indexOf(name) !== n);
  if (twice !== undefined) throw bad(`${twice} stands twice`);
  const clash = slots.find(
    ({ subject, session }) =>
      session !== null &&
      slots.some((other) => other.subject === subject && other.session === null),
  );
  if (clash) throw bad(`${clash.subject} has an arm for every session and one for some`);
  const arms = [...new Set(slots.map(({ arm }) => arm))].sort();
  if (arms.length < 2) throw bad('expected two arms or more');
  const id = randomBytes(16).toString('hex');
  const opening: Opening = { id, slots, nonce: randomBytes(32).toString('hex') };
  return {
    ...{ format: 1, id, ...about, arms },
    slots: slots.map(({ subject, session, arm }) => {
      const padded = Buffer.alloc(ARM_BYTES);
      if (padded.write(arm) === ARM_BYTES) throw bad(`the arm ${arm} is too long`);
      return { subject, session, sealed: encrypt(padded, key, boundTo(id, subject, session)) };
    }),
    commitment: commitmentOf(opening),
    opening: encrypt(Buffer.from(JSON.stringify(opening)), key, id),
  };
}

/** SHA-256 (FIPS 180-4) of an opening, in hex. */
export function commitmentOf({ id, slots, nonce }: Opening): string {
  const lines = slots.map(({ subject, session, arm }) => [subject, session, arm]);
  return createHash('sha256')
    .update(JSON.stringify([id, nonce, lines]))
    .digest('hex');
}

/** The arm of one slot. @throws LapwingError BLINDING_KEY for another key, or what was altered */
export function openSlot(id: string, slot: SealedSlot, key: string): string {
  const padded = decrypt(slot.sealed, key, boundTo(id, slot.subject, slot.session));
  return padded.subarray(0, padded.indexOf(0)).toString();
}

/** Every arm, shown to be as it was committed to. @throws LapwingError BLINDING_KEY */
export function openAll(allocation: SealedAllocation, key: string): Opening {
  const { id, commitment, opening: sealed, slots } = allocation;
  const opening = JSON.parse(decrypt(sealed, key, id).toString()) as Opening;
  const arms = slots.map((slot) => ({ ...slot, arm: openSlot(id, slot, key) }));
  const agree = arms.every(({ subject, session, arm }, n) => {
    const other = opening.slots[n];
    return other?.subject === subject && other.session === session && other.arm === arm;
  });
  if (commitmentOf(opening) === commitment && agree && opening.slots.length === arms.length) {
    return opening;
  }
  throw new LapwingError('blindingKey', 'What is sealed is not what was committed to.');
}

/** The slot that a session takes. @throws LapwingError BLINDING_NO_SLOT */
export function slotFor(
  { slots }: SealedAllocation,
  subject: string,
  session: number | null,
): SealedSlot {
  const own = slots.filter((slot) => slot.subject === subject);
  const found = own.find((slot) => slot.session === null || slot.session === session);
  if (found !== undefined) return found;
  const has = own.length === 0 ? 'it has none' : `it has ${own.map(nameOf).join(', ')}`;
  throw new LapwingError(
    'blindingNoSlot',
    `No arm is allotted to session ${session} of ${subject}: ${has}.`,
  );
}

/**
 * Arms in permuted blocks: within each block every arm comes equally often, in an order of its own
 * (Fisher and Yates), so that the arms stay balanced however many animals there are.
 */
export function inBlocks(
  subjects: readonly string[],
  sessions: number | null,
  arms: readonly string[],
  blockSize: number,
  seed: string,
): Slot[] {
  if (!(blockSize > 0) || blockSize % arms.length !== 0) {
    throw bad(`blocks of ${blockSize} cannot balance ${arms.length} arms`);
  }
  const places = subjects.flatMap((subject): { subject: string; session: number | null }[] =>
    sessions === null
      ? [{ subject, session: null }]
      : Array.from({ length: sessions }, (_, n) => ({ subject, session: n + 1 })),
  );
  let block: string[] = [];
  return places.map((place, n) => {
    if (n % blockSize === 0) block = shuffled(arms, blockSize, seed, n / blockSize);
    return { ...place, arm: block[n % blockSize]! };
  });
}

function shuffled(arms: readonly string[], size: number, seed: string, number: number): string[] {
  const block = Array.from({ length: size }, (_, n) => arms[n % arms.length]!);
  for (let n = size - 1; n > 0; n--) {
    const other = Math.floor(uniform(seed, 'allocation', `block ${number}`, n, 0) * (n + 1));
    [block[n], block[other]] = [block[other]!, block[n]!];
  }
  return block;
}

function encrypt(plain: Buffer, key: string, boundTo: string): string {
  const iv = randomBytes(IV_BYTES);
  const cipher = createCipheriv(CIPHER, keyBytes(key), iv).setAAD(Buffer.from(boundTo));
  const text = Buffer.concat([cipher.update(plain), cipher.final()]);
  return Buffer.concat([iv, cipher.getAuthTag(), text]).toString('base64');
}

function decrypt(sealed: string, key: string, boundTo: string): Buffer {
  const bytes = Buffer.from(sealed, 'base64');
  try {
    const decipher = createDecipheriv(CIPHER, keyBytes(key), bytes.subarray(0, IV_BYTES))
      .setAAD(Buffer.from(boundTo))
      .setAuthTag(bytes.subarray(IV_BYTES, IV_BYTES + TAG_BYTES));
    return Buffer.concat([decipher.update(bytes.subarray(IV_BYTES + TAG_BYTES)), decipher.final()]);
  } catch (error) {
    if (error instanceof LapwingError) throw error;
    throw new LapwingError('blindingKey', 'This key does not open it, or it was altered.');
  }
}

function keyBytes(key: string): Buffer {
  const bytes = Buffer.from(key.trim(), 'hex');
  if (bytes.length === KEY_BYTES) return bytes;
  throw new LapwingError('blindingKey', `Expected a key of ${2 * KEY_BYTES} hexadecimal digits.`);
}

/** A sealed arm opens only in its own place of its own allocation. */
function boundTo(id: string, subject: string, session: number | null): string {
  return JSON.stringify([id, subject, session]);
}

function nameOf({ subject, session }: { subject: string; session: number | null }): string {
  return session === null ? subject : `${subject}, session ${session}`;
}

function bad(what: string): LapwingError {
  return new LapwingError('blindingBad', `${what}.`);
}
