/** Who may do what at one web process: people, attempts, sign-ins and controls, put together. */
import { createHash, randomBytes } from 'node:crypto';
import type { FastifyBaseLogger } from 'fastify';
import { LapwingError } from '../../errors/codes.js';
import { Attempts } from './attempts.js';
import { Controls, type ControlsPort } from './controls.js';
import { cookieFor, cookieIn, cookieName } from './cookies.js';
import { readKept, writeKept } from './keptAccess.js';
import { type AccessFiles, People } from './people.js';
import { COST, type Cost, hashSecret, isSecret, type SecretHash } from './secrets.js';
import { LONGEST_MS, type SignIn, SignIns } from './signIns.js';
import { AT_THE_RIG, checkNeed, type Need, type Visitor } from './visitor.js';

export interface AccessOptions {
  /** Without them there is no sign-in: for loopback only. */
  readonly files?: AccessFiles | undefined;
  /** Of the hash that is made for a name that nobody has; tests take a cheap one. */
  readonly cost?: Cost;
  readonly viewersMayHold: boolean;
  readonly log: FastifyBaseLogger;
  readonly record: ControlsPort['record'];
  /** Sign-ins have ended: their pages must go. */
  readonly ended: (signIns: readonly SignIn[]) => void;
  readonly heldChanged: ControlsPort['changed'];
}

/** A hash takes 32 MiB and a core for a while: so many at once, no more. */
const MOST_HASHES = 4;
const REFRESH_MS = 2000;

export class Access {
  readonly signIns: SignIns;
  readonly controls: Controls;
  private readonly people: People | undefined;
  private readonly attempts = new Attempts();
  private readonly key: string;
  private readonly timer: NodeJS.Timeout | undefined;
  private hashing = 0;
  private nobody: Promise<SecretHash> | undefined;

  constructor(private readonly options: AccessOptions) {
    const { files } = options;
    this.people = files && new People(files.peopleFile);
    this.key = createHash('sha256')
      .update(files?.peopleFile ?? '')
      .digest('hex')
      .slice(0, 8);
    const before = files ? readKept(files.signedInFile) : undefined;
    this.signIns = new SignIns(
      before?.signIns ?? [],
      () => this.keep(),
      (gone) => this.signInsEnded(gone),
    );
    const port: ControlsPort = {
      record: options.record,
      changed: (held) => {
        this.keep();
        options.heldChanged(held);
      },
    };
    this.controls = new Controls(port, this.signInUsed, before?.held);
    if (!files) return;
    this.tidy();
    this.timer = setInterval(() => this.tidy(), REFRESH_MS);
    this.timer.unref();
  }

  get signInUsed(): boolean {
    return this.people !== undefined;
  }

  get viewersMayHold(): boolean {
    return this.options.viewersMayHold;
  }

  /** Whose cookie it is; without sign-in everybody is at the rig's own machine. */
  visitorOf(cookieHeader: string | undefined, secure: boolean): Visitor | undefined {
    if (!this.signInUsed) return AT_THE_RIG;
    const signIn = this.signIns.find(cookieIn(cookieHeader, cookieName(this.key, secure)));
    return signIn && { name: signIn.name, role: signIn.role, signIn };
  }

  /** @throws LapwingError as `checkNeed` does */
  check(visitor: Visitor | undefined, need: Need): void {
    checkNeed(visitor, need, this.controls);
  }

  /**
   * Signs somebody in, and gives the cookie to set. Whatever was signed in with the browser's old
   * cookie ends.
   * @throws LapwingError WEB_SIGN_IN_WRONG, WEB_SIGN_IN_WAIT
   */
  async signIn(
    name: string,
    secret: string,
    from: {
      readonly address: string;
      readonly secure: boolean;
      readonly before?: SignIn | undefined;
    },
  ): Promise<{ signIn: SignIn; cookie: string }> {
    const known = name.normalize('NFC').trim();
    const waitMs = this.attempts.waitMs(known, from.address);
    if (waitMs > 0) throw waitFor(waitMs);
    if (this.hashing >= MOST_HASHES) throw waitFor(1000);
    this.people?.refresh();
    const person = this.people?.find(known);
    this.hashing++;
    let right: boolean;
    try {
      // A name that nobody has takes as long as one that somebody has.
      right = await isSecret(secret, person?.secret ?? (await this.somebody()));
    } finally {
      this.hashing--;
    }
    if (!person || !right) {
      this.attempts.failed(known, from.address);
      // Not what was typed: it may be a secret in the wrong place.
      const who = person?.name ?? 'nobody of this rig';
      this.options.log.warn({ name: who, address: from.address }, 'sign-in refused');
      throw new LapwingError('webSignInWrong', 'The name or the secret is wrong.');
    }
    this.attempts.succeeded(known, from.address);
    this.signIns.end((one) => one === from.before);
    const { value, signIn } = this.signIns.begin(person.name, person.role, person.since);
    this.options.log.info({ name: known, role: person.role, address: from.address }, 'signed in');
    const cookie = cookieFor(this.cookie(from.secure), value, LONGEST_MS / 1000, from.secure);
    return { signIn, cookie };
  }

  /** A session has begun, or was found running: its record says from there who has the controls. */
  tellSession(): void {
    this.controls.announceTo(this.options.record).catch((error: Error) => {
      this.options.log.error(error, 'who holds the controls could not be recorded');
    });
  }

  /** The cookie that takes the browser's away. */
  noCookie(secure: boolean): string {
    return cookieFor(this.cookie(secure), '', 0, secure);
  }

  close(): void {
    clearInterval(this.timer);
  }

  private cookie(secure: boolean): string {
    return cookieName(this.key, secure);
  }

  private somebody(): Promise<SecretHash> {
    this.nobody ??= hashSecret(
      randomBytes(16).toString('hex'),
      randomBytes(16),
      this.options.cost ?? COST,
    );
    return this.nobody;
  }

  /** Ends what has lasted too long, and what belongs to people who are gone or have a new secret. */
  private tidy(): void {
    try {
      this.people?.refresh();
    } catch (error) {
      this.options.log.error(error);
      return;
    }
    this.signIns.endOld();
    this.signIns.end(({ name, role, secretSince }) => {
      const person = this.people?.find(name);
      return person?.role !== role || person.since !== secretSince;
    });
    const { holder } = this.controls.now;
    if (holder && !this.signIns.byId(holder.id)) this.controls.freeFrom([holder.id]);
  }

  private signInsEnded(gone: readonly SignIn[]): void {
    this.controls.freeFrom(gone.map(({ id }) => id));
    this.options.ended(gone);
  }

  private keep(): void {
    const { files, log } = this.options;
    if (!files) return;
    try {
      writeKept(files.signedInFile, { signIns: this.signIns.kept, held: this.controls.now });
    } catch (error) {
      log.error(error, 'sign-ins are not kept: they end with this process');
    }
  }
}

function waitFor(waitMs: number): LapwingError {
  const seconds = Math.ceil(waitMs / 1000);
  const error = new LapwingError('webSignInWait', `Try again in ${seconds} s.`);
  return Object.assign(error, { retryAfterS: seconds });
}
