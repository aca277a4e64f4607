/**
 * Who may sign in at one rig: a private file with a name, a role and the hash of a secret for each.
 * The command line writes it (`lapwing people`); the web process reads it, and again when it changes.
 */
import { createHash, randomBytes } from 'node:crypto';
import { chmodSync, mkdirSync, readFileSync, statSync } from 'node:fs';
import { homedir } from 'node:os';
import { dirname, join } from 'node:path';
import { LapwingError } from '../../errors/codes.js';
import { safeName } from '../../session/safeName.js';
import { writeFileWhole } from '../../session/writeFileWhole.js';
import { COST, type Cost, hashSecret, newSecret, type SecretHash } from './secrets.js';

export const ROLES = ['operator', 'viewer'] as const;
export type Role = (typeof ROLES)[number];

export interface Person {
  readonly name: string;
  readonly role: Role;
  /** When the secret was made, RFC 3339. */
  readonly since: string;
  readonly secret: SecretHash;
}

/** Where a rig's people, and who is signed in, are kept. */
export interface AccessFiles {
  readonly peopleFile: string;
  readonly signedInFile: string;
}

export const NAME_WORDS = '1 to 32 letters, digits, `.`, `_` or `-`, beginning with a letter';
const NAME = /^\p{Letter}[\p{Letter}\p{Mark}\p{Number}._-]{0,31}$/u;

/** A rig's own folder below `LAPWING_CONFIG`, else the user's configuration folder. */
export function accessFiles(rigName: string): AccessFiles {
  const key = createHash('sha256').update(rigName).digest('hex').slice(0, 8);
  const folder = join(configFolder(), `${safeName(rigName, 40, 'rig')}-${key}`);
  return {
    peopleFile: join(folder, 'people.json'),
    signedInFile: join(folder, 'signed-in.json'),
  };
}

function configFolder(): string {
  const { LAPWING_CONFIG, XDG_CONFIG_HOME, APPDATA } = process.env;
  if (LAPWING_CONFIG) return LAPWING_CONFIG;
  if (process.platform === 'win32' && APPDATA) return join(APPDATA, 'lapwing');
  return join(XDG_CONFIG_HOME || join(homedir(), '.config'), 'lapwing');
}

export class People {
  private people: readonly Person[] = [];
  /** Of the file as it was read last; empty without one. */
  private stamp = '';

  /** @param cost of new hashes; tests take a cheap one */
  constructor(
    private readonly file: string,
    private readonly cost: Cost = COST,
  ) {
    this.refresh();
  }

  get all(): readonly Person[] {
    return this.people;
  }

  find(name: string): Person | undefined {
    return this.people.find((person) => person.name === name.normalize('NFC'));
  }

  /**
   * Reads the file if it has changed since; true when it had.
   * @throws LapwingError WEB_PEOPLE_FILE when others may read it, or it is not what Lapwing wrote
   */
  refresh(): boolean {
    const stamp = this.stampNow();
    if (stamp === this.stamp) return false;
    this.people = stamp === '' ? [] : readPeople(this.file);
    this.stamp = stamp;
    return true;
  }

  /**
   * Adds somebody, and gives the secret: it is not kept anywhere.
   * @throws LapwingError WEB_PERSON
   */
  async add(name: string, role: Role): Promise<string> {
    const known = name.normalize('NFC');
    if (!NAME.test(known)) {
      throw new LapwingError('webPerson', `${JSON.stringify(name)}: expected ${NAME_WORDS}.`);
    }
    if (this.find(known)) throw new LapwingError('webPerson', `There is a ${known} already.`);
    const { person, secret } = await this.made(known, role);
    // Somebody else may have been added while the hash was made.
    this.refresh();
    this.write([...this.people, person]);
    return secret;
  }

  /** Gives somebody a new secret, which ends the old one and whatever was signed in with it. */
  async renew(name: string): Promise<string> {
    const { role, name: known } = this.need(name);
    const { person, secret } = await this.made(known, role);
    this.refresh();
    this.write(this.people.map((one) => (one.name === known ? person : one)));
    return secret;
  }

  remove(name: string): void {
    const { name: known } = this.need(name);
    this.write(this.people.filter((person) => person.name !== known));
  }

  private need(name: string): Person {
    const person = this.find(name);
    if (person) return person;
    const known = this.people.map((one) => one.name).join(', ') || 'nobody';
    throw new LapwingError('webPerson', `There is no ${JSON.stringify(name)}; there is: ${known}.`);
  }

  private async made(name: string, role: Role): Promise<{ person: Person; secret: string }> {
    const secret = newSecret();
    const kept = await hashSecret(secret, randomBytes(16), this.cost);
    return { secret, person: { name, role, since: new Date().toISOString(), secret: kept } };
  }

  private write(people: readonly Person[]): void {
    const folder = dirname(this.file);
    mkdirSync(folder, { recursive: true, mode: 0o700 });
    if (process.platform !== 'win32') chmodSync(folder, 0o700);
    writeFileWhole(this.file, `${JSON.stringify({ format: 1, people }, null, 2)}\n`, 0o600);
    this.people = people;
    this.stamp = this.stampNow();
  }

  private stampNow(): string {
    const found = statSync(this.file, { throwIfNoEntry: false });
    // A file written whole is another file each time, even within one tick of the clock.
    return found ? `${found.ino} ${found.size} ${found.mtimeMs}` : '';
  }
}

function readPeople(file: string): readonly Person[] {
  const { mode } = statSync(file);
  if (process.platform !== 'win32' && (mode & 0o077) !== 0) {
    throw new LapwingError('webPeopleFile', `${file}: others than its owner may read or write it.`);
  }
  let content: unknown;
  try {
    content = JSON.parse(readFileSync(file, 'utf8'));
  } catch (cause) {
    throw new LapwingError('webPeopleFile', `${file}: ${(cause as Error).message}`, { cause });
  }
  const { format, people } = (content ?? {}) as { format?: unknown; people?: unknown };
  if (format !== 1 || !Array.isArray(people) || !people.every(isPerson)) {
    throw new LapwingError('webPeopleFile', `${file}: expected format 1 with a list of people.`);
  }
  return people;
}

function isPerson(value: unknown): value is Person {
  const { name, role, secret } = (value ?? {}) as Partial<Person>;
  const cost = secret?.cost;
  return (
    typeof name === 'string' &&
    NAME.test(name) &&
    ROLES.includes(role as Role) &&
    typeof secret?.salt === 'string' &&
    typeof secret.hash === 'string' &&
    [cost?.n, cost?.r, cost?.p].every((number) => Number.isInteger(number) && number! > 0)
  );
}
