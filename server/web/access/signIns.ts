/**
 * Who is signed in. A cookie holds 32 random bytes; here only their hash is kept. Times are wall times,
 * since sign-ins outlive the process (`keptAccess.ts`).
 */
import { createHash, randomBytes } from 'node:crypto';
import type { Role } from './people.js';

/** Signed out when nothing is asked, and no page watches, for this long. */
export const IDLE_MS = 12 * 3_600_000;
/** Signed out whatever happens. */
export const LONGEST_MS = 7 * 24 * 3_600_000;
const MOST_EACH = 50;
const MOST = 1000;
/** The file need not know to the second when each was last here. */
const KEEP_EVERY_MS = 60_000;

export interface SignIn {
  /** Told to everybody, to say which sign-in holds the controls; proves nothing. */
  readonly id: string;
  readonly name: string;
  readonly role: Role;
  readonly sinceMs: number;
  /** Of the person's secret: a new secret ends what was signed in with the old. */
  readonly secretSince: string;
  lastMs: number;
}

/** A sign-in with the hash of its cookie's value. */
export type KeptSignIn = SignIn & { readonly key: string };

export class SignIns {
  /** By the hash of the cookie's value. */
  private readonly all = new Map<string, SignIn>();
  private keptMs = 0;

  /** @param keep asked to write down `kept` */
  constructor(
    before: readonly KeptSignIn[],
    private readonly keep: () => void,
    private readonly ended: (signIns: readonly SignIn[]) => void,
    private readonly nowMs: () => number = () => Date.now(),
  ) {
    for (const { key, ...signIn } of before) this.all.set(key, signIn);
  }

  get kept(): readonly KeptSignIn[] {
    return [...this.all].map(([key, signIn]) => ({ key, ...signIn }));
  }

  /** A new one, whatever the browser had before; gives the cookie's value too. */
  begin(name: string, role: Role, secretSince: string): { value: string; signIn: SignIn } {
    this.makeRoom(name);
    const value = randomBytes(32).toString('base64url');
    const now = this.nowMs();
    const id = randomBytes(6).toString('base64url');
    const signIn: SignIn = { id, name, role, sinceMs: now, secretSince, lastMs: now };
    this.all.set(keyOf(value), signIn);
    this.keepNow();
    return { value, signIn };
  }

  /** Whose cookie this is; counts as being here. */
  find(value: string | undefined): SignIn | undefined {
    if (value === undefined || value.length > 100) return undefined;
    const signIn = this.all.get(keyOf(value));
    if (!signIn || this.isOld(signIn)) return undefined;
    this.seen(signIn);
    return signIn;
  }

  /** By its public name, while it lasts. */
  byId(id: string): SignIn | undefined {
    return [...this.all.values()].find((one) => one.id === id && !this.isOld(one));
  }

  /** A page of this sign-in is watching. */
  seen(signIn: SignIn): void {
    signIn.lastMs = this.nowMs();
    if (signIn.lastMs - this.keptMs > KEEP_EVERY_MS) this.keepNow();
  }

  end(which: (signIn: SignIn) => boolean): void {
    const gone: SignIn[] = [];
    for (const [key, signIn] of this.all) {
      if (!which(signIn)) continue;
      this.all.delete(key);
      gone.push(signIn);
    }
    if (gone.length === 0) return;
    this.keepNow();
    this.ended(gone);
  }

  endOld(): void {
    this.end((signIn) => this.isOld(signIn));
  }

  private isOld({ sinceMs, lastMs }: SignIn): boolean {
    const now = this.nowMs();
    return now - lastMs > IDLE_MS || now - sinceMs > LONGEST_MS;
  }

  private makeRoom(name: string): void {
    const theirs = [...this.all.values()].filter((one) => one.name === name);
    const from = theirs.length >= MOST_EACH ? theirs : [...this.all.values()];
    if (theirs.length < MOST_EACH && this.all.size < MOST) return;
    const longestAway = from.reduce((one, other) => (other.lastMs < one.lastMs ? other : one));
    this.end((one) => one === longestAway);
  }

  private keepNow(): void {
    this.keptMs = this.nowMs();
    this.keep();
  }
}

function keyOf(value: string): string {
  return createHash('sha256').update(value).digest('base64url');
}
